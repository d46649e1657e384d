"""Figures as files, drawn without a screen."""

from __future__ import annotations

import warnings
from collections.abc import Callable, Sequence
from pathlib import Path

from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from femag.errors import InputError
from femag.export.whole_file import whole_file

RESOLUTION = 150
"""Dots per inch."""
PANEL = (6.4, 6.4)
SMALL_PANEL = (4.8, 4.8)
"""Width and height of an Axes with its labels, inch: alone, and beside others."""


def write_figure(draw: Callable[[Axes], Axes], path: str | Path) -> None:
    """Draw on the one Axes of a new figure and write it; the file is complete or not there.

    Parameters
    ----------
    draw : callable
        Draws on the Axes that it is given.
    path : path
        File with the ending of a format, such as ``.png`` or ``.svg``.

    Raises
    ------
    InputError
        If the file cannot be written, or its ending names no format.
    """
    write_panels((draw,), path, PANEL)


def write_panels(
    draws: Sequence[Callable[[Axes], Axes]],
    path: str | Path,
    panel: tuple[float, float] = SMALL_PANEL,
    rows: int = 1,
) -> None:
    """Draw on Axes side by side of a new figure and write it; the file is complete or not there.

    Parameters
    ----------
    draws : sequence of callable
        Each draws on the Axes that it is given.
    path : path
        File with the ending of a format, such as ``.png`` or ``.svg``.
    panel : tuple of float
        Width and height of each, inch.
    rows : int
        Number of rows, all full but the last.

    Raises
    ------
    InputError
        If the file cannot be written, or its ending names no format.
    """
    columns = -(-len(draws) // rows)
    figure = Figure(figsize=(panel[0] * columns, panel[1] * rows), layout="constrained")
    known = FigureCanvasAgg(figure).get_supported_filetypes()
    if Path(path).suffix.removeprefix(".").lower() not in known:
        raise InputError(
            "no format of a figure", file=str(path), accepted="an ending such as .png or .svg"
        )
    axes = figure.subplots(rows, columns, squeeze=False).ravel()
    for draw, ax in zip(draws, axes, strict=False):
        draw(ax)
    for ax in axes[len(draws) :]:
        ax.remove()
    with whole_file(path) as temporary, warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing from font")
        figure.savefig(temporary, dpi=RESOLUTION)
