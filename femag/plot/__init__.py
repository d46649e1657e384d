"""Figures: each function takes an Axes, draws on it and returns it."""

from femag.plot.copper_figures import copper_map, keep_out_chart, layer_bars
from femag.plot.core_drawing import core_drawing
from femag.plot.core_loss_map import core_loss_map
from femag.plot.curve_figures import (
    core_flux_figure,
    inductance_figure,
    linkage_figure,
    material_figure,
    shearing_panels,
)
from femag.plot.figure_file import write_figure, write_panels
from femag.plot.flux_map import flux_map, gap_map
from femag.plot.loop_figure import loop_figure, waveform_figure

__all__ = [
    "copper_map",
    "core_drawing",
    "core_flux_figure",
    "core_loss_map",
    "flux_map",
    "gap_map",
    "inductance_figure",
    "keep_out_chart",
    "layer_bars",
    "linkage_figure",
    "loop_figure",
    "material_figure",
    "shearing_panels",
    "waveform_figure",
    "write_figure",
    "write_panels",
]
