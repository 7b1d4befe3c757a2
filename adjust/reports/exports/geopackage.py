"""OGC GeoPackage in the job's own CRS, through GDAL: layers marks, lines and ellipses."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from adjust.frames import EllipsoidFrame
from adjust.reports.exports.layers import Layer, layers
from adjust.reports.exports.options import Options
from adjust.reports.exports.places import in_own_crs, map_crs, places_of
from adjust.reports.exports.rows import Cell
from adjust.reports.libraries import library
from adjust.reports.saved import SavedResults

CONTENTS_DATE = "1970-01-01T00:00:00.000Z"
"""Of `last_change`, which the format asks for: the same results make the same bytes, whenever they are exported."""

NO_CRS = "A plane frame has no CRS: the layers are in metres on an undefined plane, which lies nowhere on a map."


def write_geopackage(results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
    """Three layers in the job's CRS, in its unit; in a plane frame on an undefined plane, which the result says.

    Raises FieldDataError where no mark has a plan position, OutputError where pyogrio is not installed.
    """
    pyogrio = library("pyogrio", "gis")
    places = places_of(results)
    frame = places.frame
    crs = map_crs(frame).to_wkt() if isinstance(frame, EllipsoidFrame) else None
    drawn = layers(results, places, in_own_crs(frame), options.exaggeration or 1.0)
    date = pyogrio.get_gdal_config_option("OGR_CURRENT_DATE")
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": CONTENTS_DATE})
    try:
        for number, layer in enumerate(drawn):
            _write_layer(layer, path, crs, append=number > 0)
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": date})
    return () if crs else (NO_CRS,)


def _write_layer(layer: Layer, path: Path, crs: str | None, append: bool) -> None:
    import warnings

    import shapely
    from pyogrio.raw import write

    columns = _columns(layer)
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", "'crs' was not provided", UserWarning)
        warnings.filterwarnings("ignore", "(?s).*extension", RuntimeWarning)  # a file may be called as its owner likes
        write(
            str(path),
            np.asarray(shapely.to_wkb(layer.shapes), dtype=object),
            [values for values, _ in columns.values()],
            list(columns),
            field_mask=[missing for _, missing in columns.values()],
            layer=layer.name,
            driver="GPKG",
            geometry_type=layer.geometry,
            crs=crs,
            append=append,
        )


def _columns(layer: Layer) -> dict[str, tuple[NDArray[Any], NDArray[np.bool_]]]:
    """Values and where they are missing, by name."""
    names = list(layer.rows[0]) if layer.rows else []
    return {name: _column([row[name] for row in layer.rows]) for name in names}


def _column(cells: Sequence[Cell]) -> tuple[NDArray[Any], NDArray[np.bool_]]:
    """Text where any cell is text, else numbers."""
    missing = np.array([cell is None for cell in cells], dtype=bool)
    if any(isinstance(cell, str) for cell in cells):
        return np.array(["" if cell is None else cell for cell in cells], dtype=object), missing
    return np.array([np.nan if cell is None else cell for cell in cells], dtype=float), missing
