"""How much each kind of observation weighs, and whether its sds were claimed rightly."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from adjust.adjustment import Adjustment
from adjust.quality import LEAST_REDUNDANCY
from adjust.reports.records import Record, number
from adjust.residuals import Residuals

LEAST_KIND_REDUNDANCY = 2.0
"""Sum of redundancy numbers below which a kind says nothing of its own sds: the factor would be a guess from a row."""


def weight_records(adjustment: Adjustment) -> Iterator[Record]:
    """One record for each kind: its sds, its share of vᵀPv and of the degrees of freedom, and the factor of its sds.

    The factor √(vᵀPv / Σr) over the rows of a kind says by how much its sds would have to be multiplied to agree with
    its residuals. Source: Förstner (1979), estimation of variance components by vᵀPv over the redundancy of each group,
    one step of the iteration (from memory).
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
