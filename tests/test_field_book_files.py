"""The same table in any dress: separators, byte-order marks, line ends, quotes, comments, units, several files."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from tests.job_folders import ELLIPSOID, PLANE, job_of
from tests.test_field_book import assert_same_jobs, kind_of

TABLES = [name for name in PLANE if name.endswith(".csv")]


def dressed(change: object) -> dict[str, str]:
    """The plane job with every table's text changed."""
    return {name: change(text) if name in TABLES else text for name, text in PLANE.items()}  # type: ignore[operator]


def with_decimal_commas(text: str) -> str:
    return text.replace(",", ";").replace(".", ",")


def with_reversed_columns(text: str) -> str:
    return "".join(",".join(reversed(line.split(","))) + "\n" for line in text.splitlines())


def with_comments_and_blanks(text: str) -> str:
    header, *rows = text.splitlines()
    return "# first\n\n" + header + "\n  # indented\n,,,\n" + "\n\n".join(rows) + "\n#last"


def with_quotes(text: str) -> str:
    return "".join(",".join(f'"{cell}"' for cell in line.split(",")) + "\n" for line in text.splitlines())


def with_notes(text: str) -> str:
    header, *rows = text.splitlines()
    return f"note,{header},x_weather,x_\n" + "".join(f'"a, ""b""",{row},rain,\n' for row in rows)


def with_blank_columns(text: str) -> str:
    return "".join(f"{line},,\n" for line in text.splitlines())


DRESSES = {
    "semicolons and decimal commas": with_decimal_commas,
    "semicolons and decimal points": lambda text: text.replace(",", ";"),
    "byte-order mark": lambda text: "\ufeff" + text,
    "carriage returns and line feeds": lambda text: text.replace("\n", "\r\n"),
    "carriage returns alone": lambda text: text.replace("\n", "\r"),
    "no end of the last line": lambda text: text.rstrip("\n"),
    "spaces around cells": lambda text: text.replace(",", " ,\t "),
    "quotes": with_quotes,
    "columns in another order": with_reversed_columns,
    "comments and blank lines": with_comments_and_blanks,
    "notes and columns of one's own": with_notes,
    "blank columns of a spreadsheet": with_blank_columns,
}


@pytest.mark.parametrize("dress", DRESSES)
def test_dress_makes_no_difference(dress: str, tmp_path: Path) -> None:
    plain = job_of(tmp_path / "plain", PLANE)
    other = job_of(tmp_path / "other", dressed(DRESSES[dress]))
    assert_same_jobs(plain, other)
    assert other.notes == ()


UNITS = {
    "distances.csv": (
        ["slope_m", "slope_mm", "slope_km", "slope_ft", "slope_usft"],
        [1.0, 1e-3, 1e3, 0.3048, 1200 / 3937],
    ),
    "azimuths.csv": (
        ["azimuth_deg", "azimuth_gon", "azimuth_rad", "azimuth_arcsec", "azimuth_mgon"],
        [1.0, 0.9, 180 / np.pi, 1 / 3600, 0.0009],
    ),
}


@pytest.mark.parametrize("table", UNITS)
def test_units_of_the_column_name(table: str, tmp_path: Path) -> None:
    titles, factors = UNITS[table]
    base, kind = (360.5567, "slope_distance") if table == "distances.csv" else (71.5651, "azimuth")
    values = []
    for title, factor in zip(titles, factors, strict=True):
        text = f"at,to,{title},instrument\n001,A,{base / factor!r},TS1\n"
        values.append(kind_of(job_of(tmp_path / title, PLANE, {table: text}), kind).observed[0, 0])
    np.testing.assert_allclose(values, values[0], rtol=1e-14)


