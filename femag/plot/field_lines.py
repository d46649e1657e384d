"""The field along the two lines that a review asks about: the post's face and the inner layer."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from femag.design import whole_section
from femag.field.bounds import FieldSolution
from femag.geometry.gaps import GapPiece, post_pieces
from femag.plot.flux_map import solution_to_draw
from femag.quantities import gap_openings, point_fields
from femag.result import Result

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Array = NDArray[np.float64]

SAMPLES = 400
NEAR_EDGE = 0.35
"""Share of the samples that crowd at the post's edge, where the field changes fast."""
SHORT = 1e-4
"""Share of the window that a line stops short of the ring, whose own field is another, and share of
the copper that one lies inside of it: on an edge between elements B would be of either."""
HEADROOM = 1.5
"""Height of the picture over the largest value in the middle of the gap; the edge goes beyond."""
ENDS = SAMPLES // 25
"""Samples at either end that do not count for the height of the picture: copper may reach into the
corners of the window, where the field has no limit."""
FOOT = 0.12
"""Share of the height that is left below, for the names of the bands."""


def post_face_field(result: Result, ax: Axes) -> Axes:
    """Draw the axial flux density across the post's gap against the radius, out to the ring.

    In the middle of the gap, and at its upper face, where it has no limit at a sharp edge. Of
    several gaps in the post the top one is drawn; without a gap the middle of the window.

    Parameters
    ----------
    result : Result
        With its fields.
    ax : Axes
        Where to draw.

    Raises
    ------
    ValueError
        If the result was read from a file and holds no fields.
    """
    solution, core = solution_to_draw(result), result.design.core
    piece = (GapPiece(0.0, 0.0), *post_pieces(result.design.gaps, core.window_height))[-1]
    radii = _radii(core.turned.hole_radius, core.turned.post_radius, core.window_radius)
    middle = _axial(solution, radii, piece.middle)
    if piece.length > 0.0 and piece.is_flat:
        face = _axial(solution, radii, piece.top)
        ax.plot(1e3 * radii, face, color="0.45", linewidth=1.1, linestyle=(0, (5, 2)),
                label="at the face")  # fmt: skip
    name = "middle of the gap" if piece.length > 0.0 else "middle of the window, no gap"
    ax.plot(1e3 * radii, middle, color="black", linewidth=1.6, label=name)
    ax.axhline(0.0, color="0.7", linewidth=0.6, zorder=0)
    _band(ax, 1e3 * core.turned.hole_radius, 1e3 * core.turned.post_radius, "post")
    copper = _innermost_copper(result)
    _band(ax, 1e3 * copper[0], 1e3 * copper[1], "copper")
    low, high = HEADROOM * min(middle.min(), 0.0), HEADROOM * max(middle.max(), 0.0)
    room = FOOT * (high - low)
    ax.set(xlim=(0.0, 1e3 * radii[-1]), ylim=(low - room, high + room * (high == 0.0)),
           xlabel="radius r, mm", ylabel="axial flux density, T")  # fmt: skip
    ax.legend(loc="best", frameon=False)
    return ax


def layer_field(result: Result, ax: Axes) -> Axes:
    """Draw the flux density along the inner face of the innermost winding against z.

    Its size and both parts: B_r crosses the layer, B_z runs along it. Bands show the gaps.

    Parameters
    ----------
    result : Result
        With its fields.
    ax : Axes
        Where to draw.

    Raises
    ------
    ValueError
        If the result was read from a file and holds no fields.
    """
    solution = solution_to_draw(result)
    inner, outer, bottom, top = _innermost_copper(result)
    z = np.linspace(bottom, top, SAMPLES)
    radius = np.full_like(z, inner + SHORT * (outer - inner))
    b = 1e3 * point_fields(solution, np.stack([radius, z])).flux_density
    for values, colour, style, label in (
        (np.hypot(*b), "black", "-", "size"),
        (b[0], "0.35", (0, (5, 2)), "radial part"),
        (b[1], "0.35", (0, (1, 1.4)), "axial part"),
    ):
        ax.plot(1e3 * z, values, color=colour, linestyle=style, linewidth=1.5, label=label)
    for place, (_, low, high) in enumerate(gap_openings(result.design)):
        ax.axvspan(1e3 * low, 1e3 * high, color="0.88", linewidth=0.0, zorder=0,
                   label="gap" if place == 0 else None)  # fmt: skip
    ax.axhline(0.0, color="0.7", linewidth=0.6, zorder=0)
    between = np.stack([np.hypot(*b), *b])[:, ENDS:-ENDS]
    room = FOOT * float(np.ptp(between))
    ax.set_ylim(float(between.min()) - room, float(between.max()) + room)
    ax.set(xlim=(1e3 * bottom, 1e3 * top), xlabel="height z, mm",
           ylabel=f"flux density at r = {1e3 * inner:.4g} mm, mT")  # fmt: skip
    ax.legend(loc="best", frameon=False)
    return ax


def _radii(hole: float, post: float, window: float) -> Array:
    """Return radii in m from the hole to the ring, crowded at the post's edge."""
    even = np.linspace(hole, window - SHORT * (window - post), SAMPLES)
    half = int(NEAR_EDGE * SAMPLES / 2)
    inside = post - (post - hole) * np.geomspace(1e-4, 0.3, half)
    outside = post + (window - post) * np.geomspace(1e-4, 0.3, half)
    return np.unique(np.concatenate([even, inside, outside]))


def _axial(solution: FieldSolution, radii: Array, z: float) -> Array:
    """Return B_z in T at radii on one height, both in m."""
    points = np.stack([radii, np.full_like(radii, z)])
    return np.asarray(point_fields(solution, points).flux_density[1])


def _innermost_copper(result: Result) -> tuple[float, float, float, float]:
    """Return inner and outer radius, bottom and top in m of the winding nearest to the axis."""
    parts = [r for r in whole_section(result.design).regions if r.role == "winding"]
    inner = min(parts, key=lambda part: min(r for r, _ in part.polygon)).winding
    corners = np.vstack([part.polygon for part in parts if part.winding == inner])
    (r0, z0), (r1, z1) = corners.min(axis=0), corners.max(axis=0)
    return float(r0), float(r1), float(z0), float(z1)


def _band(ax: Axes, left: float, right: float, name: str) -> None:
    """Shade a span of the abscissa and name it at the foot."""
    ax.axvspan(left, right, color="0.93", linewidth=0.0, zorder=0)
    ax.text((left + right) / 2, 0.02, name, ha="center", va="bottom", fontsize=8, color="0.3",
            transform=ax.get_xaxis_transform())  # fmt: skip
