"""results.json: every key, its type, its order, and null where a quantity does not exist."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest

from adjust import adjust
from adjust.reports.results import write_results
from adjust.reports.verdict import cautions
from tests.adjusted_networks import JOBS, adjusted

SOLUTION = {
    "observations": int,
    "unknowns": int,
    "datum_defect": int,
    "degrees_of_freedom": int,
    "iterations": int,
    "converged": bool,
    "variance_factor": float,
    "global_test": dict,
    "condition_number": float,
    "sd_basis": str,
}
ELLIPSE = ["semi_major_mm", "semi_minor_mm", "azimuth_deg"]
MARK = [
    *("mark", "plan_status", "height_status"),
    *("easting_m", "northing_m", "height_m", "latitude_deg", "longitude_deg", "ellipsoidal_height_m"),
    *("sd_easting_mm", "sd_northing_mm", "sd_height_mm", "covariance_mm2"),
    *("ellipse", "ellipse_confidence", "horizontal_95_mm", "height_95_mm", "description"),
]
OBSERVATION = [
    *("source", "kind", "component", "at", "from", "to", "setup", "unit"),
    *("observed", "adjusted", "residual", "sd", "minimal_detectable_bias"),
    *("redundancy", "w", "tau", "suspect"),
]
RELATIVE = ["from", "to", "distance_m", "ellipse", "ellipse_confidence", "sd_height_difference_mm"]


def refuse(constant):
    raise AssertionError(f"{constant} is not JSON")


def results_of(adjustment, folder):
    write_results(adjustment, cautions(adjustment), folder / "results.json")
    return json.loads((folder / "results.json").read_text("utf-8"), parse_constant=refuse)


@pytest.fixture(params=list(JOBS))
def results(request, tmp_path):
    return results_of(adjusted(request.param), tmp_path)


def starts_with(keys, expected):
    """The fixed keys come first and in order; more may follow."""
    return list(keys)[: len(expected)] == list(expected)


def test_top_level_keys(results):
    expected = ["schema", "job", "solution", "marks", "observations", "relative", "suspects", "cautions"]
    assert starts_with(results, expected)
    assert results["schema"] == "hubtack-results/1"
    assert starts_with(results["job"], ["title", "frame", "crs", "input_sha256"])
    assert (results["job"]["crs"] is None) == (results["job"]["frame"] == "plane")


def test_solution_keys_and_types(results):
    solution = results["solution"]
    assert starts_with(solution, SOLUTION)
    checked = solution["degrees_of_freedom"] > 0
    for key, kind in SOLUTION.items():
        missing = key == "variance_factor" and not checked
        assert solution[key] is None if missing else type(solution[key]) is kind
    assert list(solution["global_test"]) == ["statistic", "lower", "upper", "confidence", "passed"]
    assert (solution["global_test"]["passed"] is None) == (not checked)


def test_record_keys_and_order(results):
    assert results["marks"]
    assert results["observations"]
    for mark in results["marks"]:
        assert list(mark) == MARK
        assert list(mark["ellipse"]) == list(mark["ellipse_confidence"]) == ELLIPSE
        assert [len(row) for row in mark["covariance_mm2"]] == [3, 3, 3]
    assert all(list(observation) == OBSERVATION for observation in results["observations"])
    assert all(list(line) == RELATIVE for line in results["relative"])
    assert len(results["observations"]) == results["solution"]["observations"]


def test_figures_are_numbers_or_null(results):
    figures = [value for mark in results["marks"] for key, value in mark.items() if key.endswith(("_mm", "_m", "_deg"))]
    figures += [record[key] for record in results["observations"] for key in OBSERVATION[8:16]]
    assert all(value is None or type(value) is float for value in figures)
    assert all(type(record["suspect"]) is bool for record in results["observations"])


def test_marks_show_what_their_status_allows(results):
    for mark in results["marks"]:
        for status, keys in (
            ("plan_status", ("sd_easting_mm", "sd_northing_mm")),
            ("height_status", ("sd_height_mm",)),
        ):
            for key in keys:
                if mark[status] == "fixed":
                    assert mark[key] == 0.0
                elif mark[status] == "none":
                    assert mark[key] is None
                else:
                    assert mark[key] > 0
        assert (mark["horizontal_95_mm"] is None) == (mark["plan_status"] == "none")
        assert (mark["height_95_mm"] is None) == (mark["height_status"] == "none")
        azimuth = mark["ellipse"]["azimuth_deg"]
        assert azimuth is None or 0 <= azimuth < 180


def test_figures_of_a_mark_agree_with_each_other(results):
    for mark in results["marks"]:
        covariance = np.array(mark["covariance_mm2"], dtype=float)
        sds = [mark["sd_easting_mm"], mark["sd_northing_mm"], mark["sd_height_mm"]]
        np.testing.assert_allclose(np.sqrt(np.diag(covariance)), np.array(sds, dtype=float), rtol=1e-12)
        ellipse = mark["ellipse"]
        if ellipse["semi_major_mm"]:
            trace = covariance[0, 0] + covariance[1, 1]
            assert ellipse["semi_major_mm"] ** 2 + ellipse["semi_minor_mm"] ** 2 == pytest.approx(trace, rel=1e-9)
            assert ellipse["semi_major_mm"] <= mark["horizontal_95_mm"] <= 30 * ellipse["semi_major_mm"]


def test_residual_is_adjusted_minus_observed(results):
    for record in results["observations"]:
        turn = 360.0 if record["unit"] == "deg" else math.inf
        difference = math.remainder(record["adjusted"] - record["observed"], turn)
        assert difference == pytest.approx(record["residual"], rel=0, abs=2e-9)  # m: half a digit of six million metres


def test_roles_belong_to_the_kind(results):
    roles = {
        "direction": {"at", "to", "setup"},
        "angle": {"at", "from", "to"},
        "height_difference": {"from", "to"},
        "vector": {"from", "to"},
        "control": {"at"},
    }
    components = {"vector": {"x", "y", "z"}, "control": {"easting", "northing", "height"}}
    for record in results["observations"]:
        present = {role for role in ("at", "from", "to", "setup") if record[role] is not None}
        assert present == roles.get(record["kind"], {"at", "to"})
        assert record["component"] in components.get(record["kind"], {None})
        assert record["unit"] == ("deg" if record["kind"] in ("direction", "angle", "azimuth", "zenith") else "m")


def test_suspects_are_the_rows_marked_suspect_worst_first(results):
    worst = {}
    for record in results["observations"]:
        if record["suspect"]:
            worst[record["source"]] = max(worst.get(record["source"], 0.0), abs(record["w"]))
    assert set(results["suspects"]) == set(worst)
    sizes = [worst[source] for source in results["suspects"]]
    assert sizes == sorted(sizes, reverse=True)


def test_planted_blunder_is_the_worst_suspect(tmp_path):
    assert results_of(adjusted("blunder"), tmp_path)["suspects"][0] == "directions.csv:20"


def test_unchecked_rows_have_no_test(tmp_path):
    results = results_of(adjusted("unchecked"), tmp_path)
    for record in results["observations"]:
        assert record["redundancy"] == 0.0
        assert record["w"] is record["tau"] is record["minimal_detectable_bias"] is None
        assert record["suspect"] is False
    assert results["cautions"][0].startswith("Nothing checks these coordinates")


def test_plane_frames_have_no_geographic_coordinates_and_ellipsoid_frames_do(tmp_path):
    plane = results_of(adjusted("total station"), tmp_path)["marks"]
    assert all(mark["latitude_deg"] is mark["longitude_deg"] is mark["ellipsoidal_height_m"] is None for mark in plane)
    adjustment = adjusted("gnss")
    spatial = results_of(adjustment, tmp_path)["marks"]
    degrees = np.array([[mark["longitude_deg"], mark["latitude_deg"]] for mark in spatial])
    np.testing.assert_allclose(degrees, np.degrees(adjustment.coordinates[:, :2]), rtol=0, atol=1e-12)  # degrees
    grid = adjustment.job.frame.grid_coordinates(adjustment.coordinates)
    np.testing.assert_array_equal([[mark["easting_m"], mark["northing_m"]] for mark in spatial], grid)


def test_orthometric_heights_stand_beside_ellipsoidal_ones(tmp_path):
    adjustment = adjusted("mixed")
    for mark, geoid in zip(results_of(adjustment, tmp_path)["marks"], adjustment.geometry.geoid, strict=True):
        if mark["ellipsoidal_height_m"] is not None:
            assert mark["ellipsoidal_height_m"] - mark["height_m"] == pytest.approx(geoid, rel=0, abs=1e-9)  # m


def test_benchmarks_without_a_place_show_none(tmp_path):
    marks = results_of(adjusted("levelling"), tmp_path)["marks"]
    assert all(mark["easting_m"] is mark["northing_m"] is None for mark in marks)
    assert all(mark["plan_status"] == "none" for mark in marks)
    assert all(mark["ellipse"] == dict.fromkeys(ELLIPSE) for mark in marks)
    assert all(mark["covariance_mm2"][0] == [None, None, None] for mark in marks)


def test_a_working_height_is_not_shown_as_a_result(tmp_path):
    """A plan-only job may put marks on a mean height to compute; what was never given stays null."""
    adjustment = adjusted("unchecked")
    given = results_of(adjustment, tmp_path)["marks"][1]
    assert given["height_m"] is None
    lifted = adjustment.coordinates.copy()
    lifted[:, 2] = 55.0
    moved = replace(adjustment, geometry=replace(adjustment.geometry, coordinates=lifted))
    assert results_of(moved, tmp_path)["marks"][1]["height_m"] is None


def test_free_network_reports_its_defect_and_says_what_the_sds_refer_to(tmp_path):
    results = results_of(adjusted("free"), tmp_path)
    assert results["solution"]["datum_defect"] == 4  # a shift in three axes and a turn about the vertical
    assert any("Free network" in caution for caution in results["cautions"])
    assert all(mark["plan_status"] == "adjusted" for mark in results["marks"])


@pytest.mark.parametrize(
    ("missing", "words", "others"),
    [
        ([0, 1], "no plan coordinates were given", "no heights were given"),
        ([2], "no heights were given", "no plan coordinates were given"),
    ],
)
def test_free_network_says_which_coordinates_are_arbitrary(missing, words, others):
    job = adjusted("free").job
    given = job.marks.given.copy()
    given[:, missing] = np.nan
    said = " ".join(cautions(adjust(replace(job, marks=replace(job.marks, given=given)))))
    assert words in said
    assert others not in said
    assert "the fit on the given coordinates" in said  # those of the other kind


def test_confidence_ellipse_is_the_standard_one_scaled(tmp_path):
    adjustment = adjusted("posterior")
    for mark in results_of(adjustment, tmp_path)["marks"]:
        standard, confident = mark["ellipse"], mark["ellipse_confidence"]
        assert confident["azimuth_deg"] == standard["azimuth_deg"]
        scaled = standard["semi_major_mm"] * adjustment.ellipse_factor
        assert confident["semi_major_mm"] == pytest.approx(scaled, rel=1e-12)


def test_the_same_job_writes_the_same_bytes(tmp_path):
    from adjust import adjust

    for name in ("first", "second"):
        (tmp_path / name).mkdir()
        results_of(adjust(JOBS["mixed"]()), tmp_path / name)
    assert (tmp_path / "first/results.json").read_bytes() == (tmp_path / "second/results.json").read_bytes()


def test_each_record_has_a_line_of_its_own(tmp_path):
    results = results_of(adjusted("blunder"), tmp_path)
    lines = (tmp_path / "results.json").read_text("utf-8").splitlines()
    records = [line for line in lines if line.startswith('{"source"')]
    assert len(records) == len(results["observations"])
    assert json.loads(records[0].rstrip(",")) == results["observations"][0]
