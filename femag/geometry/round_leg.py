"""Cores with a round post and straight legs, and the core of revolution that stands for each.

The equivalent keeps post, window height and post gap, where fringing lives, exactly. What is not
round is replaced:

1. The ring's inner radius is r_p exp(2 pi / C) with C the permeance in the plane from post to
   legs, so that the flux through the window is kept; the ring has the legs' section.
2. At each radius the plate is thinned to the share of the circle that the real one covers, or to
   the width of its bars where that is less, so that it saturates where it does.
3. The field in the core follows from the material's curve at H times one factor, so that the
   ungapped core has the core factor (sum of l/A) of the data sheet.
4. A spacer opens the ring by the gap that has the permeance of the legs' gap and its surroundings.

References
----------
Our own rule, fitted to and checked against three-dimensional solutions, see
``validation/round_leg_3d``.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cache, cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, number
from femag.geometry.outlines import (
    BAR_SIZES,
    OUTLINE_SIZES,
    covered_share,
    halving_radius,
    leg_outlines,
    outline_perimeter,
    plate_outline,
)
from femag.geometry.plane_permeance import plane_permeance
from femag.geometry.section import polygon_area
from femag.geometry.turned_core import TurnedCore

if TYPE_CHECKING:
    from shapely import Polygon

    from femag.geometry.section import Point

Array = NDArray[np.float64]

LENGTH = "a length above 0"
COMMON_SIZES = ("post_diameter", "hole_diameter", "window_diameter", "height", "window_height")
LEG_REACH = 4.0 / 3.0
"""Fitted: height up to which a spacer's field fringes at the legs, over half the window height."""
CORNER_AIR = 1.75
"""Fitted: permeance of a spacer's gap at the corners of the legs, over mu0 times the gap."""
FLATNESS = 0.03
"""Deviation of a plate's straight faces from its thinned profile, over its thickness."""
SAMPLES = 80
"""Radii at which a plate's profile is computed."""


