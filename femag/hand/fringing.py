"""Fringing formulas: how much more permeance a gap has than its block of air.

Every formula takes the shape of one gap and returns its fringing factor F, the permeance of the
gap over mu0 A / l of the block between the faces. The edges that fringe are those that face a
window or open space: the outer edge of a post, both edges of a ring. A hole along the axis takes
its area from the block; only the round edge form counts the flux that fringes into it.

Symbols: l gap length, D post diameter, A section, G window height, h = G/2.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from femag.errors import InputError
from femag.units import MU_0


@dataclass(frozen=True)
class GapShape:
    """A gap between two equal faces.

    Parameters
    ----------
    length : float
        Gap length, m.
    outer_radius, inner_radius : float
        Of the faces, m; the inner one is the hole's for a post (0 without), else the ring's.
    half_height : float
        Distance from the middle of the gap to the plates, m.
    leg : {"post", "ring"}
        Which edges fringe: the outer one of a post, both of a ring.
    """

    length: float
    outer_radius: float
    inner_radius: float
    half_height: float
    leg: Literal["post", "ring"] = "post"

    def __post_init__(self) -> None:
        ordered = 0.0 <= self.inner_radius < self.outer_radius < np.inf
        if not ordered or not 0.0 < self.length < 2 * self.half_height < np.inf:
            raise InputError(
                "not a gap between two faces",
                key="gap",
                value=self,
                accepted="0 <= inner radius < outer radius, 0 < length < window height",
            )

    @property
    def area(self) -> float:
        """Section A of the block, m2."""
        return float(np.pi * (self.outer_radius**2 - self.inner_radius**2))

    @property
    def window_height(self) -> float:
        """Window height G, m."""
        return 2 * self.half_height

    @property
    def width(self) -> float:
        """Distance between opposite fringing edges, m: diameter of a post, thickness of a ring."""
        return (
            2 * self.outer_radius if self.leg == "post" else self.outer_radius - self.inner_radius
        )

    @property
    def edges(self) -> tuple[tuple[float, int], ...]:
        """Radius of every fringing edge in m, and +1 where the air lies outside it, else -1."""
        outer = (self.outer_radius, 1)
        return (outer,) if self.leg == "post" else (outer, (self.inner_radius, -1))

    @property
    def hole_diameter(self) -> float:
        """Diameter of the post's hole, m; 0 for a ring."""
        return 2 * self.inner_radius if self.leg == "post" else 0.0

    @property
    def perimeter(self) -> float:
        """Length of all fringing edges, m."""
        return float(2 * np.pi * sum(radius for radius, _ in self.edges))

    def margin_area(self, reach: float) -> float:
        """Return the area in m2 that is gained when every fringing edge moves out by `reach`."""
        moved = (max(radius + side * reach, 0.0) for radius, side in self.edges)
        pairs = zip(self.edges, moved, strict=True)
        return float(np.pi * sum(side * (new**2 - old**2) for (old, side), new in pairs))


def no_fringing(gap: GapShape) -> float:
    """Return 1: the block alone, mu0 A / l."""
    return 1.0


def added_gap(gap: GapShape) -> float:
    """Return F = (D + l)^2 / D^2, the gap length added to the diameter of a solid post.

    A hole keeps its size. A ring gains half a gap length at both edges.

    References
    ----------
    Textbook rule (from memory).
    """
    return 1.0 + gap.margin_area(gap.length / 2) / gap.area


def side_path_ratio(gap: GapShape, reach: float = 1.0, path: float = 2.0) -> float:
    """Return F = 1 + 4 u l (D + u l) / (v D^2) of a solid post.

    A tube that reaches u gap lengths beyond the edge and is v gap lengths long lies in parallel
    with the block; with a hole, and for a ring, its area is taken with the real edges.

    Parameters
    ----------
    gap : GapShape
        The gap.
    reach, path : float
        The ratios u and v; 1 and 2 are typical.

    References
    ----------
    M. K. Kazimierczuk, High-Frequency Magnetic Components (from memory).
    """
    return 1.0 + gap.margin_area(reach * gap.length) / (path * gap.area)


