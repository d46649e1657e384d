"""Permeance in the plane from a round post to the legs around it, per length along the axis.

Post and legs are equipotential solids in open air: a boundary-element solution of the Laplace
equation with a constant charge density on each of many straight panels, fine at the corners.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from femag.geometry.outlines import outline_perimeter

Array = NDArray[np.float64]

CORNER = np.radians(15.0)
"""Change of direction above which a vertex of an outline is a corner."""
PANELS = 240
"""Panels on the longest outline; the others get as many for their length, and no fewer than 24 a
side."""


def plane_permeance(post_radius: float, legs: Sequence[Array], panels: int = PANELS) -> float:
    """Return the permeance per length over mu0 between a post at the origin and all legs.

    Parameters
    ----------
    post_radius : float
        m.
    legs : sequence of array, (n, 2)
        Outline of each leg, m, without repeating the first vertex; none meets the post.
    panels : int
        Panels on the longest leg.

    Notes
    -----
    The potential is ``sum q_j int ln(1/|x - y|) dy / (2 pi) + c`` with no net charge, so that it
    needs no boundary far away. It is 1 on the post and 0 on the legs at the middle of each panel.

    References
    ----------
    M. A. Jaswon and G. T. Symm, Integral Equation Methods in Potential Theory and Elastostatics,
    Academic Press 1977, for the equations (cited from memory).
    """
    size = 2.0 * max(float(np.abs(leg).max()) for leg in legs)
    longest = max(outline_perimeter(leg) for leg in legs) / size
    angle = 2.0 * np.pi * np.arange(panels) / panels
    post = post_radius / size * np.column_stack([np.cos(angle), np.sin(angle)])
    curves = [post, *(_panelled(leg / size, panels / longest) for leg in legs)]
    start = np.vstack(curves)
    end = np.vstack([np.roll(curve, -1, axis=0) for curve in curves])
    length = np.hypot(*(end - start).T)
    potential = np.append((np.arange(len(start)) < panels).astype(float), 0.0)
    matrix = np.ones((len(start) + 1, len(start) + 1))
    matrix[:-1, :-1] = _logarithms(0.5 * (start + end), start, end) / (2.0 * np.pi)
    matrix[-1, :-1], matrix[-1, -1] = length, 0.0
    charge = np.linalg.solve(matrix, potential)[:-1]
    return float(charge[:panels] @ length[:panels])


def _panelled(outline: Array, density: float) -> Array:
    """Return points on a closed outline: panels shrink towards its corners as cosines do."""
    corners = _corners(outline)
    pieces = []
    for first, last in zip(corners, [*corners[1:], corners[0] + len(outline)], strict=True):
        side = outline[np.arange(first, last + 1) % len(outline)]
        along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(side, axis=0).T))])
        number = max(24, int(np.ceil(density * along[-1])))
        place = along[-1] * 0.5 * (1.0 - np.cos(np.pi * np.arange(number) / number))
        pieces.append(np.column_stack([np.interp(place, along, side[:, k]) for k in range(2)]))
    return np.vstack(pieces)


def _corners(outline: Array) -> list[int]:
    ahead = np.roll(outline, -1, axis=0) - outline
    behind = np.roll(ahead, 1, axis=0)
    turn = np.arctan2(
        behind[:, 0] * ahead[:, 1] - behind[:, 1] * ahead[:, 0], np.sum(behind * ahead, axis=1)
    )
    found = np.flatnonzero(np.abs(turn) > CORNER)
    return found.tolist() if len(found) else [0]


def _logarithms(points: Array, start: Array, end: Array) -> Array:
    """Return the integral of ln(1/distance) over each panel from each point, (points, panels)."""
    along = end - start
    length = np.hypot(*along.T)
    unit = along / length[:, None]
    offset = points[:, None, :] - start[None]
    x = np.sum(offset * unit, axis=2)
    height = np.abs(offset[..., 0] * unit[:, 1] - offset[..., 1] * unit[:, 0])
    behind, ahead = x, length - x
    angle = np.arctan2(behind, height) + np.arctan2(ahead, height)
    return np.asarray(
        length
        - 0.5 * _times_log_square(ahead, height)
        - 0.5 * _times_log_square(behind, height)
        - height * angle
    )


def _times_log_square(along: Array, height: Array) -> Array:
    """Return x ln(x^2 + y^2), 0 where both are."""
    square = along**2 + height**2
    return np.asarray(along * np.log(np.where(square > 0.0, square, 1.0)))
