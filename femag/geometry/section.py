"""The meridional section as a value: named polygons in r, z, walls of the domain, and cuts.

Polygons nest: each lies inside its `parent` and may touch, but not overlap, its siblings.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Point = tuple[float, float]
Polygon = tuple[Point, ...]
Role = Literal["core", "air", "winding"]
WallKind = Literal["far", "normal", "tangential"]

SURROUNDINGS = "surroundings"
ANGLE_SLACK = 1e-6


@dataclass(frozen=True)
class Region:
    """One named polygon.

    Parameters
    ----------
    name : str
        Unique in its section.
    role : {"core", "air", "winding"}
        What fills it.
    polygon : tuple of points
        Corners (r, z) in m, in order, r >= 0, without repeating the first.
    parent : str
        Region that it lies in; the surroundings by default.
    winding : str
        Name of the winding that it is a part of; empty where it is not one of a design's.
    turns : int
        Turns of that winding in it.
    """

    name: str
    role: Role
    polygon: Polygon
    parent: str = SURROUNDINGS
    winding: str = ""
    turns: int = 0


@dataclass(frozen=True)
class Wall:
    """A straight piece of the domain's boundary.

    Parameters
    ----------
    kind : {"far", "normal", "tangential"}
        ``far`` truncates open space (both discrete fields extend by zero beyond it);
        ``normal`` is crossed at right angles by B (mirror plane, face of ideal iron: H_t = 0);
        ``tangential`` is not crossed by B (A = 0, so no net flux passes inside of it either).
    start, end : point
        Ends (r, z) in m.
    """

    kind: WallKind
    start: Point
    end: Point


@dataclass(frozen=True)
class Cut:
    """A straight cut through the core, whose mean flux density is reported.

    Parameters
    ----------
    name : str
        What the reader sees.
    start, end : point
        Ends (r, z) in m; the surface is the cut turned about the axis.
    """

    name: str
    start: Point
    end: Point

    @property
    def area(self) -> float:
        """Area of the surface of revolution, m2."""
        (r0, z0), (r1, z1) = self.start, self.end
        return float(np.pi * (r0 + r1) * np.hypot(r1 - r0, z1 - z0))

    def mirrored(self) -> Cut:
        """Return the cut's image below the plane z = 0."""
        (r0, z0), (r1, z1) = self.start, self.end
        return replace(self, start=(r0, -z0), end=(r1, -z1))


@dataclass(frozen=True)
class Section:
    """Everything geometric that the field solver needs.

    Parameters
    ----------
    domain : polygon
        Outline of the meshed part, m.
    regions : tuple of Region
        Named parts; what they leave free is the surroundings (air).
    walls : tuple of Wall
        Cover the outline except for the axis r = 0.
    copies : int
        How often the domain stands in the device: 2 for the half above a mirror plane, else 1.
    """

    domain: Polygon
    regions: tuple[Region, ...]
    walls: tuple[Wall, ...]
    copies: int = 1

    def __repr__(self) -> str:
        lines = [f"Section, {self.copies} x, areas in mm2:"]
        lines += [f"  {name:<20} {area * 1e6:12.4f}" for name, area in region_areas(self).items()]
        return "\n".join(lines)


def rectangle(r0: float, r1: float, z0: float, z1: float) -> Polygon:
    """Return the corners of an axis-parallel rectangle, counterclockwise."""
    return ((r0, z0), (r1, z0), (r1, z1), (r0, z1))


def polygon_area(polygon: Polygon | Array) -> float:
    """Return the area of a simple polygon, corners (n, 2) in m, in m2 (positive)."""
    r, z = np.asarray(polygon).T
    return float(abs(np.dot(r, np.roll(z, -1)) - np.dot(z, np.roll(r, -1))) / 2)


def region_areas(section: Section) -> dict[str, float]:
    """Return the visible area of every region in m2: its polygon less those that lie in it."""
    own = {SURROUNDINGS: polygon_area(section.domain)}
    own |= {region.name: polygon_area(region.polygon) for region in section.regions}
    visible = dict(own)
    for region in section.regions:
        visible[region.parent] -= own[region.name]
    return visible


def singular_corners(section: Section) -> Array:
    """Return the corners (n, 2) in m where the field is singular.

    These are the corners of the core's outline, and those of the domain that point inwards. Across
    the axis and a wall where H_t = 0 the core goes on as its mirror image, so that an edge that
    meets them at right angles has no corner there.
    """
    outline = np.asarray(section.domain)
    inward = outline[_interior_angles(outline) > np.pi + ANGLE_SLACK]
    cores = [np.asarray(r.polygon) for r in section.regions if r.role == "core"]
    if not cores:
        return inward
    corners = np.round(np.vstack(cores), 12)
    points, place = np.unique(corners, axis=0, return_inverse=True)
    angles = np.concatenate([_interior_angles(polygon) for polygon in cores])
    filled = np.bincount(place.ravel(), weights=angles)
    normal = [wall for wall in section.walls if wall.kind == "normal"]
    mirrored = [point[0] == 0.0 or any(_is_on(point, wall) for wall in normal) for point in points]
    whole = np.where(mirrored, np.pi, 2 * np.pi)
    turns = (np.abs(filled - whole / 2) > ANGLE_SLACK) & (filled < whole - ANGLE_SLACK)
    return np.vstack([inward, points[turns]])


