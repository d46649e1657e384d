"""Where the copper is heated: map beside the gap, bars of layers, and distance from the gap."""

from __future__ import annotations

from itertools import cycle
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.collections import PolyCollection
from matplotlib.ticker import FixedLocator, MaxNLocator, NullFormatter
from numpy.typing import NDArray

from femag.copper_distance import KeepOut
from femag.design import whole_section, wound_coils
from femag.geometry import Foil, Layers
from femag.quantities import LayerLoss
from femag.result import Result

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Array = NDArray[np.float64]

LOOKS = (("-", "o"), ((0, (5, 2)), "s"), ("-.", "^"), (":", "D"), ((0, (8, 2, 1, 2)), "v"),
         ((0, (1, 1)), "x"))  # fmt: skip
GREYS = ("0.0", "0.15", "0.3", "0.4", "0.5", "0.6")
PARTS = (
    ("dc", "direct current", "0.25", ""),
    ("ripple", "ripple's own current", "white", "////"),
    ("crossing", "field across the strands", "0.72", ""),
)
LEAST_WIDTH = 0.6
"""Width of the map over the height of the copper."""
MOST_NAMES = 24
"""Layers up to which each has its name on the axis."""


def copper_map(result: Result, ax: Axes) -> Axes:
    """Draw every turn in the shade of the loss that the ripple's field causes in it per length.

    Parameters
    ----------
    result : Result
        Of a design with a ripple and conductors.
    ax : Axes
        Where to draw.

    Raises
    ------
    ValueError
        If no winding has a loss of single turns.
    """
    shapes, values = _turns_with_loss(result)
    if not values:
        raise ValueError("the result holds no loss of single turns")
    for region in whole_section(result.design).regions:
        if region.role == "core":
            corners = 1e3 * np.array(region.polygon)
            ax.add_collection(PolyCollection([corners], facecolor="0.85", edgecolor="black"))
    turns = PolyCollection([1e3 * shape for shape in shapes], array=np.array(values), cmap="GnBu",
                           edgecolors="black", linewidths=0.4)  # fmt: skip
    turns.set_clim(0.0, max(values))
    ax.add_collection(turns)
    _show_beside_post(1e3 * np.vstack(shapes), 1e3 * result.design.core.turned.post_radius, ax)
    ax.set_title("loss in each turn by the field across it", fontsize=10)
    bar = ax.figure.colorbar(turns, ax=ax, shrink=0.8)
    bar.set_label("W per m of turn")
    bar.locator = MaxNLocator(6)
    bar.update_ticks()
    return ax


def _turns_with_loss(result: Result) -> tuple[list[Array], list[float]]:
    """Return the outline in m and the loss in W/m of every turn that has one."""
    shapes: list[Array] = []
    values: list[float] = []
    listed = {loss.name: loss.crossing_of_turns for loss in result.copper_loss}
    for coil in wound_coils(result.design):
        losses = listed.get(coil.winding.name)
        if losses:
            radii = np.concatenate([layers.positions[:, 0] for layers in coil.layers])
            values += (np.array(losses) / (2 * np.pi * radii)).tolist()
            shapes += [
                _outline(layers, r, z) for layers in coil.layers for r, z in layers.positions
            ]
    return shapes, values


def _show_beside_post(corners: Array, post: float, ax: Axes) -> None:
    """Set the axes to copper with corners (n, 2) and the post beside it, mm."""
    low, high = corners.min(axis=0), corners.max(axis=0)
    margin = 0.06 * (high - low).max()
    left = min(post - 2 * margin, high[0] + margin - LEAST_WIDTH * (high[1] - low[1]))
    ax.set(xlim=(max(left, 0.0), high[0] + margin), ylim=(low[1] - margin, high[1] + margin),
           xlabel="r, mm", ylabel="z, mm", aspect="equal")  # fmt: skip


def _outline(layers: Layers, r: float, z: float) -> Array:
    """Return corners (n, 2) in m of the metal of a turn about (r, z), as it is drawn."""
    conductor, place = layers.conductor, np.array([r, z])
    if isinstance(conductor, Foil):
        half = 0.5 * np.array([conductor.thickness, conductor.axial_size])
        return np.asarray(place + half * np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]]))
    radius = 0.5 * conductor.radial_size - conductor.insulation
    angle = np.linspace(0.0, 2 * np.pi, 25)[:-1]
    return np.asarray(place + radius * np.column_stack([np.cos(angle), np.sin(angle)]))


