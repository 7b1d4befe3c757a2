"""`listing.txt`: the adjustment for people, the verdict first."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from adjust.adjustment import Adjustment
from adjust.frames import EllipsoidFrame, PlaneFrame
from adjust.job import Job
from adjust.network.closures.check import Check
from adjust.observations import KIND_NAMES
from adjust.quality import critical_tau, critical_w
from adjust.reports import listing_marks, listing_observations
from adjust.reports.blunder_words import blunder_section
from adjust.reports.check_listing import check_section
from adjust.reports.decision_words import decision_section
from adjust.reports.layout import facts, paragraph, title
from adjust.reports.reduction_text import listed_reduction
from adjust.reports.selection import Order
from adjust.reports.verdict import cautions, digits_left, verdict
from adjust.reports.weights import component_section
from adjust.reports.wording import counted

if TYPE_CHECKING:
    from adjust.blunders import Findings
    from adjust.variance_components import VarianceComponent

LISTED = 1000
"""Rows of one table, some twenty printed pages; the tables beside the listing have them all."""


STANDING_CAUTION = (
    "These figures are computed, not certified: a licensed surveyor answers for their use, "
    "by the codes and standards in force at the place."
)
"""Ends every listing, whatever the figures."""


def write_listing(
    adjustment: Adjustment,
    order: Order,
    path: Path,
    check: Check | None = None,
    findings: Findings | None = None,
    components: Sequence[VarianceComponent] | None = None,
) -> None:
    """Write the listing; `order` is that of the observations, `check` what was said before the adjustment, `findings`
    what a search for blunders found, `components` are the variance components."""
    lines = listing(adjustment, order, check=check, findings=findings, components=components)
    path.write_text("\n".join(lines) + "\n", encoding="utf-8", newline="\n")


def listing(
    adjustment: Adjustment,
    order: Order = "worst",
    most: int = LISTED,
    check: Check | None = None,
    findings: Findings | None = None,
    components: Sequence[VarianceComponent] | None = None,
) -> list[str]:
    """The lines of the listing; no table has more than `most` rows."""
    return [
        *_opening(adjustment),
        *title("Job"),
        *facts(job_facts(adjustment)),
        *decision_section(adjustment.job),
        *(check_section(check) if check is not None else ()),
        *listing_marks.control(adjustment, most),
        *listing_marks.coordinates(adjustment, most),
        *blunder_section(adjustment.job, findings),
        *listing_observations.suspects(adjustment, most),
        *listing_observations.observations(adjustment, order, most),
        *listing_marks.relative(adjustment, most),
        *component_section(components),
        *listed_reduction(adjustment.job),
        *title("Numerical health"),
        *facts(numerical_facts(adjustment)),
        *_sentences("Notes", adjustment.notes),
        *_sentences("Cautions", (*cautions(adjustment), STANDING_CAUTION)),
    ]


def _opening(adjustment: Adjustment) -> list[str]:
    job = adjustment.job
    heading = job.title if job.date is None else f"{job.title}, {job.date}"
    return [*paragraph(heading), "", *paragraph(verdict(adjustment))]


def _sentences(heading: str, sentences: tuple[str, ...]) -> list[str]:
    if not sentences:
        return []
    return [*title(heading), *(line for sentence in sentences for line in paragraph(sentence))]


def job_facts(adjustment: Adjustment) -> list[tuple[str, str]]:
    """What was adjusted, how, and how well it fits."""
    job, solution = adjustment.job, adjustment.solution
    left_out = sum(rows.observed.size for rows in job.left_out)
    orientations = f" and {counted(len(job.setups), 'orientation', 'orientations')}" if job.setups else ""
    coordinates = counted(adjustment.unknowns.coordinates, "coordinate", "coordinates")
    pairs = [
        ("Frame", frame_words(adjustment)),
        ("Datum", datum_words(adjustment)),
        ("Observations", _observation_words(adjustment)),
        ("Left out", f"{counted(left_out, 'observation', 'observations')} {_left_out_by(job)}" if left_out else ""),
        ("Unknowns", f"{solution.unknowns}: {coordinates}{orientations}"),
        ("Degrees of freedom", str(solution.degrees_of_freedom)),
        ("Estimated σ₀", _sigma_words(adjustment)),
        ("Standard deviations", basis_words(adjustment)),
        ("Test of each observation", _test_words(adjustment)),
        ("Input", f"sha256 {job.input_sha256}" if job.input_sha256 else ""),
    ]
    return [(name, value) for name, value in pairs if value]


def _left_out_by(job: Job) -> str:
    decided = any(each.decision == "leave_out" for each in job.decisions)
    return "marked `use = no` or left out by decision" if decided else "marked `use = no`"


def frame_words(adjustment: Adjustment) -> str:
    """The frame in words."""
    frame = adjustment.job.frame
    if isinstance(frame, EllipsoidFrame):
        return f"ellipsoid, {frame.crs}, {'orthometric' if adjustment.job.orthometric else 'ellipsoidal'} heights"
    curved = isinstance(frame, PlaneFrame) and frame.earth_curvature
    return f"plane, earth curvature {'allowed for' if curved else 'left out'} in zenith angles"


def datum_words(adjustment: Adjustment) -> str:
    """What carries the datum."""
    job = adjustment.job
    if job.datum.mode == "inner":
        named = list(job.datum.marks) or slice(None)
        given = ~np.isnan(job.marks.given[named]) & adjustment.unknowns.sought[named]
        carriers = counted(int(np.count_nonzero(given.any(axis=1))), "mark", "marks")
        fit = f"fitted to the given coordinates of {carriers}" if given.any() else "no coordinates given"
        return f"free network, {fit}; defect {adjustment.solution.datum_defect}"
    statuses = np.array(adjustment.statuses, dtype=str).reshape(-1, 2)
    words = [
        f"{np.count_nonzero(statuses[:, part] == status)} {status} in {name}"
        for part, name in enumerate(("plan", "height"))
        for status in ("fixed", "weighted")
        if np.any(statuses[:, part] == status)
    ]
    return f"control: {', '.join(words)}"


def _observation_words(adjustment: Adjustment) -> str:
    parts = []
    for table in adjustment.residuals:
        kind, rows = table.observations.kind, len(table.observations)
        setups = (
            f" in {counted(len(adjustment.job.setups), 'setup', 'setups')}"
            if table.observations.setup is not None
            else ""
        )
        parts.append(f"{counted(rows, *KIND_NAMES[kind])}{setups}")
    return f"{adjustment.solution.observations}: {', '.join(parts)}"


def _sigma_words(adjustment: Adjustment) -> str:
    factor = adjustment.solution.variance_factor
    return "" if factor is None else f"{factor**0.5:.3f}, where 1 was claimed"


def basis_words(adjustment: Adjustment) -> str:
    """What the printed sds rest on."""
    if adjustment.solution.sd_basis == "prior":
        return "from the sds of the observations as claimed beforehand (prior)"
    return "from the sds of the observations times the estimated σ₀ (posterior)"


def _test_words(adjustment: Adjustment) -> str:
    statistics, solution = adjustment.job.statistics, adjustment.solution
    level = f"significance {statistics.significance:g}"
    if solution.sd_basis == "prior":
        return f"|w| beyond {critical_w(statistics.significance):.3f} is suspect ({level})"
    if solution.degrees_of_freedom < 2:
        return "none: the estimated σ₀ leaves nothing to test with fewer than two degrees of freedom"
    bound = critical_tau(statistics.significance, solution.degrees_of_freedom)
    return f"|τ| beyond {bound:.3f} is suspect ({level})"


def numerical_facts(adjustment: Adjustment) -> list[tuple[str, str]]:
    """How far the digits can be trusted."""
    solution = adjustment.solution
    digits = digits_left(solution.condition_number)
    return [
        (
            "Condition number",
            f"{solution.condition_number:.2e} (scaled columns), which leaves {digits:.0f} of 16 digits",
        ),
        (
            "Second opinion",
            f"an iterative solution of the same system differs by at most {solution.second_opinion_gap:.1e} m",
        ),
        ("Iterations", f"{solution.iterations}, until no coordinate moved by more than 0.01 mm"),
    ]