def logarithm_of_height(gap: GapShape) -> float:
    """Return F = 1 + (l / sqrt A) ln(2 G / l), for a gap in the post.

    A is the real section, without the hole.

    References
    ----------
    W. T. McLyman, Transformer and Inductor Design Handbook (from memory).
    """
    return float(1.0 + gap.length / np.sqrt(gap.area) * np.log(2 * gap.window_height / gap.length))


def probable_flux_paths(gap: GapShape) -> float:
    """Return F of a half cylinder and a half annulus along every edge, parallel to the block.

    Their permeances are 0.26 mu0 w and (mu0 w / pi) ln(1 + 2 t / l), with w the circumference at
    the mean radius of each piece. The annulus ends where it meets the plates, t = h - l/2. The
    mean radius lies half the mean reach of the piece beyond the edge, l/4 and (l + t)/4; this
    reading and the choice of t are ours.

    References
    ----------
    H. C. Roters, Electromagnetic Devices, Wiley 1941, chapter 5 (from memory).
    """
    thickness = gap.half_height - gap.length / 2
    annulus = np.log1p(2 * thickness / gap.length) / np.pi
    permeance = 0.0
    for radius, side in gap.edges:
        cylinder_edge = max(radius + side * gap.length / 4, 0.0)
        annulus_edge = max(radius + side * (gap.length + thickness) / 4, 0.0)
        permeance += 2 * np.pi * (0.26 * cylinder_edge + annulus * annulus_edge)
    return float(1.0 + permeance * gap.length / gap.area)


def block_permeance(width: float, distance: float, height: float) -> float:
    r"""Return the permeance per length of a long block over its mirror image, H/m.

    .. math:: \mu_0 \left[\frac{w}{2 l} + \frac{2}{\pi}\left(1 + \ln\frac{\pi h}{4 l}\right)\right]

    Parameters
    ----------
    width : float
        Block width w, m; both of its edges fringe.
    distance : float
        From the block to the mirror plane, l (half the gap), m.
    height : float
        From the mirror plane to where the block's sides end, h, m.

    References
    ----------
    A. Balakrishnan, W. T. Joines and T. G. Wilson, "Air-gap reluctance and inductance
    calculations for magnetic circuits using a Schwarz-Christoffel transformation", IEEE Trans.
    Power Electron. 12 (1997) 654 (from memory; constant derived again for this project).
    """
    edges = 2 / np.pi * (1.0 + np.log(np.pi * height / (4 * distance)))
    return float(MU_0 * (width / (2 * distance) + edges))


def block_squared(gap: GapShape) -> float:
    """Return F = 1 / sigma^2, sigma the reluctance ratio of the long block as wide as the post.

    A hole leaves what a solid post gains as it is. A ring is a long block itself and gets
    1 / sigma.

    References
    ----------
    J. Muehlethaler, J. W. Kolar and A. Ecklebe, "A novel approach for 3D air gap reluctance
    calculations", ICPE 2011 (from memory).
    """
    ratio = block_permeance(gap.width, gap.length / 2, gap.half_height) / (
        MU_0 * gap.width / gap.length
    )
    if gap.leg == "ring":
        return ratio
    return float(1.0 + (ratio**2 - 1.0) * np.pi * gap.outer_radius**2 / gap.area)


HOLE_REACH = 0.51348
"""exp(C), C = int_0^1 f dx + int_1^inf (f - 1/x) dx - gamma, f(x) = I1(x) / (x I0(x))."""


def round_edge(gap: GapShape) -> float:
    """Return F of mu0 [A / l + (p / pi) (1 + ln(pi h / (2 l)))], p the length of the edges.

    For a solid post of radius r this is mu0 [pi r^2 / l + 2 r (1 + ln(pi h / (2 l)))]: the long
    block's edge bent round, exact to first order in l/r for h much larger than l. The edge of a
    long hole of radius a is the same edge with 0.513 a for h, since the hole's opposite wall
    holds the flux back as plates do; where it would count less than nothing it counts nothing.

    References
    ----------
    Computed for this project: the Schwarz-Christoffel edge of the long block, and the
    Fourier-Bessel field of a round tube whose wall changes potential at z = 0.
    """
    edge = gap.perimeter / np.pi * _edge_flux(gap.half_height, gap.length)
    if gap.hole_diameter > 0.0:
        reach = HOLE_REACH * gap.hole_diameter / 2
        edge += gap.hole_diameter * max(_edge_flux(reach, gap.length), 0.0)
    return float(1.0 + edge * gap.length / gap.area)


