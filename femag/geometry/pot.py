"""Pot cores from their dimensions."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from femag.errors import InputError, number
from femag.geometry.turned_core import Array, TurnedCore

LENGTH = "a length above 0"
DIMENSIONS = (
    "outer_diameter",
    "window_diameter",
    "post_diameter",
    "hole_diameter",
    "height",
    "window_height",
)
"""Names of a pot core's dimensions."""


@dataclass(frozen=True)
class PotCore:
    """A pot core of two halves: dimensions of the assembled, ungapped set, in m.

    Parameters
    ----------
    outer_diameter, window_diameter, post_diameter : float
        Outside of the ring, inside of the ring, centre post.
    hole_diameter : float
        Hole along the axis; 0 for none.
    height : float
        Overall height of the set.
    window_height : float
        Height of the winding space of the set.
    name : str
        For print.
    """

    outer_diameter: float
    window_diameter: float
    post_diameter: float
    height: float
    window_height: float
    hole_diameter: float = 0.0
    name: str = field(default="", compare=False)

    def __post_init__(self) -> None:
        for name in DIMENSIONS:
            accepted = "a length of 0 or more" if name == "hole_diameter" else LENGTH
            value = number(getattr(self, name), f"core.dimensions.{name}", accepted)
            if not 0.0 <= value < np.inf or (value == 0.0 and accepted == LENGTH):
                raise _dimension_error("out of range", name, value, accepted)
        for smaller, larger in (
            ("hole_diameter", "post_diameter"),
            ("post_diameter", "window_diameter"),
            ("window_diameter", "outer_diameter"),
            ("window_height", "height"),
        ):
            limit = getattr(self, larger)
            if getattr(self, smaller) >= limit:
                raise _dimension_error(
                    f"must be smaller than {larger}",
                    smaller,
                    getattr(self, smaller),
                    f"less than {limit * 1e3:g} mm",
                )

    @property
    def window_radius(self) -> float:
        """Inner radius of the ring, m."""
        return self.window_diameter / 2

    @property
    def family(self) -> str:
        """Family of cores."""
        return "pot"

    @property
    def sizes(self) -> dict[str, float]:
        """Every dimension, m."""
        return {name: getattr(self, name) for name in DIMENSIONS}

    @property
    def description(self) -> str:
        """Family and size in words."""
        return f"pot core {1e3 * self.outer_diameter:g} x {1e3 * self.height:g} mm"

    @property
    def model_note(self) -> str:
        """What the core of revolution leaves out, in words."""
        return "The model is axisymmetric, without slots for the leads."

    @property
    def turned(self) -> TurnedCore:
        """The core of revolution that is solved: the pot itself, without slots."""
        hole, outside = self.hole_diameter / 2, self.outer_diameter / 2
        thickness = self.plate_thickness
        return TurnedCore(
            hole_radius=hole,
            post_radius=self.post_diameter / 2,
            ring_inner_radius=self.window_radius,
            ring_outer_radius=outside,
            plate=((hole, thickness), (outside, thickness)),
        )

    @property
    def plate_thickness(self) -> float:
        """Thickness of each end plate, m."""
        return (self.height - self.window_height) / 2

    @property
    def leg_area(self) -> float:
        """Section of the ring, m2."""
        return self.turned.ring_area

    @property
    def leg_depth(self) -> float:
        """How far outside of the window half of the ring's section lies, m."""
        halving = np.sqrt((self.window_radius**2 + (self.outer_diameter / 2) ** 2) / 2)
        return float(halving) - self.window_radius

    def plate_width(self, radius: Array) -> Array:
        """Return the width in m of the plate that flux crosses at radii in m: the circumference."""
        return 2.0 * np.pi * radius

    def ring_gap(self, spacer: float, permeability: float = 1.0) -> float:
        """Return the gap in m of the ring for a spacer of a thickness in m: the same."""
        return spacer


def _dimension_error(problem: str, name: str, value: float, accepted: str) -> InputError:
    return InputError(problem, key=f"core.dimensions.{name}", value=value, accepted=accepted)
