"""Figures: each function takes an Axes, draws on it and returns it."""

from femag.plot.core_drawing import core_drawing
from femag.plot.figure_file import write_figure
from femag.plot.flux_map import flux_map, gap_map
from femag.plot.loop_figure import loop_figure, waveform_figure

__all__ = [
    "core_drawing",
    "flux_map",
    "gap_map",
    "loop_figure",
    "waveform_figure",
    "write_figure",
]