def _edge_flux(height: float, length: float) -> float:
    return float(1.0 + np.log(np.pi * height / (2 * length)))


def disc_edge(gap: GapShape) -> float:
    """Return F of mu0 [A / l + r (ln(16 pi r / l) - 1)], thin discs alone in open space.

    The open-space analogue of a post gap: no window, no sides of the post. Where the bracket is
    negative, far out of range, it counts as zero.

    References
    ----------
    G. Kirchhoff, "Zur Theorie des Condensators", Monatsb. Akad. Wiss. Berlin (1877) 144 (from
    memory).
    """
    edge = max(np.log(16 * np.pi * gap.outer_radius / gap.length) - 1.0, 0.0)
    return float(1.0 + gap.outer_radius * edge * gap.length / gap.area)


@dataclass(frozen=True)
class Formula:
    """A fringing formula with what it is good for.

    Parameters
    ----------
    name : str
        Short, for tables.
    function : callable
        Fringing factor of a gap shape.
    limits : callable
        Whether a gap shape is inside the formula's limits.
    range : str
        The same in words: "leg" is the width of the leg, G the window height.
    source : str
        Citation and mark.
    ring : bool
        Whether there is a form for a ring; without one a ring gap has no fringing.
    """

    name: str
    function: Callable[[GapShape], float]
    limits: Callable[[GapShape], bool]
    range: str
    source: str
    ring: bool = True

    def factor(self, gap: GapShape) -> float:
        """Return the fringing factor, 1 for a ring without a form."""
        return self.function(gap) if self._has_form(gap) else 1.0

    def in_range(self, gap: GapShape) -> bool:
        """Return whether the formula has a form for the gap and the gap is inside its limits."""
        return self._has_form(gap) and bool(self.limits(gap))

    def _has_form(self, gap: GapShape) -> bool:
        return self.ring or gap.leg == "post"


FORMULAS = (
    Formula(
        name="no fringing",
        function=no_fringing,
        limits=lambda gap: gap.length < gap.width / 100,
        range="gap < leg/100",
        source="definition; limit: common practice, no source",
    ),
    Formula(
        name="gap added to diameter",
        function=added_gap,
        limits=lambda gap: gap.length < min(gap.width / 5, gap.half_height),
        range="gap < leg/5, gap < G/2",
        source="textbook rule (from memory); limit: common practice, no source",
    ),
    Formula(
        name="side path ratio (1, 2)",
        function=side_path_ratio,
        limits=lambda gap: gap.length < min(gap.width / 5, gap.half_height),
        range="gap < leg/5, gap < G/2",
        source="Kazimierczuk (from memory); limit: common practice, no source",
    ),
    Formula(
        name="logarithm of height",
        function=logarithm_of_height,
        limits=lambda gap: gap.length < gap.window_height,
        range="post gap < G",
        source="McLyman (from memory)",
        ring=False,
    ),
    Formula(
        name="probable flux paths",
        function=probable_flux_paths,
        limits=lambda gap: gap.length < min(gap.width / 5, gap.half_height),
        range="gap < leg/5, gap < G/2",
        source="Roters 1941 (from memory); limit: common practice, no source",
    ),
    Formula(
        name="long block, squared",
        function=block_squared,
        limits=lambda gap: (
            gap.length <= gap.window_height / 3 and gap.hole_diameter < gap.width / 10
        ),
        range="gap <= G/3, hole < leg/10",
        source="Muehlethaler, Kolar and Ecklebe 2011 (from memory), "
        "with the block of Balakrishnan, Joines and Wilson 1997 (from memory, derived again)",
    ),
    Formula(
        name="round edge",
        function=round_edge,
        limits=lambda gap: gap.length < gap.width / 10 and gap.length <= gap.window_height / 3,
        range="gap < leg/10, gap <= G/3",
        source="computed for this project, first order in gap over leg",
    ),
    Formula(
        name="disc in open space",
        function=disc_edge,
        limits=lambda gap: gap.length < gap.width / 10 and gap.width < gap.window_height,
        range="post gap < leg/10, leg < G",
        source="Kirchhoff 1877 (from memory); limits: common practice, no source",
        ring=False,
    ),
)
"""Every formula that a comparison shows, in the order of print; one more entry adds one."""