def test_degrees_minutes_and_seconds_with_symbols(tmp_path: Path) -> None:
    table = PLANE["directions.csv"]
    with_symbols = re.sub(r"(\d+)-(\d\d)-(\d\d\.\d)", r"\1°\2'\3" + '"', table)
    assert "41'24.2\"" in with_symbols
    assert_same_jobs(job_of(tmp_path / "1", PLANE), job_of(tmp_path / "2", PLANE, {"directions.csv": with_symbols}))


def test_a_table_in_several_files(tmp_path: Path) -> None:
    header, *rows = PLANE["directions.csv"].splitlines()
    files = {
        "directions.csv": None,
        "day1/directions.csv": "\n".join([header, *rows[:2]]),
        "day2.csv": with_decimal_commas("\n".join([header, *rows[2:]])),
        "job.toml": PLANE["job.toml"]
        + '[tables]\ndirections = ["day1/directions.csv", "day2.csv"]\nlevels = "lv.csv"\n',
        "lv.csv": PLANE["levels.csv"],
        "levels.csv": None,
    }
    split = job_of(tmp_path / "split", PLANE, files)
    assert_same_jobs(job_of(tmp_path / "whole", PLANE), split)
    labels = [kind_of(split, "direction").provenance.label(row) for row in range(5)]
    assert labels == ["day1/directions.csv:2", "day1/directions.csv:3", "day2.csv:2", "day2.csv:3", "day2.csv:4"]


def test_files_of_one_table_may_differ_in_units_and_columns(tmp_path: Path) -> None:
    files = {
        "distances.csv": None,
        "a.csv": "at,to,slope_m\n001,A,360.5567\n",
        "b.csv": "to;at;sd_mm;horizontal_ft\nB;A;2,5;1000\n",
        "job.toml": PLANE["job.toml"] + '[tables]\ndistances = ["a.csv", "b.csv"]\n',
    }
    job = job_of(tmp_path, PLANE, files)
    assert kind_of(job, "slope_distance").observed.tolist() == [[360.5567]]
    horizontal = kind_of(job, "horizontal_distance")
    assert horizontal.observed[0, 0] == pytest.approx(304.8, rel=1e-15)
    assert horizontal.precision.stated[0] == pytest.approx(0.0025, rel=1e-15)


def test_order_of_rows_does_not_change_them(tmp_path: Path) -> None:
    header, *rows = PLANE["levels.csv"].splitlines()
    turned = job_of(tmp_path / "2", PLANE, {"levels.csv": "\n".join([header, *reversed(rows)])})
    straight = job_of(tmp_path / "1", PLANE)
    np.testing.assert_array_equal(
        kind_of(turned, "height_difference").observed[::-1], kind_of(straight, "height_difference").observed
    )


def test_a_long_table_is_cut_the_same_way_in_pieces(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    rows = [f"001,A,{1 + place / 1000},0.4" for place in range(200)]
    rows[50] = "# a comment"
    rows[120] = '"001",A,1.12,0.4'
    levels = "\n".join(["from,to,rise_m,length_km", *rows])
    whole = job_of(tmp_path / "1", PLANE, {"levels.csv": levels})
    monkeypatch.setattr("adjust.field_book.sheet.CHUNK", 100)
    pieces = job_of(tmp_path / "2", PLANE, {"levels.csv": levels})
    assert_same_jobs(whole, pieces)
    one, other = kind_of(whole, "height_difference"), kind_of(pieces, "height_difference")
    np.testing.assert_array_equal(one.provenance.line, other.provenance.line)
    assert len(one) == 199


def test_geographic_crs(tmp_path: Path) -> None:
    tables = {
        "job.toml": ELLIPSOID["job.toml"].replace("EPSG:25832", "EPSG:4258"),
        "marks.csv": "mark,latitude_deg,longitude_deg,height_m\nP1,48.75,9,400\nP2,48.76,9.01,410\n",
    }
    job = job_of(tmp_path, ELLIPSOID, tables)
    np.testing.assert_allclose(np.degrees(job.marks.given[:, :2]), [[9, 48.75], [9.01, 48.76]], rtol=1e-15)
