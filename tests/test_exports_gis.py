"""GeoJSON and GeoPackage exports, read back with GDAL."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pyogrio
import pyogrio.raw
import pytest
import shapely
from pyproj import CRS, Geod, Transformer

from adjust import FieldDataError
from adjust.reports.exports import Options, export
from adjust.reports.exports.geojson import cut
from adjust.reports.exports.places import places_of
from tests.exported import HOSTILE, plain_of, saved, with_hostile_names


def geojson(tmp_path: Path, name: str, options: Options | None = None, change: Any = lambda plain: None) -> Any:
    path = tmp_path / "results.geojson"
    export(saved(name, change), "geojson", path, options)
    return json.loads(path.read_text("utf-8"))


def layer(path: Path, name: str) -> tuple[Any, dict[str, Any], Any]:
    """Metadata, columns by name and geometries of a layer, as GDAL reads it."""
    meta, _, shapes, columns = pyogrio.raw.read(path, layer=name)
    return meta, dict(zip(meta["fields"], columns, strict=True)), shapely.from_wkb(shapes)


class TestGeojson:
    def test_gdal_reads_every_mark_line_and_ellipse(self, tmp_path: Path) -> None:
        collection = geojson(tmp_path, "dam_control")
        meta, _, _, _ = pyogrio.raw.read(tmp_path / "results.geojson")
        assert CRS(meta["crs"]) == CRS("EPSG:4326")
        kinds = [feature["properties"]["layer"] for feature in collection["features"]]
        plain = plain_of("dam_control")
        placed = [mark for mark in plain["marks"] if mark["latitude_deg"] is not None]
        assert kinds.count("marks") == len(placed)
        assert kinds.count("lines") == sum(line["distance_m"] is not None for line in plain["relative"])
        assert kinds.count("ellipses") == sum(bool(mark["ellipse"]["semi_major_mm"]) for mark in placed)
        assert len(kinds) == pyogrio.read_info(tmp_path / "results.geojson")["features"]

    def test_structure_of_rfc_7946(self, tmp_path: Path) -> None:
        """Sections 3 and 4: members of each object, no CRS but WGS 84, longitude first."""
        collection = geojson(tmp_path, "gnss")
        assert collection["type"] == "FeatureCollection"
        assert "crs" not in collection
        for feature in collection["features"]:
            assert set(feature) == {"type", "properties", "geometry"}
            shape = shapely.from_geojson(json.dumps(feature["geometry"]))
            west, south, east, north = shape.bounds
            assert -180 <= west <= east <= 180
            assert -90 <= south <= north <= 90
            if shape.geom_type == "Polygon":
                assert shape.exterior.is_ccw  # section 3.1.6, the right-hand rule
                assert shape.exterior.coords[0] == shape.exterior.coords[-1]
                assert shape.is_valid

    def test_positions_are_those_of_an_independent_transformation(self, tmp_path: Path) -> None:
        """ETRS89 to WGS 84 (1), EPSG:1149: all parameters 0, accuracy 1 m (EPSG Geodetic Parameter Dataset)."""
        collection = geojson(tmp_path, "dam_control")
        marks = {mark["mark"]: mark for mark in plain_of("dam_control")["marks"]}
        for feature in collection["features"]:
            if feature["properties"]["layer"] == "marks":
                mark = marks[feature["properties"]["mark"]]
                expected = (mark["longitude_deg"], mark["latitude_deg"])
                np.testing.assert_allclose(feature["geometry"]["coordinates"], expected, rtol=0, atol=1e-11)  # deg
        assert collection["transformation"] == {
            "from": "ETRS89",
            "to": "WGS 84",
            "operation": "ETRS89 to WGS 84 (1)",
            "accuracy_m": 1.0,
        }

    @pytest.mark.parametrize(("crs", "metres"), [("EPSG:31467", 100.0), ("EPSG:27572", 50.0), ("EPSG:26710", 50.0)])
    def test_other_datums_are_shifted(self, crs: str, metres: float, tmp_path: Path) -> None:
        """Datums that differ from WGS 84 by tens of metres and more; one counts grads from Paris."""

        def moved(plain: dict[str, Any]) -> None:
            area = CRS(crs).area_of_use
            assert area is not None
            plain["job"]["crs"] = crs
            for step, mark in enumerate(plain["marks"]):
                mark["longitude_deg"] = (area.west + area.east) / 2 + 0.001 * step
                mark["latitude_deg"] = (area.south + area.north) / 2

        collection = geojson(tmp_path, "gnss", change=moved)
        transformation = collection["transformation"]
        assert 0 < transformation["accuracy_m"] <= 30
        shapes = [f["geometry"]["coordinates"] for f in collection["features"] if f["properties"]["layer"] == "marks"]
        for mark, (longitude, latitude) in zip(saved("gnss", moved).marks, shapes, strict=True):
            assert mark.longitude_deg is not None
            assert mark.latitude_deg is not None
            _, _, shift = Geod(ellps="WGS84").inv(mark.longitude_deg, mark.latitude_deg, longitude, latitude)
            assert metres < shift < 1000
            metre_grid = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
            east, north = Transformer.from_crs(CRS(crs).geodetic_crs, crs, always_xy=True).transform(
                *_in_degrees_of(crs, mark.longitude_deg, mark.latitude_deg)
            )
            np.testing.assert_allclose(
                metre_grid.transform(east, north), (longitude, latitude), rtol=0, atol=2e-4
            )  # deg

    def test_an_ellipse_has_its_size_and_direction_on_the_ground(self, tmp_path: Path) -> None:
        """Measured with geodesics: major axis along its azimuth from grid north, minor across, 95 % and 1000 times."""
        collection = geojson(tmp_path, "dam_control", Options(exaggeration=1000.0))
        results = saved("dam_control")
        places = places_of(results)
        for feature in collection["features"]:
            if feature["properties"]["layer"] != "ellipses":
                continue
            row = places.index[feature["properties"]["mark"]]
            mark = results.marks[row]
            assert feature["properties"]["exaggeration"] == 1000.0
            assert feature["properties"]["confidence"] == 0.95
            assert feature["properties"]["semi_major_mm"] == mark.ellipse_confidence.semi_major_mm
            corners = np.array(feature["geometry"]["coordinates"][0][:-1])
            centre = np.broadcast_to([mark.longitude_deg, mark.latitude_deg], corners.shape)
            azimuth, _, radius = Geod(ellps="GRS80").inv(*centre.T, *corners.T)
            longest = int(np.argmax(radius))
            # m: 1 mm of 1:1000, heights of 700 m above the ellipsoid change lengths by 1e-4
            assert radius[longest] == pytest.approx(mark.ellipse_confidence.semi_major_mm, rel=3e-4)
            assert radius.min() == pytest.approx(mark.ellipse_confidence.semi_minor_mm, rel=3e-4)
            north = math.degrees(places.frame.grid_rotation(places.coordinates[row : row + 1])[0])
            turn = (azimuth[longest] - north - mark.ellipse_confidence.azimuth_deg + 90) % 180 - 90
            flat = 1 - mark.ellipse_confidence.semi_minor_mm / mark.ellipse_confidence.semi_major_mm
            assert abs(turn) < 0.02 / flat  # deg: a corner that is a little longer by rounding

    def test_plane_frames_are_refused_with_the_remedy(self, tmp_path: Path) -> None:
        with pytest.raises(FieldDataError, match=r"Give the job a CRS .*job\.toml"):
            geojson(tmp_path, "town_traverse")
        assert list(tmp_path.iterdir()) == []

    def test_levels_without_a_place_are_refused(self, tmp_path: Path) -> None:
        def without(plain: dict[str, Any]) -> None:
            for mark in plain["marks"]:
                mark["longitude_deg"] = mark["latitude_deg"] = None

        with pytest.raises(FieldDataError, match="no mark has plan coordinates"):
            geojson(tmp_path, "gnss", change=without)

    def test_shapes_across_the_antimeridian_are_cut(self) -> None:
        """RFC 7946, section 3.1.9: no part crosses it, and nothing is lost."""
        line = cut(shapely.LineString([(179.0, 10.0), (-179.0, 12.0)]))
        assert line.geom_type == "MultiLineString"
        assert [part.bounds for part in line.geoms] == [(179.0, 10.0, 180.0, 11.0), (-180.0, 11.0, -179.0, 12.0)]
        square = cut(shapely.Polygon([(179.0, 0.0), (-179.0, 0.0), (-179.0, 1.0), (179.0, 1.0)]))
        assert square.geom_type == "MultiPolygon"
        assert square.area == pytest.approx(2.0, abs=1e-12)
        assert all(part.exterior.is_ccw for part in square.geoms)

    def test_hostile_names_are_only_names(self, tmp_path: Path) -> None:
        collection = geojson(tmp_path, "dam_control", change=with_hostile_names)
        marks = [f["properties"]["mark"] for f in collection["features"] if f["properties"]["layer"] == "marks"]
        assert marks[: len(HOSTILE)] == list(HOSTILE)
        meta, _, _, columns = pyogrio.raw.read(tmp_path / "results.geojson")
        assert list(columns[list(meta["fields"]).index("mark")][: len(HOSTILE)]) == list(HOSTILE)


def _in_degrees_of(crs: str, longitude: float, latitude: float) -> tuple[float, float]:
    """In the unit and from the meridian of the CRS: grads from Paris at 2.5969213 grads for Lambert zones."""
    if crs != "EPSG:27572":
        return longitude, latitude
    return longitude / 0.9 - 2.5969213, latitude / 0.9


class TestGeopackage:
    def test_layers_in_the_crs_of_the_job(self, tmp_path: Path) -> None:
        path = tmp_path / "results.gpkg"
        assert export(saved("dam_control"), "gpkg", path) == ()
        assert [list(entry) for entry in pyogrio.list_layers(path)] == [
            ["marks", "Point"],
            ["lines", "LineString"],
            ["ellipses", "Polygon"],
        ]
        meta, columns, shapes = layer(path, "marks")
        assert CRS(meta["crs"]) == CRS("EPSG:25833")
        marks = {mark["mark"]: mark for mark in plain_of("dam_control")["marks"]}
        for name, shape in zip(columns["mark"], shapes, strict=True):
            mark = marks[name]
            expected = (mark["easting_m"], mark["northing_m"])
            np.testing.assert_allclose((shape.x, shape.y), expected, rtol=0, atol=2e-9)  # m: PROJ's rounding
        assert set(columns["mark"]) == {name for name, mark in marks.items() if mark["easting_m"] is not None}

    def test_figures_and_their_absence_survive(self, tmp_path: Path) -> None:
        path = tmp_path / "results.gpkg"
        export(saved("mixed"), "gpkg", path)
        _, columns, _ = layer(path, "marks")
        marks = {mark["mark"]: mark for mark in plain_of("mixed")["marks"]}
        for key in ("sd_easting_mm", "sd_height_mm", "height_m", "latitude_deg", "horizontal_95_mm", "height_95_mm"):
            expected = [np.nan if marks[name][key] is None else marks[name][key] for name in columns["mark"]]
            np.testing.assert_array_equal(columns[key].astype(float), expected)

    def test_lines_say_what_was_observed_and_what_is_suspect(self, tmp_path: Path) -> None:
        path = tmp_path / "results.gpkg"
        export(saved("town_traverse"), "gpkg", path)
        _, columns, shapes = layer(path, "lines")
        ends = list(zip(columns["from"], columns["to"], strict=True))
        plain = plain_of("town_traverse")
        assert ends == [(line["from"], line["to"]) for line in plain["relative"]]
        lengths = np.array([line["distance_m"] for line in plain["relative"]])
        np.testing.assert_allclose(shapely.length(shapes), lengths, rtol=0, atol=1e-9)  # m
        worst = plain["suspects"][0]
        assert [set(pair) for pair, text in zip(ends, columns["suspects"], strict=True) if worst in text.split()] == [
            {"302", "303"}
        ]
        assert set(" ".join(columns["kinds"]).split()) == {"direction", "horizontal_distance"}

    def test_ellipses_in_a_plane_frame_have_their_area(self, tmp_path: Path) -> None:
        path = tmp_path / "results.gpkg"
        (sentence,) = export(saved("total station"), "gpkg", path, Options(exaggeration=10.0))
        assert "no CRS" in sentence
        meta, columns, shapes = layer(path, "ellipses")
        assert meta["crs"] is None or "Undefined" in meta["crs"]
        area = np.pi * columns["semi_major_mm"] * columns["semi_minor_mm"] * 1e-6 * 10.0**2
        inscribed = 72 / 2 * np.sin(2 * np.pi / 72) / np.pi  # of the circle: a regular polygon of 72 corners
        np.testing.assert_allclose(shapely.area(shapes), inscribed * area, rtol=1e-6)

    def test_a_crs_in_feet_gets_feet(self, tmp_path: Path) -> None:
        """EPSG:2263, New York Long Island, is in US survey feet of 1200/3937 m."""

        def in_feet(plain: dict[str, Any]) -> None:
            plain["job"]["crs"] = "EPSG:2263"
            for step, mark in enumerate(plain["marks"]):
                mark["longitude_deg"], mark["latitude_deg"] = -73.9 + 0.001 * step, 40.8

        path = tmp_path / "results.gpkg"
        export(saved("gnss", in_feet), "gpkg", path)
        _, _, shapes = layer(path, "marks")
        expected = Transformer.from_crs("EPSG:4269", "EPSG:2263", always_xy=True).transform(-73.9, 40.8)
        np.testing.assert_allclose(shapely.get_coordinates(shapes)[0], expected, rtol=0, atol=1e-6)  # ft

    @pytest.mark.parametrize("crs", ["EPSG:4258", "EPSG:4937", "EPSG:4936", "EPSG:5555"])
    def test_geographic_geocentric_and_compound_crs(self, crs: str, tmp_path: Path) -> None:
        def renamed(plain: dict[str, Any]) -> None:
            plain["job"]["crs"] = crs

        path = tmp_path / "results.gpkg"
        export(saved("dam_control", renamed), "gpkg", path)
        meta, columns, shapes = layer(path, "marks")
        assert len(CRS(meta["crs"]).axis_info) == 2
        mark = next(mark for mark in plain_of("dam_control")["marks"] if mark["mark"] == columns["mark"][0])
        back = Transformer.from_crs(meta["crs"], "EPSG:4258", always_xy=True)
        place = back.transform(*shapely.get_coordinates(shapes)[0])
        np.testing.assert_allclose(place, (mark["longitude_deg"], mark["latitude_deg"]), rtol=0, atol=1e-10)  # deg

    def test_hostile_names_are_only_names(self, tmp_path: Path) -> None:
        path = tmp_path / "results.gpkg"
        export(saved("dam_control", with_hostile_names), "gpkg", path)
        _, columns, _ = layer(path, "marks")
        assert list(columns["mark"][: len(HOSTILE)]) == list(HOSTILE)


@pytest.mark.parametrize("form", ["geojson", "gpkg"])
def test_the_same_results_make_the_same_bytes(form: str, tmp_path: Path) -> None:
    for name in ("a", "b"):
        export(saved("dam_control"), form, tmp_path / name)
    assert (tmp_path / "a").read_bytes() == (tmp_path / "b").read_bytes()
