"""The section through core, gap and copper of a design, with its dimensions."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.patches import Polygon
from shapely import Polygon as ShapelyPolygon
from shapely import union_all

from femag.design import Design, whole_section
from femag.geometry import PotCore, Region, half_window_height
from femag.geometry.section import Point
from femag.plot.core_drawing import CORE, dimension
from femag.plot.flux_map import label_places
from femag.plot.text_room import points_per_unit
from femag.quantities import gap_openings

if TYPE_CHECKING:
    from matplotlib.axes import Axes

COPPER = "0.94"
FILLING = "0.97"
LEVEL = 0.15
"""Distance of dimension lines over the larger half extent."""
SEAM = 1e-9
"""Distance in m within which parts of the core touch."""
MOST_TURNS = 60
"""Turns that are drawn one by one with an outline that shows."""
NAME_HEIGHT = 24.0
"""Points that the two lines of a winding's name take across."""
Label = tuple[str, Point]
"""A text, and the place in mm that it belongs to."""


def section_drawing(design: Design, ax: Axes) -> Axes:
    """Draw the solved section of a design with the dimensions in mm that its field depends on.

    Parameters
    ----------
    design : Design
        Core, gaps and windings.
    ax : Axes
        Where to draw.
    """
    regions = whole_section(design).regions
    half_width, half_height = _extent(regions)
    step = LEVEL * max(half_width, half_height)
    _draw_core(regions, ax)
    for region in regions:
        if region.role != "core":
            _draw_region(region, ax, many=len(regions) > MOST_TURNS)
    below = _widths(design, ax, half_height, step)
    beside = _heights(design, ax, half_width, step)
    above = _copper_sizes(regions, ax, half_height, step)
    low, high = -half_height - (below + 0.6) * step, half_height + (above + 0.6) * step
    ax.plot([0.0, 0.0], [low, high], color="black", linewidth=0.6, dashes=(12, 3, 2, 3))
    ax.set(
        xlim=(-half_width - 2.6 * step, half_width + (beside + 0.8) * step),
        ylim=(low, high),
        aspect="equal",
    )
    beside_copper = _name_copper(design, regions, ax, half_height)
    _label([*beside_copper, *_gap_labels(design)], ax, half_width, step)
    ax.axis("off")
    return ax


def _extent(regions: tuple[Region, ...]) -> tuple[float, float]:
    """Return half width and half height in mm of what is solid."""
    corners = np.vstack([region.polygon for region in regions])
    largest = 1e3 * np.abs(corners).max(axis=0)
    return float(largest[0]), float(largest[1])


def _draw_region(region: Region, ax: Axes, *, many: bool) -> None:
    corners = 1e3 * np.asarray(region.polygon)
    look: dict[str, Any] = {"facecolor": "white", "edgecolor": "none", "zorder": 1.0}
    if region.role == "winding":
        width = 0.2 if many else 0.7
        look = {"facecolor": COPPER, "edgecolor": "0.25", "linewidth": width, "zorder": 1.3,
                "hatch": None if many else "////"}  # fmt: skip
    elif region.name != "window":
        look = {"facecolor": FILLING, "edgecolor": "none", "zorder": 1.2}
    for side in (1.0, -1.0):
        patch = Polygon(corners * [side, 1.0], **look)
        patch.set_hatch_linewidth(0.35)
        ax.add_patch(patch)


def _draw_core(regions: tuple[Region, ...], ax: Axes) -> None:
    """Draw the core without the seams between its parts."""
    parts = [ShapelyPolygon(region.polygon) for region in regions if region.role == "core"]
    whole = union_all(parts, grid_size=SEAM)
    for side in (1.0, -1.0):
        for piece in getattr(whole, "geoms", [whole]):
            for hole, ring in enumerate((piece.exterior, *piece.interiors)):
                corners = 1e3 * np.asarray(ring.coords) * [side, 1.0]
                ax.add_patch(Polygon(corners, facecolor="white" if hole else CORE,
                                     edgecolor="black", linewidth=1.1, zorder=0.9))  # fmt: skip


def _name_copper(
    design: Design, regions: tuple[Region, ...], ax: Axes, half_height: float
) -> list[Label]:
    """Write names and turns into the copper; return the labels of what is too narrow for them."""
    turns = {winding.name: winding.turns for winding in design.windings}
    window = (0.0, np.inf, -half_height, half_height)
    beside: list[Label] = []
    for name, (r, z) in label_places(regions, window).items():
        corners = np.vstack([region.polygon for region in regions if region.winding == name])
        if 1e3 * np.ptp(corners[:, 0]) * points_per_unit(ax) < NAME_HEIGHT:
            beside.append((f"{name}, {turns[name]} turns", (1e3 * r, 1e3 * z)))
            continue
        ax.text(1e3 * r, 1e3 * z, f"{name}\n{turns[name]} turns", ha="center", va="center",
                fontsize=8, rotation=90, zorder=3,
                bbox={"facecolor": "white", "edgecolor": "none", "pad": 1.2})  # fmt: skip
    return beside


def _widths(design: Design, ax: Axes, half_height: float, step: float) -> int:
    """Draw the diameters below the section; return the levels that they take."""
    turned = design.core.turned
    radii = [turned.hole_radius, turned.post_radius, turned.ring_inner_radius]
    if isinstance(design.core, PotCore):
        radii.append(turned.ring_outer_radius)
    shown = [1e3 * radius for radius in radii if radius > 0.0]
    for level, radius in enumerate(shown, 1):
        place = -half_height - level * step
        dimension(ax, (-radius, place), (radius, place), is_diameter=True)
    return len(shown)


def _heights(design: Design, ax: Axes, half_width: float, step: float) -> int:
    """Draw the heights of window and core on the right; return the levels that they take."""
    window = 1e3 * half_window_height(design.core, design.gaps)
    outside = window + 1e3 * design.core.plate_thickness
    for level, half in enumerate((window, outside), 1):
        place = half_width + level * step
        dimension(ax, (place, -half), (place, half))
    return 2


def _copper_sizes(regions: tuple[Region, ...], ax: Axes, half_height: float, step: float) -> int:
    """Draw the diameters that the copper lies between above; return the levels that they take."""
    corners = np.vstack([region.polygon for region in regions if region.role == "winding"])
    for level, radius in enumerate((corners[:, 0].min(), corners[:, 0].max()), 1):
        place, half = half_height + level * step, 1e3 * float(radius)
        dimension(ax, (-half, place), (half, place), is_diameter=True)
    return 2


def _gap_labels(design: Design) -> list[Label]:
    """Return the length of every opening, with the highest place of alike ones."""
    places: dict[str, list[Point]] = {}
    for radius, low, high in gap_openings(design):
        middle = 0.5 * (low + high)
        places.setdefault(f"gap {1e3 * (high - low):.4g}", []).append((radius, middle))
    labels = []
    for text, points in places.items():
        radius, middle = max(points, key=lambda point: point[1])
        text = f"{len(points)} x {text}" if len(points) > 1 else text
        labels.append((text, (1e3 * radius, 1e3 * middle)))
    return labels


def _label(labels: list[Label], ax: Axes, half_width: float, step: float) -> None:
    """Write labels on the left, one below the other, each with a line to its place."""
    height = np.inf
    for text, (radius, middle) in sorted(labels, key=lambda label: -label[1][1]):
        height = min(middle, height - step)
        ax.annotate(text, (-radius, middle), (-half_width - 0.35 * step, height),
                    ha="right", va="center", fontsize=9, zorder=4,
                    arrowprops={"arrowstyle": "-", "linewidth": 0.7, "shrinkB": 0.0})  # fmt: skip
