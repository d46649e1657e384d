"""Flux lines over the flux density: the whole section, and the region of the gap."""

from __future__ import annotations

from typing import TYPE_CHECKING

import matplotlib as mpl
import numpy as np
from matplotlib.collections import LineCollection
from matplotlib.colors import Colormap, ListedColormap
from matplotlib.ticker import MaxNLocator
from matplotlib.tri import Triangulation
from numpy.typing import NDArray

from femag.design import Design, whole_section
from femag.field.bounds import FieldSolution
from femag.geometry import Region
from femag.geometry.gaps import GapPiece, post_pieces
from femag.geometry.section import Point
from femag.plot.text_room import points_per_unit
from femag.quantities import FieldMap, field_map, typical_peak
from femag.result import Result

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Window = tuple[float, float, float, float]

NAME_HEIGHT = 13.0
"""Points that a winding's name takes across."""

SCALE_SHARE = 0.98
"""Share of the core's volume that the colour scale covers; corners are sharper than any scale."""


def flux_map(result: Result, ax: Axes, lines: int = 18) -> Axes:
    """Draw flux lines over the magnitude of B in the whole section.

    Parameters
    ----------
    result : Result
        With its fields.
    ax : Axes
        Where to draw.
    lines : int
        Number of flux lines; equal flux flows between neighbours.

    Raises
    ------
    ValueError
        If the result was read from a file and holds no fields.
    """
    return _drawn_map(result, ax, section_window(result.design), lines)


def gap_map(result: Result, ax: Axes, lines: int = 40) -> Axes:
    """Draw flux lines over the magnitude of B around the edge of the post's gap and the copper.

    Of several gaps in the post the top one is drawn.

    Parameters
    ----------
    result : Result
        With its fields.
    ax : Axes
        Where to draw.
    lines : int
        Number of flux lines over the whole device.

    Raises
    ------
    ValueError
        If the result was read from a file and holds no fields.
    """
    return _drawn_map(result, ax, gap_window(result.design), lines)


def section_window(design: Design) -> Window:
    """Return what the map of the whole section shows: least and largest r and z, m."""
    outside = design.core.turned.ring_outer_radius
    top = max(z for region in whole_section(design).regions for _, z in region.polygon)
    margin = 0.12 * outside
    return 0.0, outside + margin, -top - margin, top + margin


def gap_window(design: Design) -> Window:
    """Return what the map of the gap shows: least and largest r and z, m."""
    core, post = design.core, design.core.turned.post_radius
    gap = (GapPiece(0.0, 0.0), *post_pieces(design.gaps, core.window_height))[-1]
    regions = whole_section(design).regions
    copper = min(r for region in regions if region.role == "winding" for r, _ in region.polygon)
    room = core.window_radius - post
    beside = 2.0 * (copper - post)
    reach = min(max(2.5 * gap.length, beside, 0.15 * post), room)
    return max(post - reach, 0.0), post + reach, gap.middle - reach, gap.middle + reach


def solution_to_draw(result: Result) -> FieldSolution:
    """Return the fields of a result; a ValueError if it was read from a file and holds none."""
    if result.solution is None:
        raise ValueError("the result holds no fields: solve the design again to draw it")
    return result.solution


def _drawn_map(result: Result, ax: Axes, window: Window, lines: int) -> Axes:
    fields = field_map(solution_to_draw(result))
    mesh = Triangulation(1e3 * fields.r, 1e3 * fields.z, fields.triangles)
    colour = ax.tripcolor(
        mesh,
        fields.flux_density,
        shading="gouraud",
        cmap=light_to_dark(),
        vmin=0.0,
        vmax=typical_peak(fields, SCALE_SHARE),
        rasterized=True,
    )
    levels = np.linspace(fields.flux.min(), fields.flux.max(), lines + 2)[1:-1]
    ax.tricontour(mesh, fields.flux, levels=levels, colors="black", linewidths=0.5)
    draw_outlines(ax, fields)
    r0, r1, z0, z1 = (1e3 * edge for edge in window)
    ax.set(xlim=(r0, r1), ylim=(z0, z1), xlabel="r, mm", ylabel="z, mm", aspect="equal")
    ax.set_title(f"flux lines and flux density at {result.current:g} A", fontsize=10)
    bar = ax.figure.colorbar(colour, ax=ax, extend="max", shrink=0.8)
    bar.set_label(f"|B|, T; {SCALE_SHARE:.0%} of the core lies on this scale")
    bar.locator = MaxNLocator(6)
    bar.update_ticks()
    _name_windings(ax, _regions(result), window)
    return ax


def light_to_dark() -> Colormap:
    """Return a map whose luminance falls with the value, light enough for black lines."""
    return ListedColormap(mpl.colormaps["GnBu"](np.linspace(0.0, 0.82, 256)))


def draw_outlines(ax: Axes, fields: FieldMap) -> None:
    """Draw the edges of the core, and dashed those of the windings."""
    for role, width, style in (("core", 1.8, "solid"), ("winding", 1.2, (0, (4, 2)))):
        edges = 1e3 * fields.outlines.get(role, np.empty((0, 2, 2)))
        ax.add_collection(
            LineCollection(list(edges), colors="black", linewidths=width, linestyles=[style])
        )


def _name_windings(ax: Axes, regions: tuple[Region, ...], window: Window) -> None:
    """Write each winding's name once, into what the window shows of it, if it has room."""
    scale = 1e3 * points_per_unit(ax)
    for name, (r, z) in label_places(regions, window).items():
        radii = [r for region in regions if region.winding == name for r, _ in region.polygon]
        if scale * (min(max(radii), window[1]) - max(min(radii), window[0])) < NAME_HEIGHT:
            continue
        ax.text(
            1e3 * r,
            1e3 * z,
            f"winding {name}",
            ha="center",
            va="center",
            rotation=90,
            fontsize=9,
            bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.85, "pad": 1.5},
        )


def label_places(regions: tuple[Region, ...], window: Window) -> dict[str, Point]:
    """Return where in m to name each winding in a window: one above the other, not side by side."""
    seen: dict[str, tuple[NDArray[np.float64], NDArray[np.float64]]] = {}
    for name in dict.fromkeys(region.winding for region in regions if region.role == "winding"):
        corners = np.vstack([region.polygon for region in regions if region.winding == name])
        low = np.maximum(corners.min(axis=0), window[::2])
        high = np.minimum(corners.max(axis=0), window[1::2])
        if np.all(low < high):
            seen[name] = low, high
    shares = (np.arange(len(seen)) + 0.5) / max(1, len(seen))
    return {
        name: (float(low[0] + high[0]) / 2, float(low[1] + share * (high[1] - low[1])))
        for share, (name, (low, high)) in zip(shares, seen.items(), strict=True)
    }


def _regions(result: Result) -> tuple[Region, ...]:
    return whole_section(result.design).regions
