"""Figures as files, drawn without a screen."""

from __future__ import annotations

import warnings
from collections.abc import Callable, Sequence
from io import BytesIO
from pathlib import Path
from typing import Any, Literal

from matplotlib import rc_context
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from femag.errors import InputError
from femag.export.whole_file import whole_file

RESOLUTION = 150
"""Dots per inch."""
PAGE_RESOLUTION = 170
"""Dots per inch of pictures in a page."""
PAGE_STYLE: Any = {
    "font.size": 9,
    "axes.titlesize": 9,
    "legend.fontsize": 8,
    "axes.linewidth": 0.7,
    "axes.grid": True,
    "axes.axisbelow": True,
    "grid.color": "0.9",
    "grid.linewidth": 0.5,
    "xtick.direction": "in",
    "ytick.direction": "in",
    "svg.fonttype": "none",
    "svg.hashsalt": "gapfield",
}
"""Of figures in a page."""
PANEL = (6.4, 6.4)
SMALL_PANEL = (4.8, 4.8)
"""Width and height of an Axes with its labels, inch: alone, and beside others."""


Draw = Callable[[Axes], Axes]
"""What draws on the Axes that it is given, and returns it."""


def write_figure(draw: Draw, path: str | Path) -> None:
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


def figure_bytes(draw: Draw, kind: Literal["svg", "png"], panel: tuple[float, float]) -> bytes:
    """Draw on the one Axes of a new figure and return the bytes of a file, cut to its content.

    Equal figures give equal bytes. Text in SVG stays text.

    Parameters
    ----------
    draw : callable
        Draws on the Axes that it is given.
    kind : {"svg", "png"}
        Format.
    panel : tuple of float
        Width and height, inch.
    """
    written = BytesIO()
    with rc_context(PAGE_STYLE), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing from font")
        figure = Figure(figsize=panel)  # cut to its content: a layout would take as long again
        draw(figure.add_subplot())
        metadata = {"Date": None, "Creator": None} if kind == "svg" else {"Software": None}
        figure.savefig(
            written, format=kind, dpi=PAGE_RESOLUTION, metadata=metadata, bbox_inches="tight",
            pad_inches=0.05,
        )  # fmt: skip
    return written.getvalue()


def untitled(draw: Draw, *, grid: bool = False) -> Draw:
    """Return what draws the same without a title, which a caption says, and without a grid."""

    def drawn(ax: Axes) -> Axes:
        draw(ax)
        ax.set_title("")
        if not grid:
            ax.grid(visible=False)
        return ax

    return drawn


def write_panels(
    draws: Sequence[Draw],
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
