"""Cores with a round post and straight legs, seen along the post: plate and legs as plane figures.

Idealised: sharp edges, no slots for leads or clamps, every plate as wide as the drawing's outline.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from shapely import Polygon
    from shapely.geometry.base import BaseGeometry

Array = NDArray[np.float64]
Sizes = Mapping[str, float]

ARC = 96
"""Chords in a quarter of a circle."""

CIRCLE = 3600
"""Points on a circle about the post."""

BAR_SIZES = ("length", "width")
OUTLINE_SIZES: dict[str, tuple[str, ...]] = {
    "rm": ("length", "width", "leg_opening", "waist"),
    "pq": BAR_SIZES,
    "etd": BAR_SIZES,
    "eer": BAR_SIZES,
    "ec": BAR_SIZES,
    "pm": ("length", "leg_opening", "waist"),
    "ep": ("length", "width", "front"),
}
"""Dimensions that a family's outline is drawn with, besides post and window."""


def plate_outline(family: str, sizes: Sizes) -> Polygon:
    """Return the outline of an end plate, with the post at the origin, m.

    Parameters
    ----------
    family : str
        A key of `OUTLINE_SIZES`.
    sizes : mapping of str to float
        The dimensions that it lists, m. ``length``: outside over the legs (across the post);
        ``width``: of the plate at right angles to it, for ``rm`` the side of the square that
        stands on its corner; ``leg_opening``: between the legs' tips; ``waist``: width of the
        plate between the legs; ``front``: from the middle of the post to the open side.
    """
    return _PLATES[family](sizes)


def leg_outlines(plate: Polygon, window_radius: float, opening: float = 0.0) -> tuple[Array, ...]:
    """Return the outline (n, 2) of each leg in m: the plate outside of window and opening.

    Parameters
    ----------
    plate : Polygon
        Outline of the plate.
    window_radius : float
        m.
    opening : float
        Legs begin at half of it on either side of the post, m.
    """
    import shapely

    rest = plate.difference(_disc(window_radius))
    if opening > 0.0:
        _, low, _, high = plate.bounds
        rest = rest.difference(shapely.box(-opening / 2, low, opening / 2, high))
    parts = [part for part in _parts(rest) if part.area > 1e-6 * plate.area]
    return tuple(np.asarray(part.exterior.coords)[:-1] for part in parts)


def covered_share(plate: Polygon, radius: Array) -> Array:
    """Return the share of each circle about the post, radii in m, that lies on the plate."""
    angle = 2.0 * np.pi * (np.arange(CIRCLE) + 0.5) / CIRCLE
    import shapely

    shapely.prepare(plate)
    x, y = np.outer(radius, np.cos(angle)), np.outer(radius, np.sin(angle))
    return np.asarray(shapely.contains_xy(plate, x, y).mean(axis=1))


def outline_perimeter(outline: Array) -> float:
    """Return the length in m of an outline (n, 2)."""
    return float(np.hypot(*(np.roll(outline, -1, axis=0) - outline).T).sum())


def halving_radius(outlines: tuple[Array, ...]) -> float:
    """Return the radius in m of the circle about the post that halves the legs' section."""
    import shapely
    from scipy.optimize import brentq

    legs = shapely.union_all([shapely.Polygon(outline) for outline in outlines])
    far = max(float(np.hypot(*outline.T).max()) for outline in outlines)
    near = min(float(np.hypot(*outline.T).min()) for outline in outlines)

    def excess(radius: float) -> float:
        return float(legs.intersection(_disc(radius)).area) - legs.area / 2

    found: float = brentq(excess, 0.99 * near, 1.01 * far, xtol=1e-6 * far)
    return found


def _bar(sizes: Sizes) -> Polygon:
    import shapely

    x, y = sizes["length"] / 2, sizes["width"] / 2
    return shapely.box(-x, -y, x, y)


def _square_on_its_corner(sizes: Sizes) -> Polygon:
    import shapely

    tip = sizes["width"] / np.sqrt(2.0)
    square = shapely.Polygon([(tip, 0.0), (0.0, tip), (-tip, 0.0), (0.0, -tip)])
    return _waisted(square, sizes)


def _round_plate(sizes: Sizes) -> Polygon:
    return _waisted(_disc(sizes["length"] / 2), sizes)


def _box_with_open_front(sizes: Sizes) -> Polygon:
    import shapely

    x, front = sizes["length"] / 2, sizes["front"]
    return shapely.box(-x, -front, x, sizes["width"] - front)


def _waisted(outline: BaseGeometry, sizes: Sizes) -> Polygon:
    """Return an outline cut to its length and, between the legs, to its waist."""
    import shapely

    x, opening, waist = sizes["length"] / 2, sizes["leg_opening"] / 2, sizes["waist"] / 2
    bar = shapely.box(-x, -waist, x, waist)
    ends = shapely.union_all(
        [shapely.box(-x, -x, -opening, x), shapely.box(opening, -x, x, x), bar]
    )
    cut = outline.intersection(ends)
    assert isinstance(cut, shapely.Polygon)
    return cut


_PLATES: dict[str, Callable[[Sizes], Polygon]] = {
    "rm": _square_on_its_corner,
    "pq": _bar,
    "etd": _bar,
    "eer": _bar,
    "ec": _bar,
    "pm": _round_plate,
    "ep": _box_with_open_front,
}


def _disc(radius: float) -> Polygon:
    """Return a polygon with the area of a disc about the post."""
    import shapely

    angle = np.pi / (2 * ARC)
    inscribed = radius * np.sqrt(angle / np.sin(angle))
    return shapely.Point(0.0, 0.0).buffer(float(inscribed), quad_segs=ARC)


def _parts(figure: BaseGeometry) -> list[Polygon]:
    import shapely

    return [part for part in shapely.get_parts(figure) if isinstance(part, shapely.Polygon)]
