"""`hubtack blunders`: what it says, what it writes, and the way from a suspect over a decision to an adjustment."""

from __future__ import annotations

import csv
import hashlib
import json
import re
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

import adjust.reports.blunder_files as blunder_files
from adjust import read_job
from adjust.reports.blunder_files import BLUNDER_REPORTS
from adjust.reports.decision_table import ORDER
from adjust.units import INTERNATIONAL_FOOT, format_dms, parse_angle
from cli.main import run
from tests.exported import FIELD_DATA

Said = pytest.CaptureFixture[str]


@pytest.fixture
def town(tmp_path: Path) -> Path:
    """The street traverse with two digits of a distance exchanged."""
    return shutil.copytree(FIELD_DATA / "town_traverse", tmp_path / "town")


def edit(path: Path, number: int, old: str, new: str) -> None:
    lines = path.read_text("utf-8").split("\n")
    assert lines[number - 1].count(old) >= 1
    lines[number - 1] = lines[number - 1].replace(old, new, 1)
    path.write_text("\n".join(lines), "utf-8")


def digests(folder: Path) -> dict[str, str]:
    return {path.name: hashlib.sha256(path.read_bytes()).hexdigest() for path in folder.iterdir() if path.is_file()}


def rows_of(table: Path) -> list[dict[str, str]]:
    lines = [line for line in table.read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines, delimiter=";" if ";" in lines[0] else ","))


def decide(table: Path, choose: Callable[[dict[str, str]], tuple[str, str] | None]) -> None:
    """Edit a table as a spreadsheet would: `choose` gives decision and reason of a row, or None to leave it."""
    text = table.read_text("utf-8").splitlines()
    comments = [line for line in text if line.startswith("#")]
    rows = rows_of(table)
    separator = ";" if ";" in text[len(comments)] else ","
    for row in rows:
        chosen = choose(row)
        if chosen is not None:
            row["decision"], row["reason"] = chosen
    with table.open("w", encoding="utf-8", newline="") as file:
        file.writelines(f"{line}\n" for line in comments)
        writer = csv.DictWriter(file, list(rows[0]), delimiter=separator)
        writer.writeheader()
        writer.writerows(rows)


def accepted(row: dict[str, str]) -> tuple[str, str] | None:
    return ("correct", "digits exchanged, by the carbon copy") if row["value"] else None


def test_a_sound_job_is_status_0(tmp_path: Path, capsys: Said) -> None:
    folder = shutil.copytree(FIELD_DATA / "fen_levels", tmp_path / "fen")
    assert run(["blunders", str(folder), "--write", str(tmp_path / "decisions.csv")]) == 0
    said = capsys.readouterr()
    assert "Nothing checks 1 observation, a blunder there goes unseen: levels_day2.csv:8." in said.out
    assert "The search for blunders found none." in said.out
    assert not (tmp_path / "decisions.csv").exists()
    assert sorted(path.name for path in (folder / "out").iterdir()) == sorted(BLUNDER_REPORTS)


def test_a_job_without_any_check_does_not_pass_for_a_sound_one(tmp_path: Path, capsys: Said) -> None:
    fen = tmp_path / "fen"
    shutil.copytree(FIELD_DATA / "fen_levels", fen)
    (fen / "levels_day1.csv").write_text("from,to,rise_m,length_km\nBM17,F1,-0.5686,0.82\n", "utf-8")
    (fen / "levels_day2.csv").write_text("from,to,rise_m,length_km\nF1,F2,0.1,0.5\n", "utf-8")
    marks = (fen / "marks.csv").read_text("utf-8").splitlines()
    kept = [line for line in marks if line.startswith(("#", "mark", "BM17,", "F1,", "F2,"))]
    (fen / "marks.csv").write_text("\n".join(kept) + "\n", "utf-8")
    assert run(["blunders", str(fen)]) == 0
    said = capsys.readouterr().out
    assert "Nothing checks 2 observations, a blunder there goes unseen: levels_day1.csv:2; levels_day2.csv:2." in said
    assert "No blunder can be found: nothing checks these observations." in said
    assert "found none" not in said


