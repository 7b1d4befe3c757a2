"""Every mistake in a table is reported with its file, line and column, what was read and what would be right."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import pytest

from tests.job_folders import ELLIPSOID, PLANE, mistakes_of


@dataclass(frozen=True)
class Broken:
    """One mistake: a piece of one table replaced, and the place and the words that its message must have."""

    table: str
    old: str
    new: str
    line: int | None
    column: str | None
    words: tuple[str, ...]
    base: Mapping[str, str] = field(default_factory=PLANE.copy)


VECTOR_ROW = "P1,P2,-521.540,930.331,337.251,5,4,6,0.2,0.5,0.3"

CASES = {
    # The header row.
    "missing column": Broken("levels.csv", "rise_m", "x_rise", 1, "rise", words=("missing", "rise_m or rise_mm")),
    "missing column of names": Broken("directions.csv", "setup", "x_s", 1, "setup", words=("missing", "needs it")),
    "misspelt column": Broken(
        "levels.csv", "length_km", "lenght_km", 1, "'lenght_km'", words=("unknown", "'length_km'")
    ),
    "capital letters": Broken("levels.csv", "rise_m", "Rise_m", 1, "'Rise_m'", words=("unknown", "'rise_m'")),
    "a column of another trade": Broken(
        "levels.csv", "length_km", "humidity", 1, "'humidity'", words=("unknown", "rise<len>", "x_…")
    ),
    "no unit": Broken("levels.csv", "rise_m", "rise", 1, "'rise'", words=("unit in the column name", "'rise_usft'")),
    "unit of another quantity": Broken(
        "azimuths.csv", "azimuth_deg", "azimuth_m", 1, "'azimuth_m'", words=("an angle has its unit", "'azimuth_gon'")
    ),
    "two units of one quantity": Broken(
        "levels.csv", "length_km", "rise_ft", 1, "'rise_ft'", words=("'rise_m'", "keep exactly one")
    ),
    "the same column twice": Broken("levels.csv", "length_km", "rise_m", 1, "'rise_m'", words=("twice", "remove one")),
    "a column without a title": Broken("levels.csv", "length_km", "", 2, None, words=("'0.4' in column 4", "no title")),
    "tabs": Broken(
        "levels.csv",
        "from,to,rise_m,length_km",
        "from\tto\trise_m\tlength_km",
        1,
        None,
        words=("tabs", "commas or semicolons"),
    ),
    "no distance at all": Broken(
        "distances.csv", "slope_m", "x_slope", 1, "slope<len>", words=("missing", "'horizontal<len>'")
    ),
    "easting without northing": Broken("marks.csv", "northing_m", "x_n", 1, "northing", words=("missing", "goes with")),
    "grid and geographic coordinates": Broken(
        "marks.csv",
        "easting_m,northing_m,height_m,plan_control,height_control",
        "easting_m,northing_m,latitude_deg,longitude_deg,height_m",
        1,
        "latitude_deg",
        words=("'easting_m' says the same", "one of the two"),
    ),
    "sds and covariances": Broken(
        "vectors.csv",
        "corr_xy,corr_xz,corr_yz",
        "cov_xx_m2,cov_xy_m2,cov_xz_m2",
        1,
        "cov_xx_m2",
        words=("'sd_x_mm' says the same",),
        base=ELLIPSOID,
    ),
    "a vector without precision": Broken(
        "vectors.csv",
        "sd_x_mm,sd_y_mm,sd_z_mm,corr_xy,corr_xz,corr_yz",
        "x_1,x_2,x_3,x_4,x_5,x_6",
        1,
        "sd_x<len>",
        words=("missing", "'cov_xx_m2'"),
        base=ELLIPSOID,
    ),
    # Rows.
    "too few cells": Broken("levels.csv", "001,A,1.0002,0.4", "001,A,1.0002", 2, None, words=("3 cells", "expected 4")),
    "too many cells": Broken(
        "levels.csv", "001,A,1.0002,0.4", "001,A,1,0002,0.4", 2, None, words=("5 cells", "expected 4", "semicolons")
    ),
    "an open quotation": Broken(
        "levels.csv", "001,A,1.0002", '"001,A,1.0002', 2, None, words=("not closed", "close it")
    ),
    # Numbers.
    "letters": Broken("levels.csv", "1.0002", "1.00O2", 2, "rise_m", words=("'1.00O2'", "a number such as")),
    "a unit in the cell": Broken("levels.csv", "1.0002", "1.0002 m", 2, "rise_m", words=("'1.0002 m'", "digits")),
    "not a number": Broken("levels.csv", "1.0002", "NaN", 2, "rise_m", words=("'NaN'", "finite", "blank")),
    "infinity": Broken("levels.csv", "1.0002", "-inf", 2, "rise_m", words=("'-inf'", "finite")),
    "endless": Broken("levels.csv", "1.0002", "1e400", 2, "rise_m", words=("'1e400'", "too large", "exponent")),
    "beyond the Earth": Broken("levels.csv", "1.0002", "1e30", 2, "rise_m", words=("'1e30'", "check the unit")),
    "decimal comma": Broken("levels.csv", "1.0002", '"1,0002"', 2, "rise_m", words=("'1,0002'", "semicolons")),
    "thousands separators": Broken("marks.csv", "1000.000", '"1,000.000"', 2, "easting_m", words=("thousands",)),
    "spaced thousands": Broken("marks.csv", "1000.000", "1 000.000", 2, "easting_m", words=("without spaces",)),
    "typographic minus": Broken("levels.csv", "1.0002", "−1.0002", 2, "rise_m", words=("plain minus",)),
    "blank value": Broken("levels.csv", "1.0002", "", 2, "rise_m", words=("blank", "expected a value")),
    "blank beside a wrong value": Broken(
        "levels.csv", "1.0002,0.4\nA,B,2.0001", ",0.4\nA,B,x", 2, "rise_m", words=("blank", "expected a value")
    ),
    # Angles.
    "61 minutes": Broken(
        "directions.csv", "303-41-24.2", "303-61-24.2", 3, "direction_dms", words=("61 minutes", "below 60")
    ),
    "60 seconds": Broken(
        "directions.csv", "303-41-24.2", "303-41-60", 3, "direction_dms", words=("60 seconds", "below 60")
    ),
    "decimal degrees": Broken(
        "directions.csv", "303-41-24.2", "303.69", 3, "direction_dms", words=("'303.69'", "123-45-06.7")
    ),
    "more than a circle": Broken(
        "angles.csv", "62.5666", "462.5666", 2, "angle_gon", words=("one full circle", "unit")
    ),
    "second face": Broken("zeniths.csv", "89.8346", "270.1654", 2, "zenith_deg", words=("'270.1654'", "second face")),
    "minus zenith": Broken("zeniths.csv", "89.8346", "-1", 2, "zenith_deg", words=("between 0 and 180",)),
    # Precision.
    "zero sd": Broken("azimuths.csv", "71.5651,3", "71.5651,0", 2, "sd_arcsec", words=("'0'", "above 0", "'use'")),
    "negative sd": Broken("azimuths.csv", "71.5651,3", "71.5651,-3", 2, "sd_arcsec", words=("'-3'", "above 0")),
    "correlation of one": Broken(
        "vectors.csv",
        VECTOR_ROW,
        VECTOR_ROW.replace("0.2", "1"),
        2,
        "corr_xy",
        words=("'1'", "between -1 and 1"),
        base=ELLIPSOID,
    ),
    "correlation over one": Broken(
        "vectors.csv",
        VECTOR_ROW,
        VECTOR_ROW.replace("0.2", "-1.2"),
        2,
        "corr_xy",
        words=("'-1.2'", "between -1 and 1"),
        base=ELLIPSOID,
    ),
    "impossible correlations": Broken(
        "vectors.csv",
        VECTOR_ROW,
        VECTOR_ROW.replace("0.2,0.5,0.3", "0.9,0.9,-0.9"),
        2,
        None,
        words=("not positive definite", "copy them again"),
        base=ELLIPSOID,
    ),
    "an sd missing": Broken(
        "vectors.csv",
        VECTOR_ROW,
        VECTOR_ROW.replace(",4,", ",,"),
        2,
        None,
        words=("incomplete", "three sds"),
        base=ELLIPSOID,
    ),
    "unknown instrument": Broken(
        "distances.csv",
        "target_height_m\n001,A,360.5567,1.55,1.60\nA,B,316.2346,1.52,1.60",
        "instrument\n001,A,360.5567,1.55,TS2\nA,B,316.2346,1.52,",
        2,
        "instrument",
        words=("'TS2'", "'TS1'"),
    ),
    "an instrument that is silent": Broken(
        "levels.csv",
        "length_km\n001,A,1.0002,0.4\nA,B,2.0001,0.5",
        "instrument\n001,A,1.0002,TS1\nA,B,2,TS1",
        2,
        "sd<len>",
        words=("no sd", "'TS1'", "length", "1 more row"),
    ),
    "no length and no setups": Broken(
        "levels.csv", "1.0002,0.4", "1.0002,", 2, "sd<len>", words=("'NA2'", "length or its setups")
    ),
    "zero length": Broken("levels.csv", "1.0002,0.4", "1.0002,0", 2, "length_km", words=("'0'", "distance above 0")),
    "half a setup": Broken(
        "levels.csv", "length_km\n001,A,1.0002,0.4", "setups\n001,A,1.0002,2.5", 2, "setups", words=("'2.5'", "whole")
    ),
    # Distances.
    "zero distance": Broken("distances.csv", "360.5567", "0", 2, "slope_m", words=("'0'", "distance above 0")),
    "negative distance": Broken("distances.csv", "360.5567", "-360.5567", 2, "slope_m", words=("distance above 0",)),
    "no distance": Broken("distances.csv", "360.5567", "", 2, "slope_m", words=("no distance", "exactly one")),
    "two distances": Broken(
        "distances.csv",
        "instrument_height_m,target_height_m",
        "horizontal_m,target_height_m",
        2,
        "slope_m",
        words=("both", "exactly one"),
    ),
    # Names.
    "unknown mark": Broken("levels.csv", "001,A", "01,A", 2, "from", words=("'01'", "a mark of marks.csv", "'001'")),
    "unknown mark, unlike any": Broken(
        "levels.csv", "001,A", "Lantern,A", 2, "from", words=("'Lantern'", "not a mark")
    ),
    "blank mark": Broken("levels.csv", "001,A", ",A", 2, "from", words=("blank", "a name")),
    "blank setup": Broken("directions.csv", "S2,A,001", ",A,001", 5, "setup", words=("blank", "a name")),
    "to itself": Broken("levels.csv", "001,A", "A,A", 2, "to", words=("'A' in 'from' and in 'to'", "different marks")),
    "an angle between one mark": Broken("angles.csv", "002,001,A", "002,A,A", 2, "to", words=("'A'", "different")),
    "a setup on two marks": Broken(
        "directions.csv",
        "S2,A,002",
        "S2,B,002",
        6,
        "at",
        words=("'B'", "setup 'S2' stands on 'A'", "directions.csv:5", "its own setup name"),
    ),
    "use": Broken(
        "levels.csv",
        "length_km\n001,A,1.0002,0.4",
        "use\n001,A,1.0002,maybe",
        2,
        "use",
        words=("'maybe'", "'yes' or 'no'"),
    ),
    # Marks.
    "duplicate mark": Broken(
        "marks.csv", "A,1200.0,2300.0,51.0", "B,,,", 5, "mark", words=("'B'", "marks.csv:4", "one row")
    ),
    "two control heights": Broken(
        "marks.csv",
        "B,1500.0,2400.0,,,",
        "002,1400.000,2000.000,52.5,fixed,fixed",
        5,
        "mark",
        words=("'002'", "marks.csv:3", "another height", "52 m there, 52.5 m here"),
    ),
    "unprintable name": Broken(
        "marks.csv", "B,1500.0", "B\u200b,1500.0", 5, "mark", words=("'B\\u200b'", "cannot be printed")
    ),
    "unknown control": Broken(
        "marks.csv", "52.000,fixed,fixed", "52.000,fixd,fixed", 3, "plan_control", words=("'fixd'", "'weighted'")
    ),
    "fixed without coordinates": Broken(
        "marks.csv", "002,1400.000,2000.000", "002,,", 3, "easting_m", words=("'002' is fixed", "lacks", "'free'")
    ),
    "fixed without height": Broken("marks.csv", "52.000,", ",", 3, "height_m", words=("'002' is fixed", "a height")),
    "weighted without sd": Broken(
        "marks.csv",
        "52.000,fixed,fixed",
        "52.000,fixed,weighted",
        3,
        "sd_height<len>",
        words=("weighted", "no sd", "'fixed'"),
    ),
    "half a position": Broken("marks.csv", "1500.0,2400.0", "1500.0,", 5, "northing_m", words=("'B'", "give both")),
    "weighted without coordinates": Broken(
        "marks.csv", "B,1500.0,2400.0,,,", "B,,,,weighted,", 5, "easting_m", words=("weighted", "lacks")
    ),
    "latitude beyond the pole": Broken(
        "marks.csv",
        "easting_m,northing_m,height_m,plan_control,height_control\nP1,500000.000,5400000.000",
        "latitude_deg,longitude_deg,height_m,plan_control,height_control\nP1,90.5,9",
        2,
        "latitude_deg",
        words=("'90.5'", "-90 and 90"),
        base=ELLIPSOID,
    ),
    "a deflection in degrees": Broken(
        "marks.csv",
        "plan_control,height_control\nP1,500000.000,5400000.000,400.000,fixed,fixed",
        "deflection_north_deg,deflection_east_arcsec\nP1,500000.000,5400000.000,400.000,5,3",
        2,
        "deflection_north_deg",
        words=("'5'", "check the unit"),
        base=ELLIPSOID,
    ),
}
"""What is broken, by name."""


@pytest.mark.parametrize("name", CASES)
def test_the_message_names_the_place_and_the_remedy(name: str, tmp_path: Path) -> None:
    case = CASES[name]
    text = case.base[case.table]
    assert isinstance(text, str)
    assert text.count(case.old) == 1, f"{case.old!r} stands {text.count(case.old)} times in {case.table}"
    found = mistakes_of(tmp_path, case.base, {case.table: text.replace(case.old, case.new)})
    place = (case.table, case.line, case.column)
    meant = [mistake for mistake in found if (mistake.file, mistake.line, mistake.column) == place]
    assert any(all(word in mistake.message for word in case.words) for mistake in meant), "\n".join(map(str, found))
