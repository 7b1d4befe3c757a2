"""DXF and LandXML exports, read back with ezdxf and lxml."""

from __future__ import annotations

import math
import re
from datetime import date, time
from pathlib import Path
from typing import Any

import ezdxf
import numpy as np
import pytest
from lxml import etree

from adjust import FieldDataError
from adjust.reports.exports import Options, export
from tests.exported import HOSTILE, plain_of, saved, with_hostile_names

JOBS_IN_PLAN = ["dam_control", "town_traverse", "quarry_raw", "total station", "free", "gnss", "mixed"]
NAMESPACE = "{http://www.landxml.org/schema/LandXML-1.2}"


def in_plan(name: str) -> dict[str, Any]:
    return {mark["mark"]: mark for mark in plain_of(name)["marks"] if mark["easting_m"] is not None}


class TestDrawing:
    @pytest.mark.parametrize("name", JOBS_IN_PLAN)
    def test_an_audit_finds_nothing_and_every_mark_is_there(self, name: str, tmp_path: Path) -> None:
        path = tmp_path / "results.dxf"
        export(saved(name), "dxf", path)
        document = ezdxf.readfile(path)
        audit = document.audit()
        assert not audit.errors
        assert not audit.fixes
        assert document.header["$INSUNITS"] == 6  # metres
        space, marks = document.modelspace(), in_plan(name)
        points = [tuple(point.dxf.location) for point in space.query("POINT")]
        expected = [(mark["easting_m"], mark["northing_m"], mark["height_m"] or 0.0) for mark in marks.values()]
        np.testing.assert_allclose(points, expected, rtol=0, atol=2e-9)  # m: PROJ's rounding
        names = [text.plain_text() for text in space.query('TEXT[layer=="NAMES"]')]
        assert names == list(marks)
        heights = [text.plain_text() for text in space.query('TEXT[layer=="HEIGHTS"]')]
        assert heights == [f"{mark['height_m']:.4f}" for mark in marks.values() if mark["height_m"] is not None]
        assert len(space.query("LINE")) == sum(line["distance_m"] is not None for line in plain_of(name)["relative"])

    def test_layers_tell_marks_by_status_and_suspect_lines(self, tmp_path: Path) -> None:
        path = tmp_path / "results.dxf"
        export(saved("town_traverse"), "dxf", path)
        space = ezdxf.readfile(path).modelspace()
        by_layer = {layer: len(points) for layer, points in space.query("POINT").groupby("layer").items()}
        statuses = [mark["plan_status"] for mark in in_plan("town_traverse").values()]
        assert by_layer == {f"MARKS_{status.upper()}": statuses.count(status) for status in set(statuses)}
        marks = in_plan("town_traverse")
        ends = {(marks[name]["easting_m"], marks[name]["northing_m"]) for name in ("302", "303")}
        suspect = space.query('LINE[layer=="LINES_SUSPECT"]')
        assert any({(line.dxf.start.x, line.dxf.start.y), (line.dxf.end.x, line.dxf.end.y)} == ends for line in suspect)

    @pytest.mark.parametrize("exaggeration", [None, 1.0, 2500.0])
    def test_ellipses(self, exaggeration: float | None, tmp_path: Path) -> None:
        """Axes as in the results, times the exaggeration that the drawing states."""
        path = tmp_path / "results.dxf"
        (sentence,) = export(saved("dam_control"), "dxf", path, Options(exaggeration))
        stated = float(re.search(r"drawn ([\d.e+]+) times", sentence)[1])  # type: ignore[index]
        assert exaggeration is None or stated == exaggeration
        space = ezdxf.readfile(path).modelspace()
        assert sentence in [text.plain_text() for text in space.query('TEXT[layer=="NOTES"]')]
        marks = {(m["easting_m"], m["northing_m"]): m["ellipse_confidence"] for m in in_plan("dam_control").values()}
        drawn = space.query("ELLIPSE")
        assert len(drawn) == sum(ellipse["semi_major_mm"] > 0 for ellipse in marks.values())
        for entity in drawn:
            centre = np.array([entity.dxf.center.x, entity.dxf.center.y])
            ellipse = min(marks.items(), key=lambda item: float(np.hypot(*(np.array(item[0]) - centre))))[1]
            axis = entity.dxf.major_axis
            assert axis.magnitude * 1000 / stated == pytest.approx(ellipse["semi_major_mm"], rel=1e-9)
            assert entity.dxf.ratio == pytest.approx(ellipse["semi_minor_mm"] / ellipse["semi_major_mm"], rel=1e-9)
            turn = math.degrees(math.atan2(axis.x, axis.y)) - ellipse["azimuth_deg"]
            assert (turn + 90) % 180 - 90 == pytest.approx(0, abs=1e-6)  # deg

    def test_the_exaggeration_chosen_is_a_round_number_and_fits(self, tmp_path: Path) -> None:
        path = tmp_path / "results.dxf"
        for name in JOBS_IN_PLAN:
            export(saved(name), "dxf", path)
            space = ezdxf.readfile(path).modelspace()
            marks = np.array([tuple(point.dxf.location)[:2] for point in space.query("POINT")])
            largest = max(entity.dxf.major_axis.magnitude for entity in space.query("ELLIPSE"))
            share = largest / np.hypot(*(marks.max(axis=0) - marks.min(axis=0)))
            assert share * (1 + 1e-9) >= 1 / 25 / 2.5  # the next round number is at most 2.5 times as large
            assert share <= 1 / 25 * (1 + 1e-9)

    def test_hostile_names_are_drawn_as_they_are(self, tmp_path: Path) -> None:
        path = tmp_path / "results.dxf"
        export(saved("dam_control", with_hostile_names), "dxf", path)
        document = ezdxf.readfile(path)
        names = [text.plain_text() for text in document.modelspace().query('TEXT[layer=="NAMES"]')]
        assert names[: len(HOSTILE)] == list(HOSTILE)
        assert not document.audit().errors


