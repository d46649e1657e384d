"""How near the copper comes to the edge of a gap."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from femag.design import Design, wound_coils
from femag.geometry import Coil, Foil, Layers
from femag.geometry.gaps import post_pieces, spacer_pieces

Opening = tuple[float, float, float]
"""Radius at which a gap opens into the window, and its lower and upper edge there, m."""


DECIMALS = 12
"""Of distances in m: what is less comes from rounding where copper touches."""


@dataclass(frozen=True)
class CopperClearance:
    """The winding that comes nearest to a gap.

    Parameters
    ----------
    name : str
        The winding.
    distance : float
        From its metal to the opening of the gap in the window's wall, m; without a conductor from
        its block.
    gap : float
        Length of that opening, m.
    """

    name: str
    distance: float
    gap: float


def copper_clearance(design: Design) -> CopperClearance | None:
    """Return the winding that comes nearest to the opening of a gap; None without gaps."""
    openings = gap_openings(design)
    found = [
        CopperClearance(
            coil.winding.name, round(_distance(coil, opening), DECIMALS), opening[2] - opening[1]
        )
        for coil in wound_coils(design)
        for opening in openings
    ]
    return min(found, key=lambda one: one.distance, default=None)


def gap_openings(design: Design) -> tuple[Opening, ...]:
    """Return where gaps open into the window: at the post, and for a spacer at the legs too."""
    core, gaps = design.core, design.gaps
    post = (core.turned.hole_radius, core.turned.post_radius)
    in_post = []
    for piece in post_pieces(gaps, core.window_height):
        lower, upper = piece.faces(*post)
        in_post.append((post[1], lower[-1][1], upper[-1][1]))
    legs = [(core.window_radius, piece.bottom, piece.top) for piece in spacer_pieces(gaps)]
    return (*in_post, *legs)


def _distance(coil: Coil, opening: Opening) -> float:
    if coil.layers:
        return min(_distance_of_turns(layers, opening) for layers in coil.layers)
    radius, low, high = opening
    distances = [
        np.hypot(
            max(section.block.inner_radius - radius, radius - section.block.outer_radius, 0.0),
            max(section.block.bottom - high, low - section.block.top, 0.0),
        )
        for section in coil.sections
    ]
    return float(min(distances))


def _distance_of_turns(layers: Layers, opening: Opening) -> float:
    """Return the least distance in m of the metal of turns from an opening."""
    radius, low, high = opening
    r, z = layers.positions.T
    across = np.abs(r - radius)
    along = np.maximum(np.maximum(low - z, z - high), 0.0)
    conductor = layers.conductor
    half = [0.5 * size - conductor.insulation
            for size in (conductor.radial_size, conductor.axial_size)]  # fmt: skip
    if isinstance(conductor, Foil):
        across = np.maximum(across - half[0], 0.0)
        return float(np.hypot(across, np.maximum(along - half[1], 0.0)).min())
    return float(np.hypot(across, along).min() - half[0])
