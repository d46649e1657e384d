"""Flux lines over the flux density: the whole section, and the region of the gap."""

from __future__ import annotations

from typing import TYPE_CHECKING

import matplotlib as mpl
import numpy as np
from matplotlib.collections import LineCollection
from matplotlib.colors import Colormap, ListedColormap
from matplotlib.ticker import MaxNLocator
from matplotlib.tri import Triangulation

from femag.design import whole_section
from femag.geometry import Region
from femag.geometry.gaps import GapPiece, post_pieces
from femag.quantities import FieldMap, field_map, typical_peak
from femag.result import Result

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Window = tuple[float, float, float, float]

SCALE_SHARE = 0.98
"""Share of the core's volume that the colour scale covers; corners are sharper than any scale."""


def flux_map(result: Result, ax: Axes, lines: int = 18) -> Axes:
    """Draw flux lines over |B| in the whole section.

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
    core = result.design.core
    top = max(z for region in _regions(result) for _, z in region.polygon)
    margin = 0.12 * core.outer_radius
    window = (0.0, core.outer_radius + margin, -top - margin, top + margin)
    return _drawn_map(result, ax, window, lines)


def gap_map(result: Result, ax: Axes, lines: int = 40) -> Axes:
    """Draw flux lines over |B| around the outer edge of the post's gap, with the copper beside it.

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
    core = result.design.core
    gap = (GapPiece(0.0, 0.0), *post_pieces(result.design.gaps, core.window_height))[-1]
    copper = min(
        r for region in _regions(result) if region.role == "winding" for r, _ in region.polygon
    )
    room = core.window_radius - core.post_radius
    beside = 2.0 * (copper - core.post_radius)
    reach = min(max(2.5 * gap.length, beside, 0.15 * core.post_radius), room)
    left, right = max(core.post_radius - reach, 0.0), core.post_radius + reach
    window = (left, right, gap.middle - reach, gap.middle + reach)
    return _drawn_map(result, ax, window, lines)


def _drawn_map(result: Result, ax: Axes, window: Window, lines: int) -> Axes:
    if result.solution is None:
        raise ValueError("the result holds no fields: solve the design again to draw it")
    fields = field_map(result.solution)
    mesh = Triangulation(1e3 * fields.r, 1e3 * fields.z, fields.triangles)
    colour = ax.tripcolor(
        mesh,
        fields.flux_density,
        shading="gouraud",
        cmap=_light_to_dark(),
        vmin=0.0,
        vmax=typical_peak(fields, SCALE_SHARE),
        rasterized=True,
    )
    levels = np.linspace(fields.flux.min(), fields.flux.max(), lines + 2)[1:-1]
    ax.tricontour(mesh, fields.flux, levels=levels, colors="black", linewidths=0.5)
    _draw_outlines(ax, fields)
    _name_windings(ax, _regions(result), window)
    r0, r1, z0, z1 = (1e3 * edge for edge in window)
    ax.set(xlim=(r0, r1), ylim=(z0, z1), xlabel="r, mm", ylabel="z, mm", aspect="equal")
    ax.set_title(f"flux lines and flux density at {result.current:g} A", fontsize=10)
    bar = ax.figure.colorbar(colour, ax=ax, extend="max", shrink=0.8)
    bar.set_label(f"|B|, T; {SCALE_SHARE:.0%} of the core lies on this scale")
    bar.locator = MaxNLocator(6)
    bar.update_ticks()
    return ax


def _light_to_dark() -> Colormap:
    """Return a map whose luminance falls with the value, light enough for black lines."""
    return ListedColormap(mpl.colormaps["GnBu"](np.linspace(0.0, 0.82, 256)))


def _draw_outlines(ax: Axes, fields: FieldMap) -> None:
    for role, width, style in (("core", 1.8, "solid"), ("winding", 1.2, (0, (4, 2)))):
        edges = 1e3 * fields.outlines.get(role, np.empty((0, 2, 2)))
        ax.add_collection(
            LineCollection(list(edges), colors="black", linewidths=width, linestyles=[style])
        )


def _name_windings(ax: Axes, regions: tuple[Region, ...], window: Window) -> None:
    """Write each winding's name into the middle of what the window shows of it."""
    for region in regions:
        if region.role != "winding":
            continue
        corners = np.asarray(region.polygon)
        low = np.maximum(corners.min(axis=0), window[::2])
        high = np.minimum(corners.max(axis=0), window[1::2])
        if np.all(low < high):
            r, z = 5e2 * (low + high)
            ax.text(
                r,
                z,
                region.name,
                ha="center",
                va="center",
                rotation=90,
                fontsize=9,
                bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.85, "pad": 1.5},
            )


def _regions(result: Result) -> tuple[Region, ...]:
    return whole_section(result.design).regions
