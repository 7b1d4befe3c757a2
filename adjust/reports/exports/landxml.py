"""LandXML 1.2: the marks as coordinate geometry points, each with a feature that holds its figures.

Source: LandXML.org, LandXML-1.2 schema (2008), elements LandXML, Units, Metric, CoordinateSystem, Project, Application,
CgPoints, CgPoint, Feature and Property; from memory, as the schema is not to be had where this was written.
"""

from __future__ import annotations

import re
from pathlib import Path
from xml.etree import ElementTree

import numpy as np

from adjust.errors import FieldDataError, Mistake
from adjust.frames import EllipsoidFrame, Frame
from adjust.reports.exports.layers import NOWHERE
from adjust.reports.exports.options import Options
from adjust.reports.exports.places import places_of
from adjust.reports.exports.rows import Cell, mark_row
from adjust.reports.exports.text import legal, one_line
from adjust.reports.saved import RESULTS, MarkRecord, SavedResults

NAMESPACE = "http://www.landxml.org/schema/LandXML-1.2"
LOCATION = f"{NAMESPACE} http://www.landxml.org/schema/LandXML-1.2/LandXML-1.2.xsd"
INSTANCE = "http://www.w3.org/2001/XMLSchema-instance"

UNDATED = "1970-01-01"
"""The schema asks for a date; a job without one gets this, so that the same results make the same bytes."""

GEOGRAPHIC = (
    "LandXML points are northing, easting and elevation, and a geographic CRS has no grid. "
    "Give the job a projected CRS in job.toml, or export geojson, gpkg, csv or xlsx"
)
WITHOUT_PLAN = "Marks without plan coordinates are left out, as a LandXML point needs them: "

METRIC = {
    "areaUnit": "squareMeter",
    "linearUnit": "meter",
    "volumeUnit": "cubicMeter",
    "temperatureUnit": "celsius",
    "pressureUnit": "milliBars",
    "angularUnit": "decimal degrees",
    "directionUnit": "decimal degrees",
}

IN_THE_POINT = ("mark", "easting_m", "northing_m", "height_m", "description")
"""Figures that the point itself holds."""


def write_landxml(results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
    """Points in metres, northing first as the schema has it; returns a sentence that names marks without a plan.

    Raises FieldDataError for a geographic CRS, and where no mark has plan coordinates.
    """
    places = places_of(results)
    if isinstance(places.frame, EllipsoidFrame) and places.frame.is_geographic:
        raise FieldDataError([Mistake(RESULTS, None, "job.crs", GEOGRAPHIC)])
    if not places.in_plan.any():
        raise FieldDataError([Mistake(RESULTS, None, "marks", NOWHERE)])
    root = _head(results, places.frame)
    points = ElementTree.SubElement(root, "CgPoints", name=legal(results.job.title))
    placed = [results.marks[row] for row in np.flatnonzero(places.in_plan).tolist()]
    points.extend([_point(mark) for mark in placed])
    points.extend([_feature(mark) for mark in placed])
    ElementTree.indent(root, "")
    with path.open("wb") as file:
        ElementTree.ElementTree(root).write(file, "utf-8", xml_declaration=True)
        file.write(b"\n")
    missing = [results.marks[row].mark for row in np.flatnonzero(~places.in_plan).tolist()]
    return (WITHOUT_PLAN + ", ".join(missing),) if missing else ()


def _head(results: SavedResults, frame: Frame) -> ElementTree.Element:
    """Everything that stands before the points."""
    root = ElementTree.Element(
        "LandXML",
        {
            "xmlns": NAMESPACE,
            "xmlns:xsi": INSTANCE,
            "xsi:schemaLocation": LOCATION,
            "version": "1.2",
            "date": results.job.date or UNDATED,
            "time": "00:00:00",
            "readOnly": "false",
        },
    )
    ElementTree.SubElement(ElementTree.SubElement(root, "Units"), "Metric", METRIC)
    if isinstance(frame, EllipsoidFrame):
        ElementTree.SubElement(root, "CoordinateSystem", _coordinate_system(frame))
    ElementTree.SubElement(root, "Project", name=legal(results.job.title), desc=_description(results))
    ElementTree.SubElement(root, "Application", name="Hubtack")
    return root


def _coordinate_system(frame: EllipsoidFrame) -> dict[str, str]:
    code = re.fullmatch(r"EPSG:(\d+)", frame.crs, re.IGNORECASE)
    return {"desc": legal(frame.crs)} | ({"epsgCode": code[1]} if code else {})


def _description(results: SavedResults) -> str:
    basis = results.solution.sd_basis
    return legal(
        " ".join([f"Adjusted coordinates, sds on the {basis} basis; computed, not certified.", *results.cautions])
    )


def _point(mark: MarkRecord) -> ElementTree.Element:
    """Northing, easting and, where there is one, elevation; `control` marks those that were held or weighted."""
    attributes = {"name": legal(mark.mark)}
    if mark.description:
        attributes["desc"] = one_line(mark.description)
    if mark.plan_status in ("fixed", "weighted"):
        attributes["pntSurv"] = "control"
    point = ElementTree.Element("CgPoint", attributes)
    figures = [mark.northing_m, mark.easting_m, mark.height_m]
    point.text = " ".join(repr(figure) for figure in figures if figure is not None)
    return point


def _feature(mark: MarkRecord) -> ElementTree.Element:
    """The other figures of the mark, under its name."""
    feature = ElementTree.Element("Feature", name=legal(mark.mark), code="adjusted mark")
    for name, value in mark_row(mark).items():
        if value is not None and name not in IN_THE_POINT:
            ElementTree.SubElement(feature, "Property", label=name, value=_value(value))
    return feature


def _value(value: Cell) -> str:
    return repr(value) if isinstance(value, float) else legal(str(value))
