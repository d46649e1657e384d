"""The section of a core with its dimensions."""

from __future__ import annotations

from typing import TYPE_CHECKING

from matplotlib.patches import Polygon

from femag.geometry import PotCore, pot_regions

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def core_drawing(core: PotCore, ax: Axes) -> Axes:
    """Draw the section of an ungapped core through its axis, with dimensions in mm.

    Parameters
    ----------
    core : PotCore
        The core.
    ax : Axes
        Where to draw.
    """
    for region in pot_regions(core, ()):
        if region.role == "core":
            for side in (1e3, -1e3):
                corners = [(side * r, 1e3 * z) for r, z in region.polygon]
                ax.add_patch(Polygon(corners, facecolor="0.82", edgecolor="none"))
    _draw_outline(core, ax)
    half_width, half_height = 500 * core.outer_diameter, 500 * core.height
    step = 0.16 * max(half_width, half_height)
    diameters = (core.hole_diameter, core.post_diameter, core.window_diameter, core.outer_diameter)
    for level, diameter in enumerate(diameters, 1):
        if diameter > 0.0:
            half, place = 500 * diameter, -half_height - level * step
            _dimension(ax, (-half, place), (half, place))
    for level, height in enumerate((core.window_height, core.height), 1):
        place = half_width + level * step
        _dimension(ax, (place, -500 * height), (place, 500 * height))
    ax.axvline(0.0, color="black", linewidth=0.6, dashes=(12, 3, 2, 3))
    ax.set(
        xlim=(-half_width - step, half_width + 3 * step),
        ylim=(-half_height - 5 * step, half_height + step),
        xlabel="r, mm",
        ylabel="z, mm",
        aspect="equal",
        title=f"{core.name or 'pot core'}, dimensions in mm",
    )
    return ax


def _draw_outline(core: PotCore, ax: Axes) -> None:
    outside, post, window = (
        500 * d for d in (core.outer_diameter, core.post_diameter, core.window_diameter)
    )
    height, room, hole = 500 * core.height, 500 * core.window_height, 500 * core.hole_diameter
    for side in (1, -1):
        ring = [(hole, -height), (outside, -height), (outside, height), (hole, height)]
        opening = [(post, -room), (window, -room), (window, room), (post, room)]
        for corners in (ring, opening):
            points = [(side * r, z) for r, z in corners]
            ax.add_patch(Polygon(points, fill=False, edgecolor="black", linewidth=1.4))
    ax.plot([-outside, -window], [0, 0], color="black", linewidth=0.8)
    ax.plot([window, outside], [0, 0], color="black", linewidth=0.8)
    for side in (1, -1):
        ax.plot([side * hole, side * post], [0, 0], color="black", linewidth=0.8)


def _dimension(ax: Axes, start: tuple[float, float], end: tuple[float, float]) -> None:
    """Draw a dimension line with its length; an upright one for equal abscissas."""
    upright = start[0] == end[0]
    length = abs(end[1] - start[1]) if upright else abs(end[0] - start[0])
    ax.annotate("", start, end, arrowprops={"arrowstyle": "<->", "linewidth": 0.8})
    ax.annotate(
        f"{length:.4g}" if upright else f"\N{LATIN CAPITAL LETTER O WITH STROKE} {length:.4g}",
        ((start[0] + end[0]) / 2, (start[1] + end[1]) / 2),
        ha="center",
        va="center",
        rotation=90 if upright else 0,
        fontsize=9,
        bbox={"facecolor": "white", "edgecolor": "none", "pad": 1.0},
    )
    _extension_lines(ax, start, end, upright=upright)


def _extension_lines(
    ax: Axes, start: tuple[float, float], end: tuple[float, float], *, upright: bool
) -> None:
    """Draw thin lines from the middle of the core out to both ends of a dimension line."""
    for r, z in (start, end):
        inner = (0.0, z) if upright else (r, 0.0)
        ax.plot([inner[0], r], [inner[1], z], color="0.45", linewidth=0.4, zorder=0.5)
