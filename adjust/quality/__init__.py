"""Quality: is the adjustment believable, is each observation, and how well are the marks known?

Pure functions of arrays. Nothing here knows what was observed; lengths and angles come in SI and go out in SI.
"""

from adjust.quality.accuracy import circle_radius, ellipse_factor, half_interval
from adjust.quality.critical_values import chi_square_quantile, critical_tau, critical_w, non_centrality
from adjust.quality.ellipse import Ellipse, standard_ellipse
from adjust.quality.global_test import GlobalTest, global_test
from adjust.quality.residuals import (
    LEAST_REDUNDANCY,
    checked_information,
    external_reliability,
    minimal_detectable_bias,
    normalised_residual,
    studentised_residual,
)

__all__ = [
    "LEAST_REDUNDANCY",
    "Ellipse",
    "GlobalTest",
    "checked_information",
    "chi_square_quantile",
    "circle_radius",
    "critical_tau",
    "critical_w",
    "ellipse_factor",
    "external_reliability",
    "global_test",
    "half_interval",
    "minimal_detectable_bias",
    "non_centrality",
    "normalised_residual",
    "standard_ellipse",
    "studentised_residual",
]
