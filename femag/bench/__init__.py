"""From an oscilloscope's record to a B-H loop, a normal curve and a material file."""

from femag.bench.capture import Capture, CoreUnderTest
from femag.bench.column_choice import CaptureColumns, read_capture
from femag.bench.loop import Loop, Readings, loop_of
from femag.bench.measured_loss import MeasuredLoss, measured_loss
from femag.bench.normal_curve import MeasuredCurve, material_toml, middle_curve, normal_curve

__all__ = [
    "Capture",
    "CaptureColumns",
    "CoreUnderTest",
    "Loop",
    "MeasuredCurve",
    "MeasuredLoss",
    "Readings",
    "loop_of",
    "material_toml",
    "measured_loss",
    "middle_curve",
    "normal_curve",
    "read_capture",
]