def _interior_angles(polygon: Array) -> Array:
    """Return the interior angle at each corner of a simple polygon, (n,)."""
    r, z = (np.concatenate([polygon, polygon[:1]]) - polygon[0]).T
    along_r, along_z = np.diff(r), np.diff(z)
    before_r, before_z = along_r[np.arange(len(polygon)) - 1], along_z[np.arange(len(polygon)) - 1]
    turn = np.arctan2(
        before_r * along_z - before_z * along_r, before_r * along_r + before_z * along_z
    )
    counterclockwise = np.dot(r[:-1], z[1:]) > np.dot(z[:-1], r[1:])
    return np.asarray(np.pi - turn if counterclockwise else np.pi + turn)


def _is_on(point: Array, wall: Wall) -> bool:
    start, end = np.asarray(wall.start), np.asarray(wall.end)
    detour = np.hypot(*(point - start)) + np.hypot(*(point - end)) - np.hypot(*(end - start))
    return bool(detour < 1e-9 * np.hypot(*(end - start)))


def parts_extent(section: Section) -> float:
    """Return the largest distance in m of a part from the origin; of the outline without parts."""
    polygons = [region.polygon for region in section.regions] or [section.domain]
    return float(np.hypot(*np.vstack(polygons).T).max())


def scaled_section(section: Section, factor: float) -> Section:
    """Return the section with all lengths multiplied."""

    def scaled(points: Polygon) -> Polygon:
        return tuple((factor * r, factor * z) for r, z in points)

    return Section(
        domain=scaled(section.domain),
        regions=tuple(replace(r, polygon=scaled(r.polygon)) for r in section.regions),
        walls=tuple(Wall(wall.kind, *scaled((wall.start, wall.end))) for wall in section.walls),
        copies=section.copies,
    )


def open_section(regions: tuple[Region, ...], radius: float) -> Section:
    """Return `regions` in open space, truncated by a cylinder of half height `radius` (m)."""
    low, high = (0.0, -radius), (0.0, radius)
    corner_low, corner_high = (radius, -radius), (radius, radius)
    return Section(
        domain=(low, corner_low, corner_high, high),
        regions=regions,
        walls=(
            Wall("far", low, corner_low),
            Wall("far", corner_low, corner_high),
            Wall("far", corner_high, high),
        ),
    )


def is_mirror_symmetric(section: Section) -> bool:
    """Return whether z -> -z maps the section onto itself, each winding onto itself.

    A part of a winding may be mapped onto another part with as many turns.
    """

    def key(region: Region, sign: float) -> tuple[str, int, frozenset[Point]]:
        corners = frozenset((_rounded(r), _rounded(sign * z)) for r, z in region.polygon)
        in_winding = region.winding or region.name
        return in_winding if region.role == "winding" else region.role, region.turns, corners

    up, down = (Counter(key(part, sign) for part in section.regions) for sign in (1.0, -1.0))
    return up == down


def upper_half(section: Section) -> Section:
    """Return the part above z = 0 of a symmetric section, with the mirror plane as a wall."""
    halves = (
        replace(region, polygon=clipped_above_axis_plane(region.polygon))
        for region in section.regions
    )
    radius = max(r for r, _ in section.domain)
    walls = [
        replace(
            wall,
            start=(wall.start[0], max(wall.start[1], 0.0)),
            end=(wall.end[0], max(wall.end[1], 0.0)),
        )
        for wall in section.walls
        if max(wall.start[1], wall.end[1]) > 0.0
    ]
    return Section(
        domain=clipped_above_axis_plane(section.domain),
        regions=tuple(region for region in halves if len(region.polygon) > 2),
        walls=(*walls, Wall("normal", (0.0, 0.0), (radius, 0.0))),
        copies=2 * section.copies,
    )


def clipped_above_axis_plane(polygon: Polygon) -> Polygon:
    """Return the part of a polygon with z >= 0 (Sutherland and Hodgman's half-plane clip)."""
    kept: list[Point] = []
    for (r0, z0), (r1, z1) in zip(polygon, polygon[1:] + polygon[:1], strict=True):
        if z0 >= 0.0:
            kept.append((r0, z0))
        if z0 * z1 < 0.0:
            kept.append((r0 + (r1 - r0) * z0 / (z0 - z1), 0.0))
    above = any(z > 0.0 for _, z in kept)
    return tuple(kept) if above else ()


def _rounded(value: float) -> float:
    return round(value, 12) + 0.0