def test_a_blunder_is_told_as_the_book_writes_it(town: Path, capsys: Said) -> None:
    assert run(["blunders", str(town)]) == 1
    said = re.sub(r"\s+", " ", capsys.readouterr().out)
    for words in (
        "1. horizontal distance 302 → 303 (distances.csv:13)",
        "in the book 168.561, expected 168.653 (horizontal_m)",
        "digits 6 and 5 exchanged: 168.651 in place of 168.561",
        "smallest error that shows in",
        "horizontal distances 17 0",
        "test 27.46, critical 3.29",
    ):
        assert words in said
    assert said.index("smallest error") < said.index("1. horizontal distance")


def test_records_and_listing_say_the_same_as_an_adjustment(town: Path, tmp_path: Path) -> None:
    assert run(["blunders", str(town), "--out", str(tmp_path / "a")]) == 1
    assert run(["adjust", str(town), "--out", str(tmp_path / "b")]) == 1
    alone = json.loads((tmp_path / "a" / "blunders.json").read_text("utf-8"))
    results = json.loads((tmp_path / "b" / "results.json").read_text("utf-8"))
    assert alone["blunders"] == results["blunders"]
    assert alone["job"]["input_sha256"] == results["job"]["input_sha256"]
    found = [(record["source"], record["explanations"][0]["corrections"]) for record in alone["blunders"]]
    assert found == [
        ("distances.csv:13", [{"source": "distances.csv:13", "column": "horizontal_m", "value": "168.651"}])
    ]
    kinds = {record["kind"]: record for record in alone["detectability"]}
    for kind, record in kinds.items():
        biases = [row["minimal_detectable_bias"] for row in results["observations"] if row["kind"] == kind]
        assert record["largest"] == max(biases)
        largest = next(row for row in results["observations"] if row["minimal_detectable_bias"] == record["largest"])
        assert record["worst"][0] == largest["source"]
    section = (tmp_path / "a" / "blunders.txt").read_text("utf-8").split("Blunders\n────────\n")[1].split("\n\n")[0]
    assert section in (tmp_path / "b" / "listing.txt").read_text("utf-8")


def test_unusable_and_unsolvable_jobs_are_status_2_and_3(town: Path, capsys: Said) -> None:
    marks = (town / "marks.csv").read_text("utf-8")
    (town / "marks.csv").write_text(marks.replace("fixed", "free"), "utf-8")
    assert run(["blunders", str(town)]) == 3
    edit(town / "marks.csv", 3, "998", "99l")
    assert run(["blunders", str(town)]) == 2
    assert "marks.csv:3" in capsys.readouterr().err
    assert not (town / "out").exists()


def test_errors_that_keep_the_adjustment_from_settling_are_searched_all_the_same(town: Path, capsys: Said) -> None:
    edit(town / "marks.csv", 4, "903.904", "9039.904")
    assert run(["adjust", str(town)]) == 3
    assert run(["blunders", str(town)]) == 1
    said = re.sub(r"\s+", " ", capsys.readouterr().out)
    assert "The adjustment does not settle with these errors in it" in said
    assert json.loads((town / "out" / "blunders.json").read_text("utf-8"))["adjusted"] is False


