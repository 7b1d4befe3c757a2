"""Raw tables read from files: what the rows become, what holds until given again, and what is refused."""

from __future__ import annotations

from pathlib import Path
from typing import TypeVar

import numpy as np
import pytest

from adjust import Job
from adjust.observations import Directions, HeightDifferences, Observations, SlopeDistances, ZenithAngles
from adjust.reductions.pointings import carried, carried_by_target
from adjust.units import ARCSEC, parse_dms
from tests.job_folders import PLANE, RAW, changed, job_of, mistakes_of

Kind = TypeVar("Kind", bound=Observations)
EXACT = 1e-11
"""Metres or radians: rounding."""


def dms(text: str) -> float:
    return float(np.radians(parse_dms(text)))


def of_kind(job: Job, kind: type[Kind]) -> Kind:
    return next(rows for rows in job.observations if isinstance(rows, kind))


def labels(rows: Observations) -> list[str]:
    return [rows.provenance.label(row) for row in range(len(rows))]


@pytest.fixture(scope="module")
def job(tmp_path_factory: pytest.TempPathFactory) -> Job:
    return job_of(tmp_path_factory.mktemp("raw"), RAW)


def test_directions_are_means_of_faces_and_rounds(job: Job) -> None:
    """By hand: pairs 002 00-00-03, A 63-26-06, B 101-10-15 in the first round; A again in the second, where the first
    target reads 90-02-08 and A 153-28-12, both 1″ off the first."""
    rows = of_kind(job, Directions)
    names = [(job.setups[s], job.marks.names[to]) for s, to in zip(rows.setup_index, rows.marks[:, 1], strict=True)]
    assert names == [("S1", "002"), ("S1", "A"), ("S1", "B"), ("S2", "001"), ("S2", "B")]
    assert rows.observed[0, 0] == 0
    assert rows.observed[1, 0] == pytest.approx(dms("63-26-03.5"), rel=0, abs=EXACT)
    assert labels(rows)[:3] == ["pointings.csv:2+7+8+11", "pointings.csv:3+6+9+10", "pointings.csv:4+5"]


def test_a_target_missing_from_a_round_is_adjusted_not_meaned(job: Job) -> None:
    """The second round has A − 002 1″ larger: 002 gives way by 0.25″, A by as much the other way, and B, seen in the
    first round alone, stays where that round has it beside the two. A plain mean would leave B at 101-10-12."""
    rows = of_kind(job, Directions)
    first_round = [dms("0-00-03"), dms("63-26-06"), dms("101-10-15")]
    expected = first_round[2] - (first_round[0] + first_round[1]) / 2
    adjusted = rows.observed[2, 0] - (rows.observed[0, 0] + rows.observed[1, 0]) / 2
    assert adjusted == pytest.approx(expected, rel=0, abs=EXACT)
    assert rows.observed[2, 0] == pytest.approx(dms("101-10-12.25"), rel=0, abs=EXACT)


def test_single_faces_take_the_known_errors(job: Job) -> None:
    """S2 is read on face left: 12-00-00 less 4″/sin 89-47-50, 310-00-07 less 4″/sin 89-30-01, √2 of 1.5″."""
    rows = of_kind(job, Directions)
    correction = 4 * ARCSEC * (1 / np.sin(dms("89-30-01")) - 1 / np.sin(dms("89-47-50")))
    assert rows.observed[4, 0] == pytest.approx(dms("298-00-07") - correction, rel=0, abs=EXACT)
    np.testing.assert_allclose(rows.precision.constant[3:], np.sqrt(2) * 1.5 * ARCSEC, rtol=0, atol=EXACT)
    zeniths = of_kind(job, ZenithAngles)
    assert zeniths.observed[-1, 0] == pytest.approx(dms("89-30-07"), rel=0, abs=EXACT)  # index −6″
    assert zeniths.precision.constant[-1] == pytest.approx(np.sqrt(2) * 2 * ARCSEC, rel=0, abs=EXACT)


