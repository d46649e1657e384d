"""How large what is drawn comes out beside its text."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.axes import Axes

INCH = 72.0
"""Points to an inch."""


def points_per_unit(ax: Axes) -> float:
    """Return how many typographic points a unit of the abscissa takes, with the limits as set.

    Parameters
    ----------
    ax : Axes
        Of a figure; a layout that is made later may move this by some per cent.
    """
    ax.apply_aspect()
    left, right = ax.get_xlim()
    figure = ax.get_figure()
    assert figure is not None
    return float(INCH * ax.get_window_extent().width / figure.dpi / abs(right - left))
