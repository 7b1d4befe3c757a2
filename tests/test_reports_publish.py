"""All files of a run or none: whatever fails, and whenever, earlier files stay as they were."""

import os
import stat

import pytest

from adjust.errors import OutputError
from adjust.reports import REPORTS, write_reports
from adjust.reports import publish as publish_module
from adjust.reports.publish import publish
from tests.adjusted_networks import adjusted

NAMES = ("one.txt", "two.txt", "three.txt")


def writing(text):
    return {name: (lambda path, name=name: path.write_text(f"{text} {name}")) for name in NAMES}


def contents(folder):
    return {path.name: path.read_text() for path in sorted(folder.iterdir())}


@pytest.fixture
def folder(tmp_path):
    """A folder with the files of an earlier run, one of them missing, and a file that is not ours."""
    target = tmp_path / "out"
    publish(target, {name: write for name, write in writing("old").items() if name != "two.txt"})
    (target / "mine.txt").write_text("kept")
    return target


def test_new_files_replace_old_ones_and_leave_the_rest(folder):
    publish(folder, writing("new"))
    assert contents(folder) == {"mine.txt": "kept"} | {name: f"new {name}" for name in sorted(NAMES)}


def test_folders_are_made(tmp_path):
    publish(tmp_path / "a" / "b", writing("new"))
    assert len(contents(tmp_path / "a" / "b")) == 3


class DefectError(Exception):
    """A defect in a writer."""


@pytest.mark.parametrize("failure", [DefectError("defect"), KeyboardInterrupt()])
@pytest.mark.parametrize("failing", NAMES)
def test_a_writer_that_fails_leaves_everything_as_it_was(folder, failing, failure):
    before = contents(folder)

    def fail(path):
        path.write_text("half a fi")
        raise failure

    with pytest.raises(type(failure)):
        publish(folder, writing("new") | {failing: fail})
    assert contents(folder) == before


@pytest.mark.parametrize("failure", [OSError(28, "No space left on device"), KeyboardInterrupt()])
@pytest.mark.parametrize("moves", range(1, 6))
def test_a_move_that_fails_is_undone(folder, monkeypatch, moves, failure):
    """Two old files are set aside and three new ones moved in: five moves, each of which may fail."""
    before, replace, made = contents(folder), os.replace, []

    def replace_or_fail(source, target):
        made.append(source)
        if len(made) == moves:
            raise failure
        replace(source, target)

    monkeypatch.setattr(publish_module.os, "replace", replace_or_fail)
    with pytest.raises(OutputError if isinstance(failure, OSError) else KeyboardInterrupt):
        publish(folder, writing("new"))
    assert len(made) > moves or moves == 1
    assert contents(folder) == before


def test_a_folder_made_for_a_failed_run_is_taken_away_again(tmp_path):
    def fail(path):
        raise DefectError

    with pytest.raises(DefectError):
        publish(tmp_path / "a" / "b", {"one.txt": fail})
    assert list(tmp_path.iterdir()) == []


def test_a_file_in_the_place_of_the_folder_is_an_error_in_words(tmp_path):
    (tmp_path / "out").write_text("a file")
    with pytest.raises(OutputError, match=r"out: cannot be written \(File exists\).*--out"):
        publish(tmp_path / "out", writing("new"))
    with pytest.raises(OutputError, match="Not a directory"):
        publish(tmp_path / "out" / "deeper", writing("new"))
    assert (tmp_path / "out").read_text() == "a file"


def test_a_folder_in_the_place_of_a_file_is_an_error_that_names_it(folder):
    (folder / "two.txt").mkdir()
    before = {path.name for path in folder.iterdir()}
    with pytest.raises(OutputError, match=r"two\.txt: cannot be written"):
        publish(folder, writing("new"))
    assert {path.name for path in folder.iterdir()} == before
    assert (folder / "one.txt").read_text() == "old one.txt"


@pytest.mark.skipif(os.name == "nt" or os.geteuid() == 0, reason="folders cannot be locked against this user")
def test_a_locked_folder_is_an_error_in_words(folder):
    before = contents(folder)
    folder.chmod(stat.S_IRUSR | stat.S_IXUSR)
    try:
        with pytest.raises(OutputError, match="Permission denied"):
            publish(folder, writing("new"))
    finally:
        folder.chmod(stat.S_IRWXU)
    assert contents(folder) == before


def test_the_four_reports_are_written_together(tmp_path):
    write_reports(adjusted("levelling"), tmp_path / "out")
    assert sorted(contents(tmp_path / "out")) == sorted(REPORTS)


@pytest.mark.parametrize("report", ["write_results", "write_coordinates", "write_residuals", "write_listing"])
def test_a_report_that_cannot_be_rendered_leaves_the_old_four(tmp_path, monkeypatch, report):
    from adjust.reports import files

    write_reports(adjusted("levelling"), tmp_path)
    before = contents(tmp_path)

    def fail(*_):
        raise DefectError

    monkeypatch.setattr(files, report, fail)
    with pytest.raises(DefectError):
        write_reports(adjusted("blunder"), tmp_path)
    assert contents(tmp_path) == before


def test_the_same_adjustment_writes_the_same_bytes(tmp_path):
    for name in ("first", "second"):
        write_reports(adjusted("mixed"), tmp_path / name)
    for report in REPORTS:
        assert (tmp_path / "first" / report).read_bytes() == (tmp_path / "second" / report).read_bytes()
