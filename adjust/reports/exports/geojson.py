"""GeoJSON (RFC 7946): marks, lines and ellipses in longitude and latitude on WGS 84."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from adjust.arrays import FloatArray
from adjust.reports.exports.layers import Layer, layers
from adjust.reports.exports.options import Options
from adjust.reports.exports.places import places_of
from adjust.reports.exports.wgs84 import ToWgs84, to_wgs84
from adjust.reports.saved import SavedResults

DECIMALS = 11
"""Of a degree: a micrometre on the ground, so that ellipses of a millimetre keep their shape. RFC 7946, section 11.2,
leaves the number to the need; positions themselves are no better than the transformation that is stated."""


def write_geojson(results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
    """One FeatureCollection; the property `layer` says what a feature is. Returns the sentence on the transformation.

    Raises FieldDataError in a plane frame, and where no mark has a plan position.
    """
    places = places_of(results)
    transformation = to_wgs84(places)
    with path.open("w", encoding="utf-8", newline="\n") as file:
        drawn = layers(results, places, transformation, options.exaggeration or 1.0)
        features = ",\n".join(_encoded(feature) for layer in drawn for feature in _features(layer))
        head = _encoded(_members(results, transformation))[1:-1]
        file.write(f'{{"type": "FeatureCollection", {head},\n"features": [\n{features}\n]}}\n')
    return (transformation.sentence,)


def _encoded(record: dict[str, Any]) -> str:
    return json.dumps(record, ensure_ascii=False, allow_nan=False)


def _members(results: SavedResults, transformation: ToWgs84) -> dict[str, Any]:
    """Foreign members (RFC 7946, section 6.1): where the positions come from."""
    return {
        "title": results.job.title,
        "date": results.job.date,
        "job_crs": results.job.crs,
        "transformation": {
            "from": transformation.source,
            "to": "WGS 84",
            "operation": transformation.operation,
            "accuracy_m": transformation.accuracy_m,
        },
        "cautions": results.cautions,
    }


def _features(layer: Layer) -> list[dict[str, Any]]:
    from shapely.geometry import mapping

    return [
        {"type": "Feature", "properties": {"layer": layer.name, **row}, "geometry": mapping(shape)}
        for row, shape in zip(layer.rows, prepared(layer.shapes), strict=True)
    ]


def prepared(shapes: NDArray[Any]) -> list[Any]:
    """Geometries rounded, in pieces where they cross the antimeridian (RFC 7946, section 3.1.9).

    Exterior rings stay anticlockwise (section 3.1.6), as outlines are made.
    """
    import shapely

    rounded = shapely.transform(shapes, lambda degrees: np.round(degrees, DECIMALS) + 0.0)
    bounds = shapely.bounds(rounded).reshape(-1, 4)
    crossing = bounds[:, 2] - bounds[:, 0] > 180.0
    return [cut(shape) if crosses else shape for shape, crosses in zip(rounded, crossing.tolist(), strict=True)]


def cut(shape: Any) -> Any:
    """The parts of a geometry on either side of the antimeridian, which it crosses the short way."""
    import shapely

    def eastern(degrees: FloatArray) -> FloatArray:
        return np.column_stack([np.where(degrees[:, 0] < 0, degrees[:, 0] + 360.0, degrees[:, 0]), degrees[:, 1]])

    whole = shapely.transform(shape, eastern)
    before, beyond = (whole.intersection(shapely.box(west, -90.0, west + 180.0, 90.0)) for west in (0.0, 180.0))
    moved = shapely.transform(beyond, lambda degrees: degrees - np.array([360.0, 0.0]))
    parts = [part for part in (before, moved) if not part.is_empty and part.geom_type == whole.geom_type]
    if len(parts) == 1:
        return shapely.orient_polygons(parts[0])
    several = shapely.multipolygons if whole.geom_type == "Polygon" else shapely.multilinestrings
    return shapely.orient_polygons(several(parts))