def schema_errors(root: Any) -> list[str]:
    """What breaks the rules of the LandXML 1.2 schema (2008) for the elements that are used; from memory.

    Required attributes and their types of LandXML, Units/Metric, Project, Application, CgPoint and Property; the values
    that enumerations allow; the order and number of elements; points of two or three numbers.
    """
    errors = []
    required = {
        "LandXML": {"version", "date", "time"},
        "Metric": {"areaUnit", "linearUnit", "volumeUnit", "temperatureUnit", "pressureUnit"},
        "Project": {"name"},
        "Application": {"name"},
        "Property": {"label", "value"},
    }
    allowed = {
        "LandXML": required["LandXML"] | {"language", "readOnly", "LandXMLId", "crc"},
        "Units": set(),
        "Metric": required["Metric"] | {"diameterUnit", "widthUnit", "heightUnit", "angularUnit", "directionUnit"},
        "CoordinateSystem": {"desc", "name", "epsgCode", "ogcWktCode", "horizontalDatum", "verticalDatum"},
        "Project": {"name", "desc", "state"},
        "Application": {"name", "desc", "manufacturer", "version", "manufacturerURL", "timeStamp"},
        "CgPoints": {"name", "desc", "code", "state", "zoneNumber"},
        "CgPoint": {"name", "desc", "code", "state", "pntRef", "timeStamp", "oID", "surveyOrder", "pntSurv"},
        "Feature": {"name", "code", "source"},
        "Property": {"label", "value"},
    }
    children = {
        "LandXML": "(Units)(CoordinateSystem)?(Project)?(Application)*(CgPoints)*",
        "Units": "(Metric|Imperial)",
        "CgPoints": "(CgPoint|CgPoints|Feature)*",
        "Feature": "(Property)*",
    }
    choices = {
        "areaUnit": {"hectare", "squareMeter", "squareMillimeter", "squareCentimeter"},
        "linearUnit": {"millimeter", "centimeter", "meter", "kilometer"},
        "volumeUnit": {"cubicMeter", "liter", "hectareMeter"},
        "temperatureUnit": {"celsius", "kelvin"},
        "pressureUnit": {"HPA", "mmHG", "milliBars", "milliBar"},
        "angularUnit": {"radians", "grads", "decimal degrees", "decimal dd.mm.ss"},
        "directionUnit": {"radians", "grads", "decimal degrees", "decimal dd.mm.ss"},
        "pntSurv": {"monument", "control", "sideshot", "boundary", "natural boundary", "traverse", "reference"},
    }
    for element in root.iter(etree.Element):
        name = element.tag.removeprefix(NAMESPACE)
        attributes = {key for key in element.attrib if not key.startswith("{")}
        if not required.get(name, set()) <= attributes <= allowed.get(name, set()):
            errors.append(f"{name}: attributes {attributes}")
        errors += [f"{name}.{k}" for k in attributes & set(choices) if element.attrib[k] not in choices[k]]
        inside = "".join(f"{child.tag.removeprefix(NAMESPACE)} " for child in element)
        pattern = re.sub(r"([A-Za-z]+)", r"\1 ", children.get(name, ""))
        if not re.fullmatch(pattern, inside):
            errors.append(f"{name}: holds {inside[:60]}")
        if name == "CgPoint" and not re.fullmatch(r"(-?[\d.]+(e[-+]?\d+)? ?){2,3}", element.text or ""):
            errors.append(f"CgPoint: {element.text}")
    return errors


def points_of(path: Path) -> tuple[Any, list[Any]]:
    root = etree.parse(path).getroot()
    return root, root.findall(f"{NAMESPACE}CgPoints/{NAMESPACE}CgPoint")