@dataclass(frozen=True)
class RoundLegCore:
    """A core with a round post and straight legs: dimensions of the assembled set, in m.

    Parameters
    ----------
    family : str
        ``rm``, ``pq``, ``etd``, ``eer``, ``ec``, ``pm`` or ``ep``.
    post_diameter, window_diameter : float
        Centre post; round face of the legs.
    height, window_height : float
        Over all, and of the winding space, of both halves together.
    length : float
        Outside over the legs; the diameter for ``pm``.
    width : float
        Of plate and legs across that; for ``rm`` the side of the square that stands on its corner.
    leg_opening, waist : float
        ``rm`` and ``pm``: between the tips of the legs; width of the plate between the legs.
    front : float
        ``ep``: from the middle of the post to the open side.
    hole_diameter : float
        Hole along the axis; 0 for none.
    core_factor : float, optional
        Sum of length over area of the ungapped core as published, 1/m; by the rules of IEC 60205
        from the dimensions when left out.
    name : str
        For print.
    """

    family: str
    post_diameter: float
    window_diameter: float
    height: float
    window_height: float
    length: float
    width: float | None = None
    leg_opening: float | None = None
    waist: float | None = None
    front: float | None = None
    hole_diameter: float = 0.0
    core_factor: float | None = None
    name: str = field(default="", compare=False)

    def __post_init__(self) -> None:
        if self.family not in OUTLINE_SIZES:
            raise InputError(
                "unknown family", key="core.family", value=self.family,
                accepted=", ".join(map(repr, OUTLINE_SIZES)),
            )  # fmt: skip
        self._check_sizes()
        self._check_order()

    @property
    def sizes(self) -> dict[str, float]:
        """Every dimension that the family has, m."""
        names = (*COMMON_SIZES, *OUTLINE_SIZES[self.family])
        return {name: getattr(self, name) for name in names}

    @property
    def description(self) -> str:
        """Family and size in words."""
        outside = (self.length, self.width or self.length, self.height)
        return f"{self.family.upper()} core {' x '.join(f'{1e3 * d:g}' for d in outside)} mm"

    @property
    def window_radius(self) -> float:
        """Radius up to which there is room for windings, m."""
        return self.window_diameter / 2

    @property
    def plate_thickness(self) -> float:
        """Thickness of each end plate, m."""
        return (self.height - self.window_height) / 2

    @cached_property
    def plate(self) -> Polygon:
        """Outline of the plates with the post at the origin, m."""
        return plate_outline(self.family, self.sizes)

    @cached_property
    def leg_outlines(self) -> tuple[Array, ...]:
        """Outline of each leg, (n, 2), m."""
        outlines = leg_outlines(self.plate, self.window_radius, self.leg_opening or 0.0)
        if not outlines:
            raise self._error("no leg stays outside of the window", "length", "a larger length")
        return outlines

    @property
    def leg_area(self) -> float:
        """Section of all legs together, m2."""
        return sum(polygon_area(outline) for outline in self.leg_outlines)

    @property
    def leg_perimeter(self) -> float:
        """Perimeter of all legs together, m."""
        return sum(outline_perimeter(outline) for outline in self.leg_outlines)

    @cached_property
    def leg_depth(self) -> float:
        """How far outside of the window half of the legs' section lies, m."""
        return halving_radius(self.leg_outlines) - self.window_radius

    def plate_width(self, radius: Array) -> Array:
        """Return the width in m of the plate that flux crosses at radii in m."""
        around = 2.0 * np.pi * radius * covered_share(self.plate, radius)
        if OUTLINE_SIZES[self.family] != BAR_SIZES:
            return around
        assert self.width is not None
        return np.minimum(around, 2.0 * self.width)

    @property
    def model_note(self) -> str:
        """What the core of revolution leaves out, and what that costs, in words."""
        return (
            "The legs are replaced by a ring that stands for them; the bounds are those of that "
            "model. Beside solutions in three dimensions of four idealised outlines (like PQ, ETD, "
            "RM, EP) its inductance was within 0.1 % with a gap in the post, within 0.6 % with a "
            "spacer and within 0.9 % without a gap. Between the legs and, with a spacer, beside "
            "them the field in the window is not that of the core; flux density in the plates is "
            "a low estimate."
        )

    @property
    def turned(self) -> TurnedCore:
        """The core of revolution that is solved instead."""
        return _turned_equivalent(self)

    def ring_gap(self, spacer: float, permeability: float = 1.0) -> float:
        """Return the gap in m of the solved core's ring for a spacer.

        Parameters
        ----------
        spacer : float
            Its thickness, m.
        permeability : float
            Its relative permeability.

        Raises
        ------
        InputError
            If the spacer is thicker than half the window.
        """
        from scipy.optimize import brentq

        turned, area, height = self.turned, self.leg_area, self.window_height / 2
        if not spacer < height:
            raise InputError(
                "the spacer is too thick for this kind of core", key="gap.length", value=spacer,
                accepted=f"less than half the window height, {height * 1e3:g} mm",
            )  # fmt: skip
        ring = 2.0 * np.pi * (turned.ring_inner_radius + turned.ring_outer_radius)

        def permeance(gap: float, perimeter: float, height: float) -> float:
            edge = (1.0 + float(np.log(np.pi * height / (2.0 * gap)))) / np.pi
            return permeability * area / gap + perimeter * edge

        wanted = permeance(spacer, self.leg_perimeter, LEG_REACH * height) + CORNER_AIR * spacer

        def excess(gap: float) -> float:
            return permeance(gap, ring, height) - wanted

        if excess(height) >= 0.0:
            raise InputError(
                "the spacer is too thick for this kind of core", key="gap.length", value=spacer,
                accepted="a thinner one; the gap of the ring that stands for the legs fills it",
            )  # fmt: skip
        found: float = brentq(excess, 0.02 * spacer, height)
        return found

    def _check_sizes(self) -> None:
        for name in ("width", "leg_opening", "waist", "front"):
            if name not in self.sizes and getattr(self, name) is not None:
                raise self._error("not a dimension of this family", name, ", ".join(self.sizes))
        for name, value in self.sizes.items():
            accepted = "a length of 0 or more" if name == "hole_diameter" else LENGTH
            if value is None:
                raise self._error("missing", name, accepted)
            size = number(value, f"core.dimensions.{name}", accepted)
            if not 0.0 <= size < np.inf or (size == 0.0 and accepted == LENGTH):
                raise self._error("out of range", name, accepted)
        if self.core_factor is not None:
            accepted = "a number above 0 with a unit, such as '0.6 1/mm'"
            if not 0.0 < number(self.core_factor, "core.core_factor", accepted) < np.inf:
                raise InputError(
                    "out of range", key="core.core_factor", value=self.core_factor,
                    accepted=accepted,
                )  # fmt: skip

    def _check_order(self) -> None:
        pairs = [
            ("hole_diameter", "post_diameter"),
            ("post_diameter", "window_diameter"),
            ("window_diameter", "length"),
            ("window_height", "height"),
            ("waist", "length"),
            ("leg_opening", "length"),
            ("front", "width"),
        ]
        for smaller, larger in pairs:
            if smaller in self.sizes and not self.sizes[smaller] < self.sizes[larger]:
                limit = f"less than {larger}, {self.sizes[larger] * 1e3:g} mm"
                raise self._error(f"must be smaller than {larger}", smaller, limit)

    def _error(self, problem: str, name: str, accepted: str) -> InputError:
        value = getattr(self, name)
        return InputError(problem, key=f"core.dimensions.{name}", value=value, accepted=accepted)


@cache
def _turned_equivalent(core: RoundLegCore) -> TurnedCore:
    post = core.post_diameter / 2
    inner = post * float(np.exp(2.0 * np.pi / plane_permeance(post, core.leg_outlines)))
    outer = float(np.sqrt(inner**2 + core.leg_area / np.pi))
    return TurnedCore(
        hole_radius=core.hole_diameter / 2,
        post_radius=post,
        ring_inner_radius=inner,
        ring_outer_radius=outer,
        plate=_plate_profile(core, inner, outer),
    )


def _plate_profile(core: RoundLegCore, inner: float, outer: float) -> tuple[Point, ...]:
    """Return radii and thicknesses of the thinned plate; beyond the window its width stays."""
    hole = core.hole_diameter / 2
    radius = np.linspace(max(hole, 1e-6 * inner), inner, SAMPLES)
    width = core.plate_width(np.minimum(radius, core.window_radius))
    thickness = core.plate_thickness * np.minimum(width / (2.0 * np.pi * radius), 1.0)
    radius[0] = hole
    corners = _corners_of_profile(radius, thickness, FLATNESS * core.plate_thickness)
    profile = [(float(radius[k]), float(thickness[k])) for k in corners]
    return (*profile, (outer, profile[-1][1]))


def _corners_of_profile(x: Array, y: Array, slack: float) -> list[int]:
    """Return the fewest points found by bisection whose straight connection stays within slack."""

    def between(first: int, last: int) -> list[int]:
        straight = y[first] + (y[last] - y[first]) * (x[first:last] - x[first]) / (
            x[last] - x[first]
        )
        worst = int(np.argmax(np.abs(y[first:last] - straight)))
        if abs(y[first + worst] - straight[worst]) <= slack:
            return [first]
        return between(first, first + worst) + between(first + worst, last)

    return [*between(0, len(x) - 1), len(x) - 1]
