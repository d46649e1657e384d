"""Faces of a gap that are not flat and sharp: tapered, stepped, chamfered, rounded.

A face is a line of points from the inside of the post to its rim; its depth counts from the flat
face into the post.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from femag.errors import InputError, number
from femag.geometry.section import Point, Polygon

EDGE_FACETS = 8
"""Straight pieces of a rounded edge; the cross-section of the edge keeps its area."""


@dataclass(frozen=True)
class Step:
    """A gap of another length in the middle of the post, as of a swinging choke.

    Parameters
    ----------
    diameter : float
        Inside of which the gap has this length, m.
    length : float
        Total length of the gap there, m; 0 where the post is not ground.
    """

    diameter: float
    length: float

    def __post_init__(self) -> None:
        for name, least, accepted in (
            ("diameter", "above 0", "a length above 0"),
            ("length", "0 or more", "a length of 0 or more; 0 where the post goes through"),
        ):
            value = number(getattr(self, name), f"gap.step.{name}", accepted)
            if not (0.0 <= value < math.inf and (value > 0.0 or least == "0 or more")):
                raise InputError(
                    f"the {name} of the step must be {least}", key=f"gap.step.{name}",
                    value=getattr(self, name), accepted=accepted,
                )  # fmt: skip


@dataclass(frozen=True)
class FaceShape:
    """How an opening of the post departs from a flat one with sharp rims.

    Parameters
    ----------
    taper : float
        Length at the rim less length at the axis (or the hole), m; straight in between.
    step_radius : float
        Radius inside of which the length differs, m; 0 without a step.
    step_depth : float
        Length inside of it less that outside, m.
    closed : bool
        Whether the step leaves no gap inside of its radius.
    chamfer : float
        Breadth of a cut at 45 degrees off the rim of each face, m.
    edge_radius : float
        Radius of the rim of each face, m.
    """

    taper: float = 0.0
    step_radius: float = 0.0
    step_depth: float = 0.0
    closed: bool = False
    chamfer: float = 0.0
    edge_radius: float = 0.0

    def depths(self, r0: float, r1: float, share: float) -> Polygon:
        """Return the points (r, depth) in m of a face from its inner radius to its outer one.

        Parameters
        ----------
        r0, r1 : float
            Radii of the hole and of the post, m.
        share : float
            Share of the taper or step that this face takes; a face that takes none is flat, with
            sharp edges.
        """
        steps = self.step_radius > 0.0
        if share == 0.0:
            return tuple((r, 0.0) for r in ((r0, self.step_radius, r1) if steps else (r0, r1)))
        depth, radius = share * self.step_depth, self.step_radius
        inside = [(r0, depth), (radius, depth), (radius, 0.0)] if steps else [(r0, 0.0)]
        points = [*inside, *self._rim(r1, share * self.taper, share * self.taper / (r1 - r0))]
        return tuple(
            point for point, before in zip(points, [None, *points], strict=False) if point != before
        )

    def flat_end(self, r0: float, r1: float, share: float) -> float:
        """Return the radius in m where a face ends and its chamfer or rounding begins."""
        return r1 - self._breadth(share * self.taper / (r1 - r0))

    def _breadth(self, slope: float) -> float:
        if self.edge_radius > 0.0:
            alpha = math.atan(slope)
            return self.edge_radius * (1.0 - math.sin(alpha))
        return self.chamfer

    def _rim(self, r1: float, depth: float, slope: float) -> Polygon:
        """Return the points of the rim of a face that falls by `slope` to a depth in m."""
        if self.chamfer > 0.0:
            cut = self.chamfer
            return (r1 - cut, depth - cut * slope), (r1, depth + cut * (1.0 - slope))
        if self.edge_radius > 0.0:
            return _rounded_rim(r1, depth, slope, self.edge_radius)
        return ((r1, depth),)


FLAT = FaceShape()
"""A flat face with a sharp rim."""


def _rounded_rim(r1: float, depth: float, slope: float, radius: float) -> Polygon:
    """Return the points of an arc that touches the face and the side of the post.

    The ends lie on the arc, the others so far outside of it that the area is that of the sector.
    """
    start = math.atan(slope) - math.pi / 2
    centre = (r1 - radius, depth + radius * math.tan(-start / 2))
    angles = np.linspace(start, 0.0, EDGE_FACETS + 1)
    distance = np.full(EDGE_FACETS + 1, radius * _fan_radius(-start, EDGE_FACETS))
    distance[[0, -1]] = radius
    r = centre[0] + distance * np.cos(angles)
    z = centre[1] + distance * np.sin(angles)
    r[-1] = r1
    return tuple(zip(r.tolist(), z.tolist(), strict=True))


def _fan_radius(angle: float, facets: int) -> float:
    """Return the radius of the inner corners of a fan of triangles with a unit sector's area.

    The two outer edges of the fan have length 1: (n - 2) s x^2 + 2 s x = angle, s = sin(angle/n).
    """
    s = math.sin(angle / facets)
    if facets == 2:
        return angle / (2.0 * s)
    return (math.sqrt(s * s + (facets - 2) * s * angle) - s) / ((facets - 2) * s)


def area_over_length(lower: Polygon, upper: Polygon) -> float:
    """Return the integral of area over length between two faces in m: its permeance over mu.

    Parameters
    ----------
    lower, upper : polygon
        Points (r, z) in m of the faces, from inside to outside. Where they touch there is no gap
        and nothing is counted.
    """
    radii = np.unique([r for r, _ in (*lower, *upper)])
    total = 0.0
    for r0, r1 in zip(radii[:-1].tolist(), radii[1:].tolist(), strict=True):
        ends = [_height(upper, r0, r1), _height(lower, r0, r1)]
        first, last = (high - low for high, low in zip(*ends, strict=True))
        if first > 0.0 and last > 0.0:
            total += _ring_over_length(r0, r1, first, last)
    return total


def _height(face: Polygon, r0: float, r1: float) -> Point:
    """Return the height in m of a face at both ends of an interval of radii without corners."""
    for (ra, za), (rb, zb) in pairwise(face):
        if ra <= r0 < r1 <= rb:
            slope = (zb - za) / (rb - ra)
            return za + slope * (r0 - ra), za + slope * (r1 - ra)
    raise ValueError(f"no face between {r0} and {r1} m")


def _ring_over_length(r0: float, r1: float, first: float, last: float) -> float:
    """Return the integral of 2 pi r / length over r, the length being linear in between."""
    x = (last - first) / first
    if abs(x) < 1e-5:
        mean, moment = 1.0 - x / 2, 0.5 - x / 3
    else:
        mean = math.log1p(x) / x
        moment = (1.0 - mean) / x
    return 2.0 * math.pi * (r1 - r0) / first * (r0 * mean + (r1 - r0) * moment)