class TestLandxml:
    @pytest.mark.parametrize("name", JOBS_IN_PLAN)
    def test_rules_of_the_schema(self, name: str, tmp_path: Path) -> None:
        path = tmp_path / "results.xml"
        export(saved(name), "landxml", path)
        root, _ = points_of(path)
        assert root.tag == f"{NAMESPACE}LandXML"
        assert root.get("version") == "1.2"
        date.fromisoformat(root.get("date"))
        time.fromisoformat(root.get("time"))
        assert schema_errors(root) == []

    def test_the_rules_can_be_broken(self, tmp_path: Path) -> None:
        path = tmp_path / "results.xml"
        export(saved("gnss"), "landxml", path)
        text = path.read_text("utf-8")
        for found, put in (
            ('linearUnit="meter"', 'linearUnit="yard"'),
            ("<Application", "<Units/><Application"),
            ("label=", "lable="),
            ("</CgPoint>", " 1.0</CgPoint>"),
            ("<CgPoint name", "<CgPoint mark"),
            ("<Property", "<CgPoints"),
        ):
            assert found in text
            broken = text.replace(found, put, 1).replace("<CgPoints label", "<CgPoints name")
            assert schema_errors(etree.fromstring(broken.encode())) != []

    @pytest.mark.parametrize("name", JOBS_IN_PLAN)
    def test_points_are_northing_easting_elevation(self, name: str, tmp_path: Path) -> None:
        path = tmp_path / "results.xml"
        export(saved(name), "landxml", path)
        _, points = points_of(path)
        marks = in_plan(name)
        assert [point.get("name") for point in points] == list(marks)
        for point in points:
            mark = marks[point.get("name")]
            expected = [mark[key] for key in ("northing_m", "easting_m", "height_m") if mark[key] is not None]
            assert [float(figure) for figure in point.text.split()] == expected
            assert (point.get("pntSurv") == "control") == (mark["plan_status"] in ("fixed", "weighted"))

    def test_features_hold_the_other_figures(self, tmp_path: Path) -> None:
        path = tmp_path / "results.xml"
        export(saved("dam_control"), "landxml", path)
        root, _ = points_of(path)
        features = {feature.get("name"): feature for feature in root.iter(f"{NAMESPACE}Feature")}
        for name, mark in in_plan("dam_control").items():
            properties = {entry.get("label"): entry.get("value") for entry in features[name]}
            assert float(properties["sd_easting_mm"]) == mark["sd_easting_mm"]
            assert float(properties["ellipse_confidence_azimuth_deg"]) == mark["ellipse_confidence"]["azimuth_deg"]
            assert properties["plan_status"] == mark["plan_status"]

    def test_marks_without_a_plan_are_named(self, tmp_path: Path) -> None:
        (sentence,) = export(saved("dam_control"), "landxml", tmp_path / "results.xml")
        assert sentence.endswith("HB1, HB2")

    def test_coordinate_system(self, tmp_path: Path) -> None:
        path = tmp_path / "results.xml"
        export(saved("dam_control"), "landxml", path)
        root, _ = points_of(path)
        assert root.find(f"{NAMESPACE}CoordinateSystem").get("epsgCode") == "25833"

    def test_hostile_names_are_only_names(self, tmp_path: Path) -> None:
        path = tmp_path / "results.xml"
        export(saved("dam_control", with_hostile_names), "landxml", path)
        root, points = points_of(path)
        assert [point.get("name") for point in points][: len(HOSTILE)] == list(HOSTILE)
        assert schema_errors(root) == []

    def test_characters_that_xml_cannot_hold_are_marked(self, tmp_path: Path) -> None:
        def with_bell(plain: dict[str, Any]) -> None:
            plain["job"]["title"] = "ring\x07"

        path = tmp_path / "results.xml"
        export(saved("gnss", with_bell), "landxml", path)
        root, _ = points_of(path)
        assert root.find(f"{NAMESPACE}Project").get("name") == "ring\N{REPLACEMENT CHARACTER}"


@pytest.mark.parametrize("form", ["dxf", "landxml"])
class TestBoth:
    def test_a_geographic_crs_is_refused_with_the_remedy(self, form: str, tmp_path: Path) -> None:
        def geographic(plain: dict[str, Any]) -> None:
            plain["job"]["crs"] = "EPSG:4258"

        with pytest.raises(FieldDataError, match="Give the job a projected CRS"):
            export(saved("dam_control", geographic), form, tmp_path / "results")
        assert list(tmp_path.iterdir()) == []

    def test_levels_without_a_place_are_refused(self, form: str, tmp_path: Path) -> None:
        with pytest.raises(FieldDataError, match="no mark has plan coordinates"):
            export(saved("fen_levels"), form, tmp_path / "results")

    def test_the_same_results_make_the_same_bytes(self, form: str, tmp_path: Path) -> None:
        for name in ("a", "b"):
            export(saved("dam_control"), form, tmp_path / name)
        assert (tmp_path / "a").read_bytes() == (tmp_path / "b").read_bytes()
