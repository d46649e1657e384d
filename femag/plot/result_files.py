"""Every figure of a result as a file of its own."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import Literal

from femag.plot.field_lines import layer_field, post_face_field
from femag.plot.figure_file import Draw, figure_bytes
from femag.plot.flux_map import flux_map, gap_map
from femag.plot.review_figures import convergence, material_curve
from femag.plot.section_drawing import section_drawing
from femag.result import Result
from femag.review import MeshStep

Kind = Literal["svg", "png"]

LINES = (4.8, 3.6)
MAP = (4.8, 5.0)
DRAWING = (5.6, 4.2)
"""Width and height of each kind of figure, inch."""


def result_files(result: Result, meshes: Sequence[MeshStep]) -> dict[str, bytes]:
    """Return every figure of a result, bytes by the name of a file.

    Parameters
    ----------
    result : Result
        With its fields.
    meshes : sequence of MeshStep
        The bounds on a row of meshes.

    Raises
    ------
    ValueError
        If the result was read from a file and holds no fields.
    """
    figures: dict[str, tuple[Draw, tuple[float, float]]] = {
        "drawing.svg": (partial(section_drawing, result.design), DRAWING),
        "section.png": (partial(flux_map, result), MAP),
        "gap.png": (partial(gap_map, result), MAP),
        "post-face.svg": (partial(post_face_field, result), LINES),
        "layer.svg": (partial(layer_field, result), LINES),
        "material.svg": (partial(material_curve, result), LINES),
        "convergence.svg": (
            partial(convergence, meshes, tolerance=result.design.tolerance),
            LINES,
        ),
    }
    return {name: figure_bytes(draw, _kind(name), panel) for name, (draw, panel) in figures.items()}


def _kind(name: str) -> Kind:
    return "svg" if name.endswith(".svg") else "png"
