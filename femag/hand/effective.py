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

import numpy as np

from femag.errors import InputError
from femag.geometry import PotCore


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


def core_sections(core: PotCore, post_gap: float = 0.0) -> tuple[CoreSection, ...]:
    """Return the core's sections in the order of the flux, from the post round to the ring.

    Parameters
    ----------
    core : PotCore
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
    post, ring = _post_area(core), _ring_area(core)
    thickness = core.plate_thickness
    inner_depth = core.post_radius - np.sqrt((core.hole_radius**2 + core.post_radius**2) / 2)
    outer_depth = np.sqrt((core.window_radius**2 + core.outer_radius**2) / 2) - core.window_radius
    inner = np.pi / 8 * (2 * inner_depth + thickness), (post + _plate_area(core)) / 2
    outer_plate = 2 * np.pi * core.window_radius * thickness
    outer = np.pi / 8 * (2 * outer_depth + thickness), (ring + outer_plate) / 2
    plate = _plate(core)
    pieces = (
        ("post", core.window_height - post_gap, post),
        ("upper inner corner", *inner),
        ("upper plate", *plate),
        ("upper outer corner", *outer),
        ("ring", core.window_height, ring),
        ("lower outer corner", *outer),
        ("lower plate", *plate),
        ("lower inner corner", *inner),
    )
    return tuple(CoreSection(name, float(length), float(area)) for name, length, area in pieces)


def effective_parameters(core: PotCore) -> EffectiveParameters:
    """Return the effective parameters of an ungapped pot core without slots."""
    sections = core_sections(core)
    length = np.array([section.length for section in sections])
    area = np.array([section.area for section in sections])
    least = min(_post_area(core), _ring_area(core), _plate_area(core))
    return EffectiveParameters(float(np.sum(length / area)), float(np.sum(length / area**2)), least)


def _post_area(core: PotCore) -> float:
    return float(np.pi * (core.post_radius**2 - core.hole_radius**2))


def _ring_area(core: PotCore) -> float:
    return float(np.pi * (core.outer_radius**2 - core.window_radius**2))


def _plate_area(core: PotCore) -> float:
    """Return the plate's least section, where it leaves the post."""
    return float(2 * np.pi * core.post_radius * core.plate_thickness)


def _plate(core: PotCore) -> tuple[float, float]:
    """Return length and area of the uniform piece with one plate's shares in C1 and in C2.

    The section of a plate at radius r is 2 pi r t, so the shares are the integrals of 1/(2 pi r t)
    and of its square from post to ring.
    """
    r0, r1, thickness = core.post_radius, core.window_radius, core.plate_thickness
    c1 = np.log(r1 / r0) / (2 * np.pi * thickness)
    c2 = (r1 - r0) / (4 * np.pi**2 * r0 * r1 * thickness**2)
    return float(c1**2 / c2), float(c1 / c2)