def test_zenith_angles_and_their_index(job: Job) -> None:
    rows = of_kind(job, ZenithAngles)
    first, second = dms("89-34-25"), dms("89-34-26.5")
    assert rows.observed[0, 0] == pytest.approx((first + second) / 2, rel=0, abs=EXACT)
    assert rows.precision.constant[0] == pytest.approx(2 * ARCSEC / np.sqrt(2), rel=0, abs=EXACT)
    pointings = job.reduction.pointings
    assert pointings is not None
    index = pointings.zeniths.errors.error / ARCSEC
    np.testing.assert_allclose(index, [-5, -5, -5, -4.5], rtol=0, atol=1e-6)  # 002, A, B, 002 again
    collimation = pointings.directions.errors.error / ARCSEC
    np.testing.assert_allclose(collimation[:3], [2, 4, 5], rtol=0, atol=1e-3)


def test_distances_are_corrected_and_meaned(job: Job) -> None:
    """Closed formula at 18.0 °C, 985.0 hPa, 60 %: n − 1 = 272.4 ppm at 658 nm, 13.9 ppm less than the reference; with
    0.5 ppm of scale and −34.4 mm of the prism. Second round: 18.5 °C, 985.2 hPa, no humidity of its own."""
    rows = of_kind(job, SlopeDistances)
    shown = np.array([200.0373, 200.0377, 200.0375, 200.0374])
    ppm = np.array([13.9, 13.9, 14.3, 14.3]) + 0.5
    expected = np.mean(shown * (1 + ppm * 1e-6) - 0.0344)
    assert rows.observed[0, 0] == pytest.approx(expected, rel=0, abs=1e-4)  # m: ppm to their first decimal
    assert rows.precision.constant[0] == pytest.approx(0.001 / 2, rel=0, abs=EXACT)
    assert rows.precision.proportional[0] == pytest.approx(1.5e-6, rel=0, abs=1e-18)
    other = np.mean(np.array([223.6420, 223.6424]) * (1 + 14.4e-6) + 0.0175)  # mini prism, +17.5 mm
    assert rows.observed[1, 0] == pytest.approx(other, rel=0, abs=1e-4)


def test_targets_bring_their_own_centring(job: Job) -> None:
    rows = of_kind(job, SlopeDistances)
    np.testing.assert_allclose(rows.precision.target_centring[:2], [0.0003, 0.0006], rtol=0, atol=1e-12)
    np.testing.assert_allclose(rows.precision.centring, 0.0004, rtol=0, atol=1e-12)


def test_heights_hold_until_given_again(job: Job) -> None:
    rows = of_kind(job, ZenithAngles)
    expected = [[1.55, 1.55], [1.55, 1.60], [1.55, 1.60], [1.52, 1.55], [1.52, 1.55]]
    np.testing.assert_allclose(rows.heights, expected, rtol=0, atol=0)


def test_level_book_becomes_sections_and_side_shots(job: Job) -> None:
    """By hand; the line of sight rises by 3″: 001 – A looks 78 m back and 77 m ahead, correction −0.015 mm."""
    rows = of_kind(job, HeightDifferences)
    ends = [tuple(job.marks.names[mark] for mark in pair) for pair in rows.marks]
    assert ends == [("001", "A"), ("A", "B"), ("A", "002")]
    slope = 3 * ARCSEC
    expected = [
        1.4321 - 1.6650 + 1.1210 - 1.6678 - slope * 1.0,
        1.2000 - 1.4300 - slope * 5.0,
        1.2000 - 1.3005 + 1.5010 - 1.2200 - slope * 2.0,
    ]
    np.testing.assert_allclose(rows.observed[:, 0], expected, rtol=0, atol=EXACT)
    sd = 0.0007 * np.sqrt(np.array([155, 55, 124]) / 1000)
    np.testing.assert_allclose(rows.precision.constant, sd, rtol=0, atol=EXACT)
    assert labels(rows) == ["level_book.csv:2+3+4", "level_book.csv:4+5", "level_book.csv:4+6+7"]


