"""What a fit changes in a design: the length of its gap and the permeability of its core."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from femag.design import Design
from femag.errors import InputError
from femag.geometry import Gap
from femag.materials import with_permeability

LARGEST_FACTOR = {"gap": 20.0, "permeability": 10.0}
"""Largest factor on each unknown; the smallest is its inverse."""
REACH_STEPS = 12
"""Bisections of the logarithm by which the factor that just fits is found."""


@dataclass(frozen=True)
class Unknown:
    """One thing that a fit changes, as the logarithm of a factor on what the design says.

    Parameters
    ----------
    name : {"gap", "permeability"}
        What it is.
    lower, upper : float
        Bounds of the logarithm, such that the design can be built.
    """

    name: str
    lower: float
    upper: float


def altered(design: Design, name: str, factor: float) -> Design:
    """Return the design with its gap length or its permeability times a factor.

    Parameters
    ----------
    design : Design
        With a gap, if that is altered.
    name : {"gap", "permeability"}
        What to alter.
    factor : float
        Above 0.

    Raises
    ------
    InputError
        If the result is no design: the gap does not fit, or the permeability is out of range.
    """
    if name == "permeability":
        return replace(design, material=with_permeability(design.material, factor))
    gaps = list(design.gaps)
    place = fitted_gap_index(design)
    gaps[place] = replace(gaps[place], length=gaps[place].length * factor)
    return replace(design, gaps=tuple(gaps))


def fitted_gap_index(design: Design) -> int:
    """Return the place of the gap that is fitted: that in the post, or else the spacer."""
    legs = [gap.leg for gap in design.gaps]
    return legs.index("post") if "post" in legs else 0


def fitted_gap(design: Design) -> Gap | None:
    """Return the gap that is fitted, None for an ungapped core."""
    return design.gaps[fitted_gap_index(design)] if design.gaps else None


def unknown(design: Design, name: str) -> Unknown:
    """Return gap or permeability as an unknown, bounded by what can be built."""
    most = float(np.log(LARGEST_FACTOR[name]))

    def fits(logarithm: float) -> bool:
        try:
            altered(design, name, float(np.exp(logarithm)))
        except InputError:
            return False
        return True

    return Unknown(name, -_reach(lambda size: fits(-size), most), _reach(fits, most))


def _reach(fits: Callable[[float], bool], most: float) -> float:
    """Return the largest size up to `most` that fits, found by bisection from 0."""
    if fits(most):
        return most
    low, high = 0.0, most
    for _ in range(REACH_STEPS):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if fits(middle) else (low, middle)
    return low
