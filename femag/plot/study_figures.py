"""Charts of studies: fringing factor, errors of the hand formulas, AL against gap."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from femag.study import StudyTable
from femag.study.charts import Series, al_series, error_plane, fringing_series

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MARKERS = "os^Dv<>P"
DASHES = ("-", (0, (5, 2)), (0, (1, 1.5)), (0, (5, 2, 1, 2)), (0, (8, 2)), (0, (3, 1)))
GREYS = ("0", "0.25", "0.4", "0.5", "0.6", "0.68")
MOST_LABELS = 8
"""Lines up to which each is named."""
LEVELS = (0.01, 0.02, 0.05, 0.10, 0.20)
"""Sizes of error at which the tone of a cell changes."""
MANY_CELLS = 10
"""Cells side by side beyond which their numbers are set smaller."""
CLOSE_POINTS = 40
"""Points of a line beyond which they are not marked."""
TONES = ("1.0", "0.9", "0.78", "0.62", "0.42", "0.2")


def fringing_chart(table: StudyTable, ax: Axes) -> Axes:
    """Draw the fringing factor against gap over post diameter, for each window height.

    Parameters
    ----------
    table : StudyTable
        Of a study that keeps ``fringing_factor``.
    ax : Axes
        Where to draw.
    """
    series = fringing_series(table)
    _draw(sorted(series, key=lambda one: one.group), ax)
    ax.set(xscale="log", xlabel="gap over post diameter", ylabel="fringing factor")
    ax.set_title("inductance over that without fringing")
    ax.axhline(1.0, color="0.6", linewidth=0.8, zorder=0)
    _plain_ticks(ax, "x")
    _legend(ax, "window height over\npost diameter")
    return ax


def al_chart(table: StudyTable, ax: Axes) -> Axes:
    """Draw AL against gap in logarithmic scales, as makers of cores print it.

    Parameters
    ----------
    table : StudyTable
        Of a study that keeps ``al_value``.
    ax : Axes
        Where to draw.
    """
    series = al_series(table)
    _draw(series, ax)
    ax.set(xscale="log", yscale="log", xlabel="gap, mm", ylabel="AL, nH")
    ax.set_title("AL value against gap")
    ax.grid(which="both", color="0.88", linewidth=0.6)
    for axis in "xy":
        _plain_ticks(ax, axis)
    if len(series) <= MOST_LABELS:
        _legend(ax, None)
    else:
        ax.text(0.97, 0.95, f"{len(series)} lines; the table beside\nthis chart names them",
                transform=ax.transAxes, ha="right", va="top", fontsize=9)  # fmt: skip
    return ax


def hand_error_chart(table: StudyTable, formula: str, ax: Axes) -> Axes:
    """Draw the error of a hand formula over gap and window height, in cells.

    A number is the error in per cent that is largest in size in its cell, in brackets where a case
    is outside of the formula's range; the darker the larger.

    Parameters
    ----------
    table : StudyTable
        Of a study that keeps ``hand``.
    formula : str
        Name of the formula.
    ax : Axes
        Where to draw.
    """
    plane = error_plane(table, formula)
    size = 7.0 if len(plane.gaps) <= MANY_CELLS else 5.5
    tones = np.searchsorted(LEVELS, np.abs(plane.error))
    for row, column in np.argwhere(~np.isnan(plane.error)).tolist():
        tone = TONES[tones[row, column]]
        ax.fill_between([column - 0.5, column + 0.5], row - 0.5, row + 0.5, color=tone, linewidth=0)
        error = 100 * plane.error[row, column]
        text = f"{error:+.1f}" if abs(error) < 10.0 else f"{error:+.0f}"
        text = text if plane.in_range[row, column] else f"({text})"
        ax.text(column, row, text, ha="center", va="center", fontsize=size,
                color="white" if float(tone) < 0.5 else "black")  # fmt: skip
    for ticks, values, axis in ((plane.gaps, "gap", ax.xaxis), (plane.heights, "window", ax.yaxis)):
        axis.set_ticks(range(len(ticks)), [f"{value:.3g}" for value in ticks.tolist()])
        axis.set_label_text(f"{values}{' height' if values == 'window' else ''} over post diameter")
    ax.set(xlim=(-0.5, len(plane.gaps) - 0.5), ylim=(-0.5, len(plane.heights) - 0.5))
    ax.tick_params(axis="x", labelrotation=90)
    ax.set_title(f"{formula}: error of L, %", fontsize=11)
    return ax


def _draw(series: list[Series], ax: Axes) -> None:
    """Draw series, alike by group and named once for each."""
    named: set[int] = set()
    for one in series:
        dashes, grey = DASHES[one.group % len(DASHES)], GREYS[one.group % len(GREYS)]
        marker = MARKERS[one.group % len(MARKERS)] if len(one.x) <= CLOSE_POINTS else ""
        label = "_" if one.group in named else one.label
        named.add(one.group)
        ax.plot(one.x, one.y, color=grey, linestyle=dashes if len(one.x) > 1 else "none",
                marker=marker, markersize=4, linewidth=1.2, label=label)  # fmt: skip


def _plain_ticks(ax: Axes, which: str) -> None:
    """Write the ticks of a logarithmic axis as plain numbers, 1, 2 and 5 of each decade."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    axis = ax.xaxis if which == "x" else ax.yaxis
    axis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axis.set_minor_formatter(NullFormatter())


def _legend(ax: Axes, title: str | None) -> None:
    if ax.get_legend_handles_labels()[1]:
        ax.legend(title=title, frameon=False, fontsize=9, title_fontsize=9)