def layer_bars(result: Result, ax: Axes) -> Axes:
    """Draw the loss of every layer as a bar: direct current, ripple, and field across the strands.

    Parameters
    ----------
    result : Result
        Of a design with a ripple and conductors.
    ax : Axes
        Where to draw.

    Raises
    ------
    ValueError
        If no winding has layers with a loss.
    """
    rows = [(loss.name, layer) for loss in result.copper_loss for layer in loss.layers]
    if not rows:
        raise ValueError("the result holds no loss of layers")
    places, bottom = np.arange(len(rows)), np.zeros(len(rows))
    for part, label, colour, hatch in PARTS:
        heights = np.array([getattr(layer, part) or 0.0 for _, layer in rows])
        ax.bar(places, heights, bottom=bottom, color=colour, hatch=hatch, edgecolor="black",
               linewidth=0.8, label=label)  # fmt: skip
        bottom += heights
    missing = [i for i, (_, layer) in enumerate(rows) if layer.crossing is None]
    for place in missing:
        ax.annotate("+ ?", (place, bottom[place]), ha="center", va="bottom")
    names = [_bar_name(name, layer, rows) for name, layer in rows]
    shown = len(rows) <= MOST_NAMES
    upright = sum(map(len, names)) > 60
    ax.set_xticks(places if shown else [], names if shown else [], rotation=90 if upright else 0)
    ax.set_title("loss of the layers" + ("; ?: out of range" if missing else ""), fontsize=10)
    ax.set(xlabel="layer, from inside", ylabel="loss, W")
    ax.set_ylim(0.0, 1.25 * bottom.max())
    ax.legend(loc="upper right", frameon=False)
    return ax


def _bar_name(name: str, layer: LayerLoss, rows: list[tuple[str, LayerLoss]]) -> str:
    parts = [name] if len({other for other, _ in rows}) > 1 else []
    if len({other.section for _, other in rows}) > 1:
        parts.append(f"{layer.section}.{layer.layer}")
    else:
        parts.append(f"{layer.layer}")
    return " ".join(parts)


def keep_out_chart(found: KeepOut, ax: Axes, what: str = "winding") -> Axes:
    """Draw the squared field over its gap-free level against distance over gap length.

    Parameters
    ----------
    found : KeepOut
        What to draw.
    ax : Axes
        Where to draw.
    what : {"winding", "layer"}
        A winding that begins at the distance, or a thin layer there.
    """
    x = np.array(found.distances) / found.gap
    for curve, (line, marker), grey in zip(found.curves, cycle(LOOKS), cycle(GREYS), strict=False):
        gaps = "1 gap" if curve.pieces == 1 else f"{curve.pieces} gaps"
        label = f"{gaps}, pitch {1e3 * curve.pitch:.3g} mm"
        ax.plot(x, getattr(curve, what), linestyle=line, marker=marker, markersize=4.5,
                color=grey, label=label)  # fmt: skip
    if found.distance > 0.0:
        ax.axvline(found.distance / found.gap, color="0.6", linewidth=0.8, zorder=0)
        ax.annotate("the design's copper", (found.distance / found.gap, 1.0), rotation=90,
                    xycoords=("data", "axes fraction"), xytext=(3, -4), fontsize=8,
                    textcoords="offset points", va="top", color="0.35")  # fmt: skip
    ax.set_yscale("log")
    top = max(max(getattr(curve, what)) for curve in found.curves)
    ticks = [t for t in (1, 1.1, 1.2, 1.5, 2, 3, 5, 7, 10, 20, 50, 100) if t <= 1.05 * top]
    ax.yaxis.set_major_locator(FixedLocator(ticks))
    ax.yaxis.set_major_formatter(lambda value, _: f"{value:g}")
    ax.yaxis.set_minor_formatter(NullFormatter())
    ax.grid(axis="y", color="0.88", linewidth=0.6)
    subject = "a winding that begins at a distance" if what == "winding" else "a thin layer"
    ax.set(xlim=(0.0, None), ylim=(0.97, 1.1 * top),
           xlabel=f"distance between post and copper over the gap, {1e3 * found.gap:.4g} mm",
           ylabel="squared field over that with the gap spread evenly",
           title=f"squared field over {subject} from the post")  # fmt: skip
    ax.legend(frameon=False, fontsize=9)
    return ax
