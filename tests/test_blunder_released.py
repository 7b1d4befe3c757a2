"""Gross errors of fixed control, where no linearisation holds: found by finding the mark's coordinates anew."""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np
import pytest

from adjust import ConvergenceError, adjust, read_job
from adjust.blunders import Findings, find_blunders, find_blunders_of

FIELD_DATA = Path(__file__).parents[1] / "field_data"

WITHIN = 4.0
"""Sds between an estimated and a planted error: beyond once in 16,000."""


def searched(tmp_path: Path, job: str, written: str, wrong: str) -> Findings:
    """A demo job with one entry of marks.csv changed."""
    folder = tmp_path / "job"
    shutil.copytree(FIELD_DATA / job, folder)
    marks = (folder / "marks.csv").read_text(encoding="utf-8")
    assert marks.count(written) == 1
    (folder / "marks.csv").write_text(marks.replace(written, wrong), encoding="utf-8")
    read = read_job(folder)
    try:
        return find_blunders(adjust(read), folder)
    except ConvergenceError:
        return find_blunders_of(read, folder)


@pytest.mark.parametrize(
    ("written", "wrong", "name", "error", "mistake"),
    [
        ("2091.432,419.492", "2091.432,491.492", "northing of control mark K118", [72.0], "digits exchanged"),
        ("998.205,501.559", "501.559,998.205", "position of control mark K101", [-496.646, 496.646], "axes exchanged"),
        ("1984.351,561.525", "9984.351,561.525", "easting of control mark K117", [8000.0], "digit misread"),
    ],
)
def test_fixed_control_far_off(
    tmp_path: Path, written: str, wrong: str, name: str, error: list[float], mistake: str
) -> None:
    findings = searched(tmp_path, "town_traverse", written, wrong)
    assert findings.settled
    found, planted = findings.blunders
    assert planted.name == "distances.csv:13"  # the error that the demo job comes with
    assert found.name == name
    assert np.all(np.abs(found.estimated_error - error) < WITHIN * found.sd)
    assert found.test > found.critical
    assert mistake in found.explanations[0].names
    assert [each.text for each in found.booked] == [
        text for text, right in zip(wrong.split(","), written.split(","), strict=True) if text != right
    ]


def test_a_benchmark_far_off_needs_no_release(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Levels are linear: the height is found where the job is searched as it is."""

    def never(*_: object) -> None:
        raise AssertionError("released")

    monkeypatch.setattr("adjust.blunders.finding.tell_released", never)
    findings = searched(tmp_path, "fen_levels", "5.1174", "5.7114")
    assert findings.settled
    found = findings.blunders[0]
    names = {each.name for each in (found.hypothesis, *found.alternatives)}
    assert {"height of control mark BM17", "height of control mark BM23"} <= names
    assert abs(abs(found.estimated_error[0]) - 0.594) < WITHIN * found.sd[0]
