"""How much each kind of observation weighs, and how well the sds of each group were stated."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

import numpy as np

from adjust.adjustment import Adjustment
from adjust.quality import LEAST_REDUNDANCY
from adjust.reports import layout
from adjust.reports.records import Record, number
from adjust.reports.wording import decimals
from adjust.residuals import Residuals
from adjust.variance_components import VarianceComponent, variance_components

if TYPE_CHECKING:
    from adjust.blunders import Findings

MOST_JUDGED = 1_000_000
"""Scalars of a job up to which variance components are estimated for its reports: beyond that a second factor of the
system, beside that of the adjustment, may not fit into the memory of a desktop."""

LEAST_KIND_REDUNDANCY = 2.0
"""Sum of redundancy numbers below which a kind says nothing of its own sds: the factor would be a guess from a row."""


def weight_records(adjustment: Adjustment) -> Iterator[Record]:
    """One record for each kind: its sds, its share of vᵀPv and of the degrees of freedom, and the factor of its sds.

    The factor √(vᵀPv / Σr) is that of the residuals as they stand, blunders and all: the first step of the iteration
    that `adjust.variance_components` carries to its end, group by group.
    """
    for table in adjustment.residuals:
        angular = table.observations.unit == "rad"
        sd = np.degrees(table.sd) if angular else table.sd
        square_sum, redundancy = weighted_square_sum(adjustment, table), float(np.sum(table.redundancy))
        factor = np.sqrt(square_sum / redundancy) if redundancy >= LEAST_KIND_REDUNDANCY else np.nan
        yield {
            "kind": table.observations.kind,
            "observations": table.residual.size,
            "unchecked": int(np.count_nonzero(table.redundancy < LEAST_REDUNDANCY)),
            "unit": "deg" if angular else "m",
            "sd_smallest": number(float(np.min(sd))),
            "sd_median": number(float(np.median(sd))),
            "sd_largest": number(float(np.max(sd))),
            "weighted_square_sum": number(square_sum),
            "redundancy": number(redundancy),
            "sd_factor": number(float(factor)),
        }


def weighted_square_sum(adjustment: Adjustment, table: Residuals) -> float:
    """vᵀPv over the rows of one kind; rows are independent of each other, the components of a vector are not."""
    covariance = table.observations.covariance(adjustment.geometry)
    whitened = np.linalg.solve(covariance, table.residual[:, :, None])[:, :, 0]
    return float(np.sum(whitened * table.residual))


def components_of(adjustment: Adjustment, findings: Findings | None) -> tuple[VarianceComponent, ...] | None:
    """The variance components of a job without the observations that `findings` names; None for one too large."""
    if adjustment.solution.observations > MOST_JUDGED:
        return None
    named = () if findings is None else findings.blunders
    single = (blunder for blunder in named if blunder.hypothesis.nature in ("observation", "vector"))
    return variance_components(adjustment, {source for blunder in single for source in blunder.sources})


def component_records(components: Sequence[VarianceComponent]) -> Iterator[Record]:
    """One record for each group."""
    for component in components:
        yield {
            "name": component.name,
            "kind": component.kind,
            "instrument": component.instrument,
            "file": component.file,
            "group": component.group,
            "merged": list(component.merged),
            "observations": component.observations,
            "redundancy": number(component.redundancy),
            "factor": number(component.factor),
            "sd": number(component.sd),
            "lower": number(component.lower),
            "upper": number(component.upper),
            "confidence": component.confidence,
            "differs": component.differs if component.estimated else None,
            "left_out": list(component.left_out),
            "sentence": component.sentence,
        }


def component_sentences(components: Sequence[VarianceComponent]) -> list[str]:
    """What has to be said of some group beyond its figures, and what the figures are."""
    if not components:
        return []
    remarkable = [each for each in components if each.differs or each.merged or each.left_out]
    told = [each.sentence for each in remarkable]
    if not any(each.differs for each in components):
        told.insert(0, "No group differs significantly from what was stated.")
    percent = f"{100 * components[0].confidence:g} %"
    return [
        *told,
        "Factor: by which the stated sds would have to be multiplied to agree with the residuals; its limits hold for "
        f"all groups at once with a probability of {percent}. None of it has been applied: state other sds where the "
        "reason is plain, and adjust again.",
    ]


def component_section(components: Sequence[VarianceComponent] | None) -> list[str]:
    """The listing's lines on how well sds were stated."""
    if not components:
        return []
    columns = (
        layout.Column("group", text=True),
        layout.Column("number"),
        layout.Column("Σr"),
        layout.Column("factor"),
        layout.Column("sd"),
        layout.Column("from"),
        layout.Column("to"),
    )
    lines = [*layout.title("Weights"), *layout.table(columns, [_component_cells(each) for each in components])]
    return lines + [line for sentence in component_sentences(components) for line in layout.paragraph(sentence)]


def _component_cells(component: VarianceComponent) -> list[str]:
    figures = (component.factor, component.sd, component.lower, component.upper)
    return [
        component.name,
        str(component.observations),
        decimals(component.redundancy, 1),
        *(decimals(figure, 2) or "–" for figure in figures),
    ]