@pytest.mark.parametrize("spoilt", ["_write_records", "_write_listing"])
def test_both_files_or_neither(spoilt: str, town: Path, monkeypatch: pytest.MonkeyPatch, capsys: Said) -> None:
    assert run(["blunders", str(town)]) == 1
    before = digests(town / "out")

    def fail(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(blunder_files, spoilt, fail)
    edit(town / "distances.csv", 13, "168.561", "168.651")
    assert run(["blunders", str(town)]) == 2
    assert "earlier results are as they were" in capsys.readouterr().err
    assert digests(town / "out") == before


def test_a_suspect_is_found_explained_decided_and_adjusted(town: Path, tmp_path: Path, capsys: Said) -> None:
    before, table, out = digests(town), tmp_path / "decisions.csv", tmp_path / "out"
    assert run(["blunders", str(town), "--write", str(table), "--out", str(out)]) == 1
    assert f"Wrote 1 row to decide into {table}." in capsys.readouterr().out
    (row,) = rows_of(table)
    assert tuple(row)[: len(ORDER)] == ORDER
    assert (row["source"], row["decision"], row["column"]) == ("distances.csv:13", "keep", "horizontal_m")
    assert (row["written"], row["value"], row["proposal"]) == ("168.561", "168.651", "168.651")
    assert run(["adjust", str(town), "--decisions", str(table), "--out", str(out)]) == 1  # kept: nothing changes
    kept = json.loads((out / "results.json").read_text("utf-8"))
    assert kept["suspects"][0] == "distances.csv:13"

    decide(table, accepted)
    assert run(["adjust", str(town), "--decisions", str(table), "--out", str(out)]) == 0
    results = json.loads((out / "results.json").read_text("utf-8"))
    assert results["decisions"] == [
        {
            "source": "distances.csv:13",
            "decision": "correct",
            "column": "horizontal_m",
            "written": "168.561",
            "value": "168.651",
            "reason": "digits exchanged, by the carbon copy",
        }
    ]
    assert results["blunders"] == results["suspects"] == []
    assert not [caution for caution in kept["cautions"] if "by decision" in caution]
    assert [caution for caution in results["cautions"] if "by decision 1 entry is corrected" in caution]
    assert results["job"]["input_sha256"] != kept["job"]["input_sha256"]
    sentence = (
        "distances.csv:13: horizontal_m 168.561 corrected to 168.651. Reason: digits exchanged, by the carbon copy."
    )
    assert sentence in re.sub(r"\s+", " ", (out / "listing.txt").read_text("utf-8"))
    assert sentence in (out / "report.html").read_text("utf-8")
    assert run(["blunders", str(town), "--decisions", str(table), "--out", str(out)]) == 0
    assert digests(town) == before


def test_a_line_left_out_stands_in_the_reports(town: Path, tmp_path: Path) -> None:
    table, out = tmp_path / "decisions.csv", tmp_path / "out"
    table.write_text("source,decision,reason\ndistances.csv:13,leave_out,tape caught on a kerb\n", "utf-8")
    assert run(["adjust", str(town), "--decisions", str(table), "--out", str(out)]) == 0
    listing = re.sub(r"\s+", " ", (out / "listing.txt").read_text("utf-8"))
    assert "distances.csv:13: left out (horizontal_m 168.561). Reason: tape caught on a kerb." in listing
    assert "1 observation marked `use = no` or left out by decision" in listing
    results = json.loads((out / "results.json").read_text("utf-8"))
    assert results["decisions"][0]["value"] is None
    assert any("by decision 1 line is left out" in caution for caution in results["cautions"])
    assert "distances.csv:13" not in {record["source"] for record in results["observations"]}


def test_check_takes_decisions(town: Path, tmp_path: Path) -> None:
    table = tmp_path / "decisions.csv"
    table.write_text("source,decision,value,reason\ndistances.csv:13,correct,168.651,carbon copy\n", "utf-8")
    assert run(["check", str(town)]) == 1
    assert run(["check", str(town), "--decisions", str(table)]) == 0


def test_a_table_that_is_there_is_not_overwritten_but_added_to(town: Path, tmp_path: Path, capsys: Said) -> None:
    table = tmp_path / "decisions.csv"
    assert run(["blunders", str(town), "--write", str(table)]) == 1
    decide(table, accepted)
    decided = table.read_bytes()
    edit(town / "distances.csv", 9, "181.278", "187.278")
    capsys.readouterr()
    assert run(["blunders", str(town), "--write", str(table)]) == 2
    assert "may hold decisions" in capsys.readouterr().err
    assert table.read_bytes() == decided
    assert run(["blunders", str(town), "--decisions", str(table), "--write", str(table)]) == 1
    first, second = rows_of(table)
    assert (first["source"], first["decision"], first["value"]) == ("distances.csv:13", "correct", "168.651")
    assert first["reason"] == "digits exchanged, by the carbon copy"
    assert (second["source"], second["decision"], second["written"]) == ("distances.csv:9", "keep", "187.278")
    decide(table, lambda row: ("correct", "a 1 read as 7") if row["source"] == "distances.csv:9" else None)
    assert run(["adjust", str(town), "--decisions", str(table), "--out", str(tmp_path / "out")]) == 0


def test_a_mistaken_table_is_status_2_and_writes_nothing(town: Path, tmp_path: Path, capsys: Said) -> None:
    table = tmp_path / "decisions.csv"
    table.write_text("source,decision,value,reason\ndistances.csv:13,correct,168.651,\n", "utf-8")
    for command in ("adjust", "blunders", "check"):
        assert run([command, str(town), "--decisions", str(table)]) == 2
        assert f"{table}:2: reason: is blank" in capsys.readouterr().err
    assert not (town / "out").exists()


def in_feet(cells: list[str]) -> list[str]:
    return [*cells[:2], f"{float(cells[2]) / INTERNATIONAL_FOOT:.3f}"]


def in_gon(cells: list[str]) -> list[str]:
    return [*cells[:3], f"{parse_angle(cells[3], 'dms') / parse_angle('1', 'gon'):.5f}"]


def with_signs(cells: list[str]) -> list[str]:
    degrees, minutes, seconds = format_dms(parse_angle(cells[3], "dms"), 1).split("-")
    return [*cells[:3], f"{degrees}°{minutes}'{seconds}''"]


BOOKS = {
    "feet": ("distances.csv", "at,to,horizontal_ft", in_feet, ","),
    "gon": ("directions.csv", "setup,at,to,direction_gon", in_gon, ","),
    "degree signs": ("directions.csv", "setup,at,to,direction_dms", with_signs, ","),
    "semicolons and decimal commas": ("distances.csv", "at,to,horizontal_m", lambda cells: cells, ";"),
    "gon with decimal commas": ("directions.csv", "setup,at,to,direction_gon", in_gon, ";"),
}


@pytest.mark.parametrize("name", BOOKS)
def test_there_and_back_in_every_notation(name: str, town: Path, tmp_path: Path) -> None:
    """Digits are exchanged in a rewritten book; the proposal, accepted, gives the sound job to the last digit."""
    table, header, rewrite, separator = BOOKS[name]
    edit(town / "distances.csv", 13, "168.561", "168.651")
    lines = [line.split(",")[: len(header.split(","))] for line in (town / table).read_text("utf-8").splitlines()[2:]]
    cells = [header.split(","), *map(rewrite, lines)]
    text = "\n".join(separator.join(row) for row in cells) + "\n"
    (town / table).write_text(text.replace(".", ",") if separator == ";" else text, "utf-8")
    sound = read_job(town)
    number = 12
    value = (town / table).read_text("utf-8").splitlines()[number - 1].split(separator)[-1]
    spoilt = exchanged(value)
    assert spoilt != value
    edit(town / table, number, value, spoilt)

    decisions = tmp_path / "decisions.csv"
    assert run(["blunders", str(town), "--write", str(decisions)]) == 1
    assert rows_of(decisions)[0]["written"] == spoilt
    assert rows_of(decisions)[0]["value"] == value
    assert decisions.read_text("utf-8").splitlines()[2].count(separator) >= len(ORDER) - 1
    decide(decisions, lambda row: accepted(row) if row["source"] == f"{table}:{number}" else None)
    assert run(["adjust", str(town), "--decisions", str(decisions)]) == 0
    corrected = read_job(town, decisions)
    for was, now in zip(sound.observations, corrected.observations, strict=True):
        assert (was.observed == now.observed).all()


def exchanged(text: str) -> str:
    """The first two neighbouring digits that differ exchanged, from the second digit on."""
    places = [place for place in range(1, len(text) - 1) if text[place : place + 2].isdigit()]
    place = next(place for place in places if text[place] != text[place + 1])
    return text[:place] + text[place + 1] + text[place] + text[place + 2 :]


def test_a_shared_height_is_corrected_in_every_line_that_has_it(tmp_path: Path) -> None:
    dam = shutil.copytree(FIELD_DATA / "dam_control", tmp_path / "dam")
    table = tmp_path / "decisions.csv"
    for name in ("distances.csv", "zeniths.csv"):
        for number in range(10, 17):
            edit(dam / name, number, ",0.236,", ",0.263,")
    assert run(["blunders", str(dam), "--write", str(table)]) == 1
    rows = rows_of(table)
    lines = {f"{name}:{number}" for name in ("distances.csv", "zeniths.csv") for number in range(10, 17)}
    assert {row["source"] for row in rows} == lines
    assert {(row["column"], row["written"], row["value"]) for row in rows} == {
        ("instrument_height_m", "0.263", "0.236")
    }
    decide(table, accepted)
    assert run(["adjust", str(dam), "--decisions", str(table)]) == 0


def test_a_control_mark_is_corrected_or_held_no_longer(town: Path, tmp_path: Path) -> None:
    edit(town / "distances.csv", 13, "168.561", "168.651")
    edit(town / "marks.csv", 5, "1984.351", "1984.531")
    table = tmp_path / "decisions.csv"
    assert run(["blunders", str(town), "--write", str(table)]) == 1
    rows = {row["column"]: row for row in rows_of(table) if row["source"] == "marks.csv:5"}
    assert rows["easting_m"]["value"] == "1984.351"
    assert (rows["plan_control"]["written"], rows["plan_control"]["value"]) == ("fixed", "free")
    for column in ("easting_m", "plan_control"):
        copy = shutil.copy(table, tmp_path / f"{column}.csv")
        decide(Path(copy), lambda row, column=column: accepted(row) if row["column"] == column else None)  # type: ignore[misc]
        assert run(["adjust", str(town), "--decisions", str(copy)]) == 0


def test_readings_are_decided_line_by_line(tmp_path: Path) -> None:
    quarry = shutil.copytree(FIELD_DATA / "quarry_raw", tmp_path / "quarry")
    edit(quarry / "level_book.csv", 4, "2.3048", "2.4048")
    table = tmp_path / "decisions.csv"
    assert run(["blunders", str(quarry), "--write", str(table)]) == 1
    rows = rows_of(table)
    assert {row["source"] for row in rows} == {f"level_book.csv:{number}" for number in range(3, 11)}
    (reading,) = [row for row in rows if row["written"] == "2.4048"]
    assert abs(float(reading["x_expected"]) - 2.3048) < 0.002  # m: twice the sd of the section
    header = "source,decision,column,value,reason"
    table.write_text(f"{header}\nlevel_book.csv:4,correct,foresight_m,2.3048,staff misread\n", "utf-8")
    assert run(["adjust", str(quarry), "--decisions", str(table)]) == 0


def test_adjust_names_what_the_search_found(town: Path, capsys: Said) -> None:
    assert run(["adjust", str(town)]) == 1
    said = capsys.readouterr().out
    assert "The search for blunders names one error: distances.csv:13, probably digits 6 and 5 exchanged" in said


def test_a_large_job_is_adjusted_without_a_search(town: Path, monkeypatch: pytest.MonkeyPatch, capsys: Said) -> None:
    monkeypatch.setattr("cli.adjust.MOST_SEARCHED", 50)
    assert run(["adjust", str(town)]) == 1
    said = capsys.readouterr()
    assert "hubtack blunders searches" in said.err
    assert "The search for blunders" not in said.out
    assert json.loads((town / "out" / "results.json").read_text("utf-8"))["blunders"] is None
    assert "\nBlunders\n" not in (town / "out" / "listing.txt").read_text("utf-8")


def test_a_watch_hears_of_the_table_of_decisions(town: Path, tmp_path: Path, capsys: Said) -> None:
    from cli.watch import signature, watch_job

    table = tmp_path / "decided" / "decisions.csv"
    table.parent.mkdir()
    header = "source,decision,value,reason\n"
    table.write_text(f"{header}distances.csv:13,keep,,\n", "utf-8")

    def again() -> Iterator[None]:
        yield
        before = signature(town, town / "out", table)
        table.write_text(f"{header}distances.csv:13,correct,168.651,carbon copy\n", "utf-8")
        assert signature(town, town / "out", table) != before
        yield

    assert watch_job(town, town / "out", "worst", table, again()) == 0
    said = capsys.readouterr().out
    assert "20 observations are suspect" in said
    assert "No longer suspect: horizontal 302 → 303 (distances.csv:13)" in said
