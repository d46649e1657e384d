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
from femag.plot.field_lines import layer_field, post_face_field
from femag.plot.figure_file import figure_bytes, untitled, write_figure, write_panels
from femag.plot.flux_map import flux_map, gap_map
from femag.plot.loop_figure import loop_figure, waveform_figure
from femag.plot.result_files import result_files
from femag.plot.review_figures import convergence, material_curve
from femag.plot.section_drawing import section_drawing
from femag.plot.study_figures import al_chart, fringing_chart, hand_error_chart

__all__ = [
    "al_chart",
    "convergence",
    "copper_map",
    "core_drawing",
    "core_flux_figure",
    "core_loss_map",
    "figure_bytes",
    "flux_map",
    "fringing_chart",
    "gap_map",
    "hand_error_chart",
    "inductance_figure",
    "keep_out_chart",
    "layer_bars",
    "layer_field",
    "linkage_figure",
    "loop_figure",
    "material_curve",
    "material_figure",
    "post_face_field",
    "result_files",
    "section_drawing",
    "shearing_panels",
    "untitled",
    "waveform_figure",
    "write_figure",
    "write_panels",
]
