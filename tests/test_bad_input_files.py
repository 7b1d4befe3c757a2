"""Files that are none, jobs that are incomplete, many mistakes at once, and rubbish by the million rows."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import pytest

from adjust import FieldDataError, read_job
from adjust.errors import HubtackError, Mistake
from tests.job_folders import ELLIPSOID, PLANE, Files, mistakes_of, write_folder

LEVELS = PLANE["levels.csv"]
ACCENTED = LEVELS + "# nivelé au col\n"

# What stands in levels.csv: content, line, words.
CONTENTS: dict[str, tuple[bytes, int | None, tuple[str, ...]]] = {
    "no bytes": (b"", None, ("empty", "header row")),
    "a byte-order mark alone": (b"\xef\xbb\xbf", None, ("empty", "header row")),
    "blank lines alone": (b"\n\n,,\n# comment\n", None, ("empty", "header row")),
    "a header row alone": (b"from,to,rise_m,length_km\n", None, ("no rows", "take the file away")),
    "Latin-1": (ACCENTED.encode("latin-1"), 4, ("0xE9", "not UTF-8", "Latin-1", "save")),
    "UTF-16": (LEVELS.encode("utf-16"), None, ("UTF-16", "UTF-8")),
    "UTF-16 without a mark": (LEVELS.encode("utf-16-le"), 1, ("NUL", "CSV")),
    "NUL bytes": (LEVELS.replace("0.5", "0.\x005").encode(), 3, ("NUL",)),
    "a picture": (b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR", 3, ("NUL",)),
    "random bytes": (bytes(range(128, 256)) * 9, 1, ("0x80", "not UTF-8")),
    "a bell": (LEVELS.replace("0.5", "0.\x075").encode(), 3, ("U+0007", "control character", "take it out")),
    "a next line of another computer": (ACCENTED.replace("é", "\x85").encode(), 4, ("character 8 ", "U+0085")),
    "one endless line": (b"x" * 3_000_000, 1, ("unknown column",)),
    "a web page": (b"<!DOCTYPE html>\n<html><body>503</body></html>\n", 1, ("unknown column",)),
}


def in_file(found: tuple[Mistake, ...], file: str) -> list[Mistake]:
    return [mistake for mistake in found if mistake.file == file]


@pytest.mark.parametrize("name", CONTENTS)
def test_a_table_that_is_none(name: str, tmp_path: Path) -> None:
    content, line, words = CONTENTS[name]
    found = mistakes_of(tmp_path, PLANE, {"levels.csv": content})
    assert found == tuple(in_file(found, "levels.csv"))
    first = found[0]
    assert first.line == line
    assert all(word in first.message for word in words), str(first)
    assert len(str(first)) < 500


@pytest.mark.parametrize("name", ["no bytes", "a byte-order mark alone", "blank lines alone"])
def test_an_empty_table_is_one_mistake(name: str, tmp_path: Path) -> None:
    assert len(mistakes_of(tmp_path, PLANE, {"levels.csv": CONTENTS[name][0]})) == 1


def test_control_characters_that_an_escape_smuggles_in(tmp_path: Path) -> None:
    job_file = 'title = "A\\u0007B"\n[frame]\nkind = "plane"\n["instruments"."T\\u0001"]\nlevel_mm_per_setup = 1\n'
    found = mistakes_of(tmp_path, PLANE, {"job.toml": job_file.encode()})
    assert {(mistake.line, mistake.column) for mistake in found} == {(1, "title"), (None, "instruments")}
    assert all("control character" in mistake.message for mistake in found)


def test_a_job_file_in_the_wrong_encoding(tmp_path: Path) -> None:
    found = mistakes_of(tmp_path, PLANE, {"job.toml": 'title = "Höhen"\n'.encode("latin-1")})
    assert [(mistake.file, mistake.line) for mistake in found] == [("job.toml", 1)]
    assert "not UTF-8" in found[0].message


# Folders and files.


def message_of(path: Path) -> str:
    with pytest.raises(FieldDataError) as caught:
        read_job(path)
    return str(caught.value)


def test_no_such_job(tmp_path: Path) -> None:
    assert "there is no such job" in message_of(tmp_path / "nowhere")


@pytest.mark.parametrize("path", ["x\0y", "n" * 5000, ""])
def test_impossible_paths(path: str) -> None:
    with pytest.raises(FieldDataError):
        read_job(path)


def test_a_folder_without_a_job_file(tmp_path: Path) -> None:
    assert 'kind = "plane"' in message_of(tmp_path)


def test_a_table_for_a_job_file(tmp_path: Path) -> None:
    write_folder(tmp_path, PLANE)
    assert "no job file" in message_of(tmp_path / "marks.csv")


@pytest.mark.parametrize("name", ["levels.csv", "job.toml"])
def test_a_folder_for_a_file(name: str, tmp_path: Path) -> None:
    (tmp_path / name).mkdir(parents=True)
    (found,) = mistakes_of(tmp_path, PLANE, {name: None})
    assert (found.file, found.message) == (name, "is a folder, expected a file")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no pipes in folders")
def test_a_pipe_for_a_file(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "levels.csv")
    (found,) = mistakes_of(tmp_path, PLANE, {"levels.csv": None})
    assert "a pipe" in found.message


def test_a_file_that_may_not_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(path: Path) -> bytes:
        raise PermissionError(13, "Permission denied", str(path))

    write_folder(tmp_path, PLANE)
    monkeypatch.setattr(Path, "read_bytes", refuse)
    assert message_of(tmp_path) == "job.toml: cannot be read (Permission denied); check its name and permissions"


def test_no_marks(tmp_path: Path) -> None:
    found = mistakes_of(tmp_path, PLANE, {"marks.csv": None})
    assert [(mistake.file, mistake.line) for mistake in found] == [("marks.csv", None)]
    assert "lists its marks" in found[0].message


def test_no_observations(tmp_path: Path) -> None:
    only_marks = {name: text for name, text in PLANE.items() if name in ("job.toml", "marks.csv")}
    (found,) = mistakes_of(tmp_path, only_marks)
    assert found.file == "job.toml"
    assert "no observations" in found.message
    assert "levels.csv" in found.message


def test_no_observation_in_use(tmp_path: Path) -> None:
    only_levels = {name: text for name, text in PLANE.items() if name in ("job.toml", "marks.csv")}
    (found,) = mistakes_of(tmp_path, only_levels, {"levels.csv": "from,to,rise_m,length_km,use\n001,A,1,1,no\n"})
    assert "every observation has use = no" in found.message


# What tables and frame say together.


def test_vectors_in_a_plane(tmp_path: Path) -> None:
    vectors = ELLIPSOID["vectors.csv"].replace("P1", "001").replace("P2", "A")
    (found,) = mistakes_of(tmp_path, PLANE, {"vectors.csv": vectors})
    assert (found.file, found.line) == ("vectors.csv", 2)
    assert "need an ellipsoid frame" in found.message


def test_latitudes_in_a_plane(tmp_path: Path) -> None:
    marks = "mark,latitude_deg,longitude_deg,height_m\n001,48,9,50\n002,48,9.1,52\nA,,,\nB,,,\n"
    (found,) = mistakes_of(tmp_path, PLANE, {"marks.csv": marks})
    assert (found.file, found.line, found.column) == ("marks.csv", 2, "latitude_deg")
    assert "plane frame has no latitude" in found.message


def test_eastings_in_a_geographic_crs(tmp_path: Path) -> None:
    job_file = ELLIPSOID["job.toml"].replace("25832", "4258")
    (found,) = mistakes_of(tmp_path, ELLIPSOID, {"job.toml": job_file})
    assert (found.file, found.line, found.column) == ("marks.csv", 2, "easting_m")
    assert "geographic CRS has no eastings" in found.message


def test_coordinates_off_the_map(tmp_path: Path) -> None:
    marks = ELLIPSOID["marks.csv"].replace("501000.000", "501000000")
    (found,) = mistakes_of(tmp_path, ELLIPSOID, {"marks.csv": marks})
    assert (found.file, found.line, found.column) == ("marks.csv", 3, "easting_m")
    assert "'P2'" in found.message
    assert "check the coordinates, their unit and the CRS" in found.message


def test_marks_that_lack_a_geoid_height(tmp_path: Path) -> None:
    job_file = ELLIPSOID["job.toml"].replace('"ellipsoidal"', '"orthometric"')
    marks = ELLIPSOID["marks.csv"].replace("control\n", "control,geoid_m\n").replace("fixed\n", "fixed,47.3\n")
    marks = marks.replace("410.000,,", "410.000,,,")
    (found,) = mistakes_of(tmp_path, ELLIPSOID, {"job.toml": job_file, "marks.csv": marks})
    assert (found.file, found.line, found.column) == ("marks.csv", 3, "geoid_m")
    assert "'P2'" in found.message
    assert "geoid_grid" in found.message


# Many mistakes.


def test_mistakes_of_all_files_come_together_in_order(tmp_path: Path) -> None:
    changes: Files = {
        "job.toml": PLANE["job.toml"] + "[statistics]\npower = 80\n",
        "marks.csv": PLANE["marks.csv"].replace("1200.0", "x").replace("1000.000", "y"),
        "levels.csv": LEVELS.replace("001,A", "OO1,A").replace("2.0001", "2,0001"),
        "zeniths.csv": b"\xff\xfe",
    }
    found = mistakes_of(tmp_path, PLANE, changes)
    places = [(mistake.file, mistake.line, mistake.column) for mistake in found]
    assert places == [
        ("job.toml", len(PLANE["job.toml"].splitlines()) + 2, "statistics.power"),
        ("marks.csv", 2, "easting_m"),
        ("marks.csv", 4, "easting_m"),
        ("zeniths.csv", None, None),
        ("levels.csv", 2, "from"),
        ("levels.csv", 3, None),
    ]


def test_marks_that_could_not_all_be_read_are_not_missed_elsewhere(tmp_path: Path) -> None:
    found = mistakes_of(tmp_path, PLANE, {"marks.csv": PLANE["marks.csv"].replace("A,1200.0,2300.0", "A,1200.0")})
    assert {mistake.file for mistake in found} == {"marks.csv"}


def test_one_unknown_mark_is_told_once(tmp_path: Path) -> None:
    rows = "".join(f"Q,A,{rise},1\n" for rise in range(1, 51))
    (found,) = mistakes_of(tmp_path, PLANE, {"levels.csv": "from,to,rise_m,length_km\n" + rows})
    assert found.line == 2
    assert found.message.endswith("(and 49 more rows like it)")


def test_twenty_mistakes_are_shown(tmp_path: Path) -> None:
    rows = "".join(f"001,A,x{row},y{row}\n" for row in range(200))
    write_folder(tmp_path, {**PLANE, "levels.csv": "from,to,rise_m,length_km\n" + rows})
    lines = message_of(tmp_path).splitlines()
    assert len(lines) == 21
    assert lines[:2] == [
        "levels.csv:2: rise_m: read 'x0', expected a number such as 12.345; digits, a point and a leading sign only",
        "levels.csv:2: length_km: read 'y0', expected a number such as 12.345; digits, a point and a leading sign only",
    ]
    assert lines[19].startswith("levels.csv:11: length_km: read 'y9'")
    assert "at least 22 more" in lines[20]


HEADER = "from,to,rise_m,length_km\n"
MILLION = 1_000_000
RUBBISH: dict[str, Callable[[], str]] = {
    "letters for numbers": lambda: HEADER + "001,A,north,south\n" * MILLION,
    "unknown marks": lambda: HEADER + "".join(f"q{row},w{row},1,1\n" for row in range(MILLION)),
    "rows of every length": lambda: HEADER + "".join("," * (row % 17) + "z\n" for row in range(MILLION)),
    "no table at all": lambda: "lorem ipsum dolor sit amet\n" * MILLION,
    "quotation marks": lambda: HEADER + '"001,A,1\n' * MILLION,
}


@pytest.mark.parametrize("name", RUBBISH)
def test_a_million_rows_of_rubbish_are_refused_early(
    name: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Early: after the first block of lines, not after the last."""
    cut = []
    from adjust.field_book.sheet import Sheet

    plain = Sheet._cut

    def counted(sheet: Sheet, *arguments: object, **options: object) -> object:
        cut.append(sheet.file)
        return plain(sheet, *arguments, **options)  # type: ignore[arg-type]

    monkeypatch.setattr(Sheet, "_cut", counted)
    write_folder(tmp_path, {**PLANE, "levels.csv": RUBBISH[name]()})
    message = message_of(tmp_path)
    assert len(message) < 8000
    assert len(message.splitlines()) <= 21
    assert cut.count("levels.csv") <= 1


def test_the_error_is_one_that_the_command_line_knows() -> None:
    assert issubclass(FieldDataError, HubtackError)
