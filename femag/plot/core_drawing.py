"""A core with its dimensions: section through the axis, and the view along the post."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.patches import Circle, Polygon

from femag.geometry import Core, RoundLegCore

if TYPE_CHECKING:
    from matplotlib.axes import Axes

CORE = "0.82"
CUT = "0.62"


def core_drawing(core: Core, ax: Axes) -> Axes:
    """Draw an ungapped core with its dimensions in mm.

    Above is the section through the axis and the legs; below, for a core with straight legs, the
    view along the post, with plate and legs.

    Parameters
    ----------
    core : Core
        The core.
    ax : Axes
        Where to draw.
    """
    outside = _outside(core)
    half_width, half_height = 500 * outside, 500 * core.sizes["height"]
    step = 0.16 * max(half_width, half_height)
    _draw_section(core, ax)
    levels = _section_dimensions(core, ax, step)
    low = -half_height - levels * step
    if isinstance(core, RoundLegCore):
        low = _draw_plan(core, ax, low - 0.5 * step, step)
    ax.plot([0.0, 0.0], [low, half_height + 0.6 * step], color="black", linewidth=0.6,
            dashes=(12, 3, 2, 3))  # fmt: skip
    ax.set(
        xlim=(-half_width - 2 * step, half_width + 3 * step),
        ylim=(low - step, half_height + step),
        xlabel="mm",
        ylabel="mm",
        aspect="equal",
        title=f"{core.name or core.description}, dimensions in mm",
    )
    return ax


def _outside(core: Core) -> float:
    """Return the outer width in m of the section through the legs."""
    sizes = core.sizes
    return sizes["outer_diameter"] if "outer_diameter" in sizes else sizes["length"]


def _draw_section(core: Core, ax: Axes) -> None:
    sizes = {name: 500 * length for name, length in core.sizes.items()}
    outside, height, room = 500 * _outside(core), sizes["height"], sizes["window_height"]
    hole, post, window = (sizes[f"{part}_diameter"] for part in ("hole", "post", "window"))
    block = [(-outside, -height), (outside, -height), (outside, height), (-outside, height)]
    bore = [(-hole, -height), (hole, -height), (hole, height), (-hole, height)]
    opening = np.array([(post, -room), (window, -room), (window, room), (post, room)])
    parts: list[tuple[Any, str]] = [
        (block, CORE),
        (opening, "white"),
        (opening * [-1.0, 1.0], "white"),
    ]
    for corners, colour in parts if hole == 0.0 else [*parts, (bore, "white")]:
        ax.add_patch(Polygon(corners, facecolor=colour, edgecolor="black", linewidth=1.4))
    for side in (1, -1):
        for start, end in ((window, outside), (hole, post)):
            ax.plot([side * start, side * end], [0, 0], color="black", linewidth=0.8)


def _section_dimensions(core: Core, ax: Axes, step: float) -> int:
    """Draw the dimension lines of the section; return how many levels they take below it."""
    sizes, outside = core.sizes, _outside(core)
    half_width, half_height = 500 * outside, 500 * sizes["height"]
    widths = [sizes[f"{part}_diameter"] for part in ("hole", "post", "window")] + [outside]
    round_outside = "outer_diameter" in sizes or sizes.get("width") is None
    shown = [(width, True) for width in widths[:3] if width > 0.0] + [(outside, round_outside)]
    for level, (width, is_diameter) in enumerate(shown, 1):
        half, place = 500 * width, -half_height - level * step
        dimension(ax, (-half, place), (half, place), is_diameter=is_diameter)
    for level, height in enumerate((sizes["window_height"], sizes["height"]), 1):
        place = half_width + level * step
        dimension(ax, (place, -500 * height), (place, 500 * height))
    return len(shown)


def _draw_plan(core: RoundLegCore, ax: Axes, top: float, step: float) -> float:
    """Draw the view along the post below `top`; return where it ends."""
    plate = 1e3 * np.asarray(core.plate.exterior.coords)
    down = top - step - plate[:, 1].max()
    place = np.array([0.0, down])
    ax.add_patch(Polygon(plate + place, facecolor=CORE, edgecolor="black", linewidth=1.4))
    for leg in core.leg_outlines:
        ax.add_patch(Polygon(1e3 * leg + place, facecolor=CUT, edgecolor="black", linewidth=0.8))
    for diameter, colour in ((core.post_diameter, CUT), (core.hole_diameter, "white")):
        if diameter > 0.0:
            circle = Circle((0.0, down), 500 * diameter, facecolor=colour, edgecolor="black")
            ax.add_patch(circle)
    levels = _plan_dimensions(core, ax, down, step)
    return float(down + plate[:, 1].min() - levels * step)


def _plan_dimensions(core: RoundLegCore, ax: Axes, down: float, step: float) -> int:
    """Draw the dimension lines of the view along the post; return how many levels lie below it."""
    x_low, y_low, x_high, _ = (1e3 * edge for edge in core.plate.bounds)
    levels = 0
    if core.leg_opening is not None:
        half, levels = 500 * core.leg_opening, 1
        dimension(ax, (-half, down + y_low - step), (half, down + y_low - step), down)
    right = x_high + step
    if core.waist is not None:
        half = 500 * core.waist
        dimension(ax, (right, down - half), (right, down + half))
    if core.family == "rm" and core.width is not None:
        _square_side(ax, 1e3 * core.width, down)
    elif core.front is not None and core.width is not None:
        dimension(ax, (right, down + y_low), (right, down + y_low + 1e3 * core.width))
        dimension(ax, (x_low - step, down + y_low), (x_low - step, down))
    elif core.width is not None:
        dimension(ax, (right, down - 500 * core.width), (right, down + 500 * core.width))
    return levels


def _square_side(ax: Axes, side: float, down: float) -> None:
    """Draw the square that stands on its corner, thin, with the length of its side in mm."""
    tip = side / np.sqrt(2.0)
    square = [(tip, down), (0.0, down + tip), (-tip, down), (0.0, down - tip)]
    ax.add_patch(
        Polygon(square, fill=False, edgecolor="0.45", linewidth=0.5, linestyle=(0, (4, 3)))
    )
    ax.text(-0.62 * tip, down + 0.62 * tip, f"{side:.4g}", ha="center", va="center", rotation=45,
            fontsize=9)  # fmt: skip


def dimension(
    ax: Axes,
    start: tuple[float, float],
    end: tuple[float, float],
    middle: float = 0.0,
    *,
    is_diameter: bool = False,
) -> None:
    """Draw a dimension line with its length; an upright one for equal abscissas.

    `middle` is the ordinate of the view's middle.
    """
    upright = start[0] == end[0]
    length = abs(end[1] - start[1]) if upright else abs(end[0] - start[0])
    sign = "\N{LATIN CAPITAL LETTER O WITH STROKE} " if is_diameter else ""
    ax.annotate("", start, end, arrowprops={"arrowstyle": "<->", "linewidth": 0.8})
    ax.annotate(
        f"{sign}{length:.4g}",
        ((start[0] + end[0]) / 2, (start[1] + end[1]) / 2),
        ha="center",
        va="center",
        rotation=90 if upright else 0,
        fontsize=9,
        bbox={"facecolor": "white", "edgecolor": "none", "pad": 1.0},
    )
    for r, z in (start, end):  # thin lines from the middle of the view out to both ends
        inner = (0.0, z) if upright else (r, middle)
        ax.plot([inner[0], r], [inner[1], z], color="0.45", linewidth=0.4, zorder=0.5)
