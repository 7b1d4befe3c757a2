"""`hubtack adjust`: exit statuses, what is said where, and files written all or nothing."""

import re
import shutil
import subprocess
import sys
from pathlib import Path

import click
import pytest

import cli.adjust
from adjust.field_book.writing import write_job
from adjust.reports import REPORTS
from cli.main import hubtack, run
from tests.adjusted_networks import JOBS

ROOT = Path(__file__).parents[1]


@pytest.fixture
def folder_of(tmp_path):
    def written(name):
        folder = tmp_path / name.replace(" ", "-")
        write_job(JOBS[name](), folder)
        return folder

    return written


def reports_in(folder):
    return {name: (folder / name).read_bytes() for name in REPORTS if (folder / name).exists()}


def test_sound_job_is_status_0_with_a_verdict_on_stdout(folder_of, capsys):
    folder = folder_of("levelling")
    assert run(["adjust", str(folder)]) == 0
    said = capsys.readouterr()
    assert said.out.startswith("The observations agree as well as their sds promise")
    assert str(folder / "out") in said.out
    assert said.err == ""
    assert sorted(reports_in(folder / "out")) == sorted(REPORTS)


def test_suspect_observation_is_status_1(folder_of, capsys):
    assert run(["adjust", str(folder_of("blunder"))]) == 1
    assert "directions.csv:20" in capsys.readouterr().out


def test_job_file_and_its_folder_are_the_same_job(folder_of, tmp_path):
    folder = folder_of("levelling")
    assert run(["adjust", str(folder), "--out", str(tmp_path / "a")]) == 0
    assert run(["adjust", str(folder / "job.toml"), "--out", str(tmp_path / "b")]) == 0
    assert reports_in(tmp_path / "a") == reports_in(tmp_path / "b")
    assert not (folder / "out").exists()
    assert run(["adjust", str(folder / "job.toml")]) == 0
    assert reports_in(folder / "out") == reports_in(tmp_path / "a")


def test_order_of_the_listing(folder_of, tmp_path):
    folder = folder_of("levelling")
    run(["adjust", str(folder), "--out", str(tmp_path / "worst")])
    run(["adjust", str(folder), "--out", str(tmp_path / "book"), "--order", "book"])
    worst, book = reports_in(tmp_path / "worst"), reports_in(tmp_path / "book")
    assert b"Observations, worst first" in worst["listing.txt"]
    assert b"Observations, in the order of the book" in book["listing.txt"]
    assert {name for name in REPORTS if worst[name] != book[name]} == {"listing.txt"}


def test_unusable_field_data_are_status_2_and_leave_the_old_files(folder_of, capsys):
    folder = folder_of("levelling")
    run(["adjust", str(folder)])
    before = reports_in(folder / "out")
    table = folder / "levels.csv"
    lines = table.read_text("utf-8").splitlines()
    lines[3] = re.sub(r"[0-9]\.[0-9]", "x", lines[3], count=1)
    table.write_text("\n".join(lines), "utf-8")
    capsys.readouterr()
    assert run(["adjust", str(folder)]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err.startswith("levels.csv:4: ")
    assert reports_in(folder / "out") == before


def test_missing_job_is_status_2(tmp_path, capsys):
    assert run(["adjust", str(tmp_path / "nowhere")]) == 2
    assert "nowhere" in capsys.readouterr().err
    assert list(tmp_path.iterdir()) == []


def test_network_without_control_is_status_3(folder_of, capsys):
    folder = folder_of("levelling")
    marks = folder / "marks.csv"
    marks.write_text(marks.read_text("utf-8").replace("fixed", "free"), "utf-8")
    assert run(["adjust", str(folder)]) == 3
    said = capsys.readouterr()
    assert said.out == ""
    assert "height" in said.err
    assert not (folder / "out").exists()


def test_place_that_cannot_be_written_is_status_2(folder_of, tmp_path, capsys):
    (tmp_path / "taken").write_text("a file")
    assert run(["adjust", str(folder_of("levelling")), "--out", str(tmp_path / "taken")]) == 2
    assert "cannot be written" in capsys.readouterr().err
    assert (tmp_path / "taken").read_text() == "a file"


@pytest.mark.parametrize(
    "arguments", [["adjust"], ["adjust", "a", "b"], ["adjust", ".", "--order", "random"], ["ajust"]]
)
def test_wrong_use_is_status_2(arguments, capsys):
    assert run(arguments) == 2
    assert "Error: " in capsys.readouterr().err


def test_interruption_is_quiet_and_writes_nothing(folder_of, monkeypatch, capsys):
    def interrupted(*_):
        raise KeyboardInterrupt

    folder = folder_of("levelling")
    monkeypatch.setattr(cli.adjust, "adjust_and_write", interrupted)
    assert run(["adjust", str(folder)]) == 130
    assert capsys.readouterr().err.strip() == "Stopped. Earlier results are as they were."


def test_a_defect_of_the_program_is_not_disguised(folder_of, monkeypatch):
    class DefectError(Exception):
        pass

    def defective(*_):
        raise DefectError

    monkeypatch.setattr(cli.adjust, "adjust_and_write", defective)
    with pytest.raises(DefectError):
        run(["adjust", str(folder_of("levelling"))])


def test_cautions_go_to_stderr(folder_of, capsys):
    assert run(["adjust", str(folder_of("free"))]) in (0, 1)
    assert "Caution: Free network" in capsys.readouterr().err


COMMANDS = {"": hubtack} | dict(hubtack.commands)


@pytest.mark.parametrize("name", list(COMMANDS))
def test_every_help_shows_an_example_that_runs(name, tmp_path, monkeypatch, capsys):
    assert run([*filter(None, [name]), "--help"]) == 0
    example = re.search(r"Example: hubtack (.*)", capsys.readouterr().out)
    assert example
    shutil.copytree(ROOT / "field_data", tmp_path / "field_data")
    monkeypatch.chdir(tmp_path)
    if name == "export":
        assert run(["adjust", "field_data/fen_levels"]) == 0
    given = set(tmp_path.rglob("*"))
    assert run(example[1].split()) in (0, 1)
    assert [path for path in set(tmp_path.rglob("*")) - given if path.suffix in (".json", ".csv")]


@pytest.mark.parametrize("name", [name for name in COMMANDS if name])
def test_every_option_is_explained(name):
    options = [parameter for parameter in COMMANDS[name].params if isinstance(parameter, click.Option)]
    assert all(option.help for option in options)


def test_installed_command_runs_as_a_process(folder_of):
    folder = folder_of("blunder")
    line = [sys.executable, "-c", "from cli.main import main; main()", "adjust", str(folder)]
    done = subprocess.run(line, capture_output=True, text=True, encoding="utf-8", timeout=120, check=False)
    assert done.returncode == 1
    assert "suspect" in done.stdout
    assert sorted(reports_in(folder / "out")) == sorted(REPORTS)


def test_version_is_that_of_the_distribution(capsys):
    from importlib.metadata import version

    assert run(["--version"]) == 0
    assert capsys.readouterr().out == f"hubtack, version {version('hubtack')}\n"


def test_a_console_that_lacks_a_letter_still_gets_the_verdict(folder_of):
    """Letters that the console's encoding lacks are replaced."""
    line = [sys.executable, "-c", "from cli.main import main; main()", "adjust", str(folder_of("levelling"))]
    surroundings = {"PYTHONIOENCODING": "cp1252", "PYTHONPATH": str(ROOT), "PATH": ""}
    done = subprocess.run(line, capture_output=True, env=surroundings, timeout=120, check=False)
    assert done.returncode == 0
    assert b"v?Pv is" in done.stdout
