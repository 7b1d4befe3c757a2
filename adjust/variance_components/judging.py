"""From estimates to what is said of the groups of a job."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np

from adjust.adjustment import Adjustment
from adjust.quality import chi_square_quantile
from adjust.solver import RankDefect
from adjust.variance_components.component import VarianceComponent
from adjust.variance_components.estimation import Estimate, estimate, sources


def variance_components(
    adjustment: Adjustment, without: Collection[str] = (), *, robust: bool = True
) -> tuple[VarianceComponent, ...]:
    """What the residuals say of the stated sds, group by group; empty where nothing is checked at all, or where under
    other weights the network is not determined to the last digits.

    `without` are sources of observations to leave out (`levels.csv:3`), for instance those found to be blunders. With
    `robust`, others that stand far off are left out too, and none has much influence; without, the estimate is that of
    restricted maximum likelihood. The adjustment stays as it is.
    """
    if adjustment.solution.degrees_of_freedom < 1:
        return ()
    try:
        found = estimate(adjustment, without, robust=robust)
    except RankDefect:
        return ()
    confidence = adjustment.job.statistics.confidence
    estimated = int(np.count_nonzero(~np.isnan(found.logarithm)))
    joint = 1.0 - (1.0 - confidence) / max(estimated, 1)
    labels = sources(adjustment, found.aside)
    return tuple(
        _component(found, number, joint, confidence, labels) for number in range(len(found.groups)) if estimated
    )


def _component(
    found: Estimate, number: int, joint: float, confidence: float, labels: dict[int, str]
) -> VarianceComponent:
    """The result of one group.

    ν σ̂²/σ² is taken as χ² of ν = 2/var(ln σ̂²) degrees of freedom (Satterthwaite 1946, *Biometrics Bulletin* 2,
    110–114; from memory); the intervals of all groups hold together with `confidence` (Bonferroni: each with `joint`).
    """
    group = found.groups[number]
    factor = float(np.exp(found.logarithm[number] / 2))
    variance = float(found.covariance[number, number])
    lower, upper = _interval(factor, 2 / variance, joint) if variance > 0 else (np.nan, np.nan)
    left_out = tuple(labels[row] for row in group.rows.tolist() if row in labels)
    return VarianceComponent(
        name=group.name,
        kind=group.kind,
        instrument=group.instrument,
        file=group.file,
        group=group.group,
        merged=group.merged,
        observations=(len(group.rows) - len(left_out)) * group.components,
        redundancy=float(found.redundancy[number]),
        factor=factor,
        sd=factor * float(np.sqrt(variance)) / 2,
        lower=lower,
        upper=upper,
        confidence=confidence,
        left_out=left_out,
    )


def _interval(factor: float, freedom: float, probability: float) -> tuple[float, float]:
    tail = (1 - probability) / 2
    with np.errstate(divide="ignore", over="ignore"):
        lower, upper = (
            factor * float(np.sqrt(freedom / np.float64(chi_square_quantile(p, freedom)))) for p in (1 - tail, tail)
        )
    return lower, upper
