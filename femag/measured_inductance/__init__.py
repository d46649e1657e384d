"""Measured inductance against current: points from a file, residuals, fit of gap and material."""

from femag.measured_inductance.fit import CAUTION, Fit, fitted_design
from femag.measured_inductance.points import MeasuredPoints, measured_curve, residuals
from femag.measured_inductance.points_file import read_measured

__all__ = [
    "CAUTION",
    "Fit",
    "MeasuredPoints",
    "fitted_design",
    "measured_curve",
    "read_measured",
    "residuals",
]