def test_level_book_carries_its_checks(job: Job) -> None:
    levels = job.reduction.levels
    assert levels is not None
    assert levels.lines == ("a",)
    assert levels.check.backsights[0] - levels.check.foresights[0] == pytest.approx(-0.5992, rel=0, abs=EXACT)
    assert abs(levels.check.difference[0]) < EXACT
    np.testing.assert_allclose(levels.sections.imbalance, [1, 5, 2], rtol=0, atol=EXACT)


def test_nothing_raw_leaves_nothing_behind(tmp_path: Path) -> None:
    reduction = job_of(tmp_path, PLANE).reduction
    assert reduction.pointings is None
    assert reduction.levels is None


def test_raw_and_reduced_observations_stand_together(tmp_path: Path) -> None:
    """Rows of distances.csv join those made of pointings in one kind, each with its own place."""
    extra = {"distances.csv": "at,to,slope_m,sd_mm\nA,B,130.0,1\n", "levels.csv": "from,to,rise_m,sd_mm\nA,B,-0.23,1\n"}
    job = job_of(tmp_path, RAW, extra)
    assert labels(of_kind(job, SlopeDistances))[0] == "distances.csv:2"
    assert labels(of_kind(job, SlopeDistances))[1].startswith("pointings.csv:2+7")
    assert len(of_kind(job, HeightDifferences)) == 4


def test_sd_from_setups_where_sights_have_no_length(tmp_path: Path) -> None:
    book = "line,point,backsight_m,foresight_m\na,001,1.0,\na,,1.0,1.5\na,A,,1.25\na,,,\n".replace("a,,,\n", "")
    rows = of_kind(job_of(tmp_path, RAW, {"level_book.csv": book}), HeightDifferences)
    assert rows.precision.constant[0] == pytest.approx(0.0002 * np.sqrt(2), rel=0, abs=EXACT)


def test_readings_that_are_not_used_are_named(tmp_path: Path) -> None:
    lines = RAW["pointings.csv"].splitlines()
    lines[0] += ",use"
    lines[9] += ",no"
    lines[10] += ",no"
    lines[1:] = [line if line.endswith("no") else line + "," for line in lines[1:]]
    job = job_of(tmp_path, RAW, {"pointings.csv": "\n".join(lines)})
    assert "2 readings with use = no left out of the reduction: pointings.csv:10, pointings.csv:11" in job.notes
    assert labels(of_kind(job, Directions))[1] == "pointings.csv:3+6+9"


def test_unknown_errors_of_single_faces_are_said(tmp_path: Path) -> None:
    text = RAW["job.toml"].replace("collimation_arcsec = 4.0\nindex_arcsec = -6.0\n", "")
    job = job_of(tmp_path, RAW, {"job.toml": text})
    assert (
        "pointings.csv".removesuffix(".csv")
        + ": 2 directions read on one face with an unknown collimation error, not corrected"
        in job.notes
    )


def test_a_lone_direction_says_nothing(tmp_path: Path) -> None:
    job = job_of(tmp_path, changed("pointings.csv", "S2,A,B,,,310-00-07", "S2,A,B,,,", RAW))
    assert job.setups == ("S1",)
    assert any("single target says nothing (setup S2)" in note for note in job.notes)


