"""Effective core parameters, and the core cut into the sections that they are summed from.

A pot core without slots: post, two plates, ring, and at each of the four corners a piece whose
path is a quarter circle through the area centres of the sections that it joins.

References
----------
IEC 60205, "Calculation of the effective parameters of magnetic piece parts" (general rules as
published; the section formulas are cited from memory, plates and corners derived again here).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from femag.errors import InputError
from femag.geometry.turned_core import Core

NODES = 64
"""Points of the quadrature along a plate."""


@dataclass(frozen=True)
class CoreSection:
    """A piece of the magnetic path.

    Parameters
    ----------
    name : str
        Where it is in the core.
    length : float
        Path length, m.
    area : float
        Section, m2.
    """

    name: str
    length: float
    area: float


@dataclass(frozen=True)
class EffectiveParameters:
    """A core as a uniform ring that has its reluctance and its loss at equal flux.

    Parameters
    ----------
    c1 : float
        Core factor, sum of length over area, 1/m.
    c2 : float
        Sum of length over area squared, 1/m3.
    least_area : float
        Least section that all the flux crosses, m2.
    """

    c1: float
    c2: float
    least_area: float

    @property
    def length(self) -> float:
        """Effective length l_e = C1^2/C2, m."""
        return self.c1**2 / self.c2

    @property
    def area(self) -> float:
        """Effective area A_e = C1/C2, m2."""
        return self.c1 / self.c2

    @property
    def volume(self) -> float:
        """Effective volume l_e A_e, m3."""
        return self.length * self.area


def core_sections(core: Core, post_gap: float = 0.0) -> tuple[CoreSection, ...]:
    """Return the core's sections in the order of the flux, from the post round to the ring.

    Parameters
    ----------
    core : Core
        Dimensions of the ungapped set.
    post_gap : float
        What is ground away from the post, m. A spacer takes nothing from the core.

    Raises
    ------
    InputError
        If nothing of the post is left.
    """
    if not 0.0 <= post_gap < core.window_height:
        raise InputError(
            "the gap is longer than the post", key="post_gap", value=post_gap,
            accepted=f"0 to less than {core.window_height * 1e3:g} mm",
        )  # fmt: skip
    thickness, leg = core.plate_thickness, core.leg_area
    hole_radius, post_radius = _post_radii(core)
    post = np.pi * (post_radius**2 - hole_radius**2)
    halving = np.sqrt((hole_radius**2 + post_radius**2) / 2)
    at_post, at_leg = _plate_ends(core)
    inner_depth = post_radius - halving
    inner = np.pi / 8 * (2 * inner_depth + thickness), (post + at_post) / 2
    outer = np.pi / 8 * (2 * core.leg_depth + thickness), (leg + at_leg) / 2
    plate = _plate(core)
    pieces = (
        ("post", core.window_height - post_gap, post),
        ("upper inner corner", *inner),
        ("upper plate", *plate),
        ("upper outer corner", *outer),
        ("ring", core.window_height, leg),
        ("lower outer corner", *outer),
        ("lower plate", *plate),
        ("lower inner corner", *inner),
    )
    return tuple(CoreSection(name, float(length), float(area)) for name, length, area in pieces)


@cache
def effective_parameters(core: Core) -> EffectiveParameters:
    """Return the effective parameters of an ungapped core without slots."""
    sections = core_sections(core)
    length = np.array([section.length for section in sections])
    area = np.array([section.area for section in sections])
    c1, c2 = float(np.sum(length / area)), float(np.sum(length / area**2))
    return EffectiveParameters(c1, c2, _least_area(core))


def core_factor(core: Core) -> float:
    """Return the core factor of the ungapped core in 1/m: as published if known, else computed."""
    published = getattr(core, "core_factor", None)
    return effective_parameters(core).c1 if published is None else float(published)


@cache
def _plate_ends(core: Core) -> tuple[float, float]:
    """Return the section of a plate in m2 where it leaves the post and where it meets the leg."""
    ends = np.array([_post_radii(core)[1], core.window_radius])
    at_post, at_leg = core.plate_thickness * core.plate_width(ends)
    return float(at_post), float(at_leg)


def _post_radii(core: Core) -> tuple[float, float]:
    """Return the radius of the hole and of the post, m."""
    return core.sizes["hole_diameter"] / 2, core.sizes["post_diameter"] / 2


def _least_area(core: Core) -> float:
    hole_radius, post_radius = _post_radii(core)
    radius = np.linspace(post_radius, core.window_radius, NODES)
    plate = core.plate_thickness * float(core.plate_width(radius).min())
    return min(float(np.pi * (post_radius**2 - hole_radius**2)), core.leg_area, plate)


@cache
def _plate(core: Core) -> tuple[float, float]:
    """Return length and area of the uniform piece with one plate's shares in C1 and in C2.

    The section of a plate at radius r is its width times its thickness, so the shares are the
    integrals of one over it and of its square from post to leg.
    """
    node, weight = np.polynomial.legendre.leggauss(NODES)
    r0, r1 = _post_radii(core)[1], core.window_radius
    section = core.plate_thickness * core.plate_width(r0 + (r1 - r0) * (node + 1.0) / 2.0)
    weight = weight * (r1 - r0) / 2.0
    c1, c2 = float(np.sum(weight / section)), float(np.sum(weight / section**2))
    return c1**2 / c2, c1 / c2
