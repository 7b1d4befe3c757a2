"""Invented jobs whose sds are claimed wrongly on purpose, or judged in groups of the test's choice."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import fields, replace

import numpy as np

from adjust import Adjustment, Job
from adjust.arrays import FloatArray
from adjust.observations import Labels, Observations, Precision, Vectors
from adjust.simulate import true_geometry
from adjust.variance_components import VarianceComponent


def claimed(job: Job, factors: Mapping[str, float]) -> Job:
    """The job with the sds of some kinds divided by their factors: that is how much worse than stated they are."""
    return replace(job, observations=tuple(_claimed(rows, factors.get(rows.kind, 1.0)) for rows in job.observations))


def _claimed(rows: Observations, factor: float) -> Observations:
    if isinstance(rows, Vectors):
        return replace(rows, covariances=rows.covariances / factor**2)
    precision = getattr(rows, "precision", None)
    if not isinstance(precision, Precision):
        return rows
    divided = {field.name: getattr(precision, field.name) / factor for field in fields(Precision)}
    return replace(rows, precision=Precision(**divided))  # type: ignore[call-arg]


def with_sd(rows: Observations, sd: float) -> Observations:
    """The same rows, all of one stated sd."""
    assert hasattr(rows, "precision")
    return replace(rows, precision=Precision.of_sd(np.full(len(rows), sd)))  # type: ignore[call-arg]


def grouped(rows: Observations, words: Sequence[str]) -> Observations:
    """The rows in groups; "" for none."""
    names = tuple(dict.fromkeys(word for word in words if word))
    number = np.array([names.index(word) if word else -1 for word in words], dtype=np.int64)
    return replace(rows, provenance=replace(rows.provenance, group=Labels(names, number)))


def struck(job: Job, plan: Job, kind: str, sizes: Mapping[int, float]) -> Job:
    """The job with errors of so many sds (as planned) in some rows of a kind, in its first component."""
    kinds = []
    for rows, planned in zip(job.observations, plan.observations, strict=True):
        if rows.kind == kind:
            sd = np.sqrt(planned.covariance(true_geometry(plan))[:, 0, 0])
            observed = rows.observed.copy()
            for row, size in sizes.items():
                observed[row, 0] += size * sd[row]
            rows = replace(rows, observed=observed)
        kinds.append(rows)
    return replace(job, observations=tuple(kinds))


def dense(adjustment: Adjustment) -> tuple[FloatArray, FloatArray]:
    """The weighted system in full: matrix (rows, columns) and right side, rows of the datum at the end."""
    factor = adjustment._factor
    return factor.matrix.toarray(), factor.right_side


def factors(found: Sequence[VarianceComponent]) -> dict[str, float]:
    return {component.name: component.factor for component in found}