def test_rounds_without_a_common_target_make_setups_of_their_own(tmp_path: Path) -> None:
    book = "setup,at,to,round,circle_deg\nS,001,002,1,0\nS,001,A,1,63\nS,001,B,2,10\nS,001,A,3,5\nS,001,B,3,43\n"
    split = book.replace("S,001,A,3,5\nS,001,B,3,43\n", "S,001,002,2,20\n")
    assert job_of(tmp_path / "tied", RAW, {"pointings.csv": book}).setups == ("S",)
    apart = "setup,at,to,round,circle_deg\nS,001,002,1,0\nS,001,A,1,63\nS,001,B,2,10\nS,001,C,2,43\n"
    marks = RAW["marks.csv"] + "C,,,,,\n"
    job = job_of(tmp_path / "apart", RAW, {"pointings.csv": apart, "marks.csv": marks})
    assert job.setups == ("S", "S part 2")
    assert job_of(tmp_path / "split", RAW, {"pointings.csv": split}).setups == ("S",)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("S1,001,A,2,L,", "S1,A,B,2,L,", "setup 'S1' stands on '001'"),
        ("S1,001,A,1,R,243-26-02,269-47-49", "S1,001,A,1,R,243-26-02,89-47-49", "zenith angle of the other face"),
        ("S1,001,A,1,L,63-26-10,90-12-01", "S1,001,A,1,l,63-26-10,90-12-01", "not a face, L or R"),
        ("S1,001,A,2,L,153-28-15,,,", "S1,001,A,2,L,,,,", "no reading"),
        ("S2,A,001,,,12-00-00", "S2,A,001,,,361-00-00", "a reading between 0 and one full circle"),
        ("1.550,,18.0,985.0,60", "1.550,,18.0,,60", "the other half of the weather"),
        (",mini,,,\nS1,001,B,1,L", ",miny,,,\nS1,001,B,1,L", "not a target of the job file; did you mean 'mini'?"),
    ],
)
def test_pointings_that_cannot_be(old: str, new: str, words: str, tmp_path: Path) -> None:
    text = RAW["pointings.csv"].replace(",18.5,985.2,", ",18.5,,") if "985.0" in old else RAW["pointings.csv"]
    assert text.count(old) == 1
    (mistake, *_) = mistakes_of(tmp_path, RAW, {"pointings.csv": text.replace(old, new)})
    assert words in str(mistake)
    assert mistake.file == "pointings.csv"


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("a,B,,1.4300", "a,C,,1.4300", "not a mark of marks.csv"),
        ("a,B,,1.4300", "a,TP9,,1.4300", "leads nowhere"),
        ("a,002,,,1.2200,,30\n", "", "ends with a foresight"),
        ("a,TP1,1.1210", "b,TP1,1.1210", "line"),
        ("a,A,1.2000", "a,001,1.2000", "nothing is levelled by it"),
    ],
)
def test_level_books_that_cannot_be(old: str, new: str, words: str, tmp_path: Path) -> None:
    mistakes = mistakes_of(tmp_path, RAW, changed("level_book.csv", old, new, RAW))
    assert words in str(mistakes[0])


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("edm_reference_index = 1.0002863\n", "", "goes with edm_reference_index"),
        ("edm_scale_ppm = 0.5", "edm_ppm_c = 281.8\nedm_ppm_d = 79.4", "keep one of the two ways"),
        ('target = "round"', 'target = "rund"', "there is no [targets.rund]; did you mean 'round'?"),
        ("zenith_arcsec = 2.0\n", "", "says nothing for it; give [instruments.TS1] zenith_arcsec"),
        ("edm_wavelength_nm = 658", "edm_wavelength_nm = 6580", "a number"),
        ("constant_mm = 17.5", "constant_m = 17.5", "did you mean 'constant_mm'?"),
    ],
)
def test_instruments_and_targets_that_cannot_be(old: str, new: str, words: str, tmp_path: Path) -> None:
    mistakes = mistakes_of(tmp_path, RAW, changed("job.toml", old, new, RAW))
    assert words in str(mistakes[0])


def test_a_setup_is_raw_or_reduced(tmp_path: Path) -> None:
    extra = {"directions.csv": "setup,at,to,direction_deg\nS1,001,002,0\nS1,001,A,10\n"}
    (mistake, *_) = mistakes_of(tmp_path, RAW, extra)
    assert "stands in directions.csv too" in str(mistake)


def test_values_carry_within_their_group() -> None:
    values = np.array([np.nan, 1.0, np.nan, 5.0, np.nan, np.nan])
    group = np.array([0, 0, 1, 0, 0, 1])
    np.testing.assert_array_equal(carried(values, group), [1.0, 1.0, np.nan, 5.0, 5.0, np.nan])


def test_target_heights_hold_for_their_target() -> None:
    values = np.array([1.5, 1.3, np.nan, np.nan, np.nan])
    setup, to = np.zeros(5, dtype=np.int64), np.array([7, 8, 9, 8, 7])
    np.testing.assert_array_equal(carried_by_target(values, setup, to), [1.5, 1.3, 1.3, 1.3, 1.5])
