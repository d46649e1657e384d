"""The core that is solved: a solid of revolution, as regions and cuts.

A pot core is one; a core with a round post and straight legs has one that stands for it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, entry_key
from femag.geometry.gap_fit import check_post_faces
from femag.geometry.gaps import (
    Gap,
    GapPiece,
    gap_length,
    piece_names,
    post_pieces,
    spacer_of,
)
from femag.geometry.leg import leg_regions
from femag.geometry.section import Cut, Point, Region, rectangle

Array = NDArray[np.float64]


@dataclass(frozen=True)
class TurnedCore:
    """An ungapped core of revolution, in m.

    Parameters
    ----------
    hole_radius, post_radius : float
        Of the post.
    ring_inner_radius, ring_outer_radius : float
        Of the ring.
    plate : tuple of (radius, thickness)
        Thickness of each end plate at rising radii from the hole to the outside of the ring,
        straight in between.
    """

    hole_radius: float
    post_radius: float
    ring_inner_radius: float
    ring_outer_radius: float
    plate: tuple[Point, ...]

    def thickness_at(self, radius: float) -> float:
        """Return the thickness in m of a plate at a radius in m."""
        for (r0, t0), (r1, t1) in zip(self.plate, self.plate[1:], strict=False):
            if r0 <= radius <= r1:
                return t0 + (t1 - t0) * (radius - r0) / (r1 - r0)
        raise ValueError(f"no plate at {radius} m")

    @property
    def ring_area(self) -> float:
        """Section of the ring, m2."""
        return math.pi * (self.ring_outer_radius**2 - self.ring_inner_radius**2)

    @property
    def largest_thickness(self) -> float:
        """Thickness of a plate where it is thickest, m."""
        return max(thickness for _, thickness in self.plate)


class Core(Protocol):
    """What a core of any family has."""

    @property
    def name(self) -> str:
        """For print."""

    @property
    def family(self) -> str:
        """Family of cores."""

    @property
    def sizes(self) -> dict[str, float]:
        """Every dimension that the family has, m."""

    @property
    def description(self) -> str:
        """Family and size in words."""

    @property
    def model_note(self) -> str:
        """What the core of revolution leaves out, and what that costs, in words."""

    @property
    def turned(self) -> TurnedCore:
        """The core of revolution that is solved."""

    @property
    def window_height(self) -> float:
        """Height of the winding space of the ungapped set, m."""

    @property
    def window_radius(self) -> float:
        """Radius up to which there is room for windings, m."""

    @property
    def plate_thickness(self) -> float:
        """Thickness of each end plate, m."""

    @property
    def leg_area(self) -> float:
        """Section of the ring, or of all legs together, m2."""

    @property
    def leg_depth(self) -> float:
        """How far outside of the window half of the outer leg's section lies, m."""

    def plate_width(self, radius: Array) -> Array:
        """Return the width in m of the plate that flux crosses at radii in m."""

    def ring_gap(self, spacer: float, permeability: float = 1.0) -> float:
        """Return the gap in m of the solved core's ring for a spacer of a thickness in m."""

    def __hash__(self) -> int:
        """Equal cores have equal hashes."""


def half_window_height(core: Core, gaps: Sequence[Gap]) -> float:
    """Return half the window height of the gapped set in m: a spacer adds to it."""
    return (core.window_height + gap_length(gaps, "all")) / 2


def ring_pieces(core: Core, gaps: Sequence[Gap]) -> tuple[GapPiece, ...]:
    """Return the opening of the ring: that of the spacer, in the middle."""
    spacer = spacer_of(gaps)
    if spacer is None:
        return ()
    if spacer.magnet is not None and core.family != "pot":
        raise InputError(
            "a magnet between straight legs has no equivalent in a ring",
            key=f"{entry_key('gap', list(gaps).index(spacer))}.magnet",
            accepted="a magnet in the post, or a pot core",
        )
    half = core.ring_gap(spacer.length, spacer.filling[0]) / 2
    return (GapPiece(-half, half, *spacer.filling),)


def core_regions(core: Core, gaps: Sequence[Gap]) -> tuple[Region, ...]:
    """Return post, plates, ring, gaps and window as regions, z = 0 in the middle.

    Raises
    ------
    InputError
        If a gap does not fit.
    """
    turned, in_post = core.turned, post_pieces(gaps, core.window_height)
    check_post_faces(gaps, core.window_height, turned.hole_radius, turned.post_radius)
    half_window = half_window_height(core, gaps)
    return turned_regions(turned, half_window, in_post, ring_pieces(core, gaps))


def turned_regions(
    turned: TurnedCore,
    half_window: float,
    in_post: Sequence[GapPiece] = (),
    in_ring: Sequence[GapPiece] = (),
) -> tuple[Region, ...]:
    """Return the regions of a core of revolution with openings; `half_window` in m."""
    ring = (turned.ring_inner_radius, turned.ring_outer_radius)
    plate = [(r, half_window + thickness) for r, thickness in reversed(turned.plate)]
    upper = ((turned.hole_radius, half_window), (turned.ring_outer_radius, half_window), *plate)
    return (
        *leg_regions(turned.hole_radius, turned.post_radius, half_window, in_post, "post"),
        *leg_regions(*ring, half_window, in_ring, "ring"),
        Region("upper plate", "core", upper),
        Region("lower plate", "core", tuple((r, -z) for r, z in upper)),
        Region(
            "window",
            "air",
            rectangle(turned.post_radius, turned.ring_inner_radius, -half_window, half_window),
        ),
    )


def core_cuts(core: Core, gaps: Sequence[Gap]) -> tuple[Cut, ...]:
    """Return the cuts through the upper half whose mean flux density is reported."""
    turned, half_window = core.turned, half_window_height(core, gaps)
    post, ring = turned.post_radius, turned.ring_inner_radius
    leg = "ring" if core.family == "pot" else "legs"
    joint = max((piece.top for piece in ring_pieces(core, gaps)), default=0.0)

    def through_plate(radius: float) -> tuple[Point, Point]:
        top = half_window + turned.thickness_at(radius)
        return (radius, half_window), (radius, top)

    return (
        _cut_at_gap(turned, post_pieces(gaps, core.window_height), half_window),
        Cut("post, at the plate", (turned.hole_radius, half_window), (post, half_window)),
        Cut("plate, at the post", *through_plate(post)),
        Cut(f"plate, at the {leg}", *through_plate(ring)),
        Cut(f"{leg}, at the joint", (ring, joint), (turned.ring_outer_radius, joint)),
    )


class CutWithoutTwin(Cut):
    """A cut whose mirror image lies at nothing that deserves its name."""

    def mirrored(self) -> Cut:
        """Return the cut itself."""
        return self


def _cut_at_gap(turned: TurnedCore, pieces: Sequence[GapPiece], half_window: float) -> Cut:
    """Return the cut along the outermost face that is not at a plate, above rather than below.

    Of a shaped face the cut is as far from the gap as the face reaches: the post is whole there.
    """
    r0, r1 = turned.hole_radius, turned.post_radius
    faces = [face for piece in pieces for face in piece.reach(r0, r1)]
    face = max((face for face in faces if abs(face) < half_window), key=lambda z: (abs(z), z),
               default=0.0)  # fmt: skip
    lopsided = bool(pieces) and pieces[-1].top != -pieces[0].bottom
    kind = CutWithoutTwin if lopsided else Cut
    return kind("post, at the gap", (turned.hole_radius, face), (turned.post_radius, face))


def gap_permeabilities(core: Core, gaps: Sequence[Gap]) -> Mapping[str, float]:
    """Return the relative permeability of the region of every gap, by its name."""
    pieces = _named_pieces(core, gaps)
    return MappingProxyType({name: piece.permeability for name, (_, piece) in pieces.items()})


def gap_remanences(core: Core, gaps: Sequence[Gap]) -> Mapping[str, float]:
    """Return the remanence in T along z of the region of every gap with a magnet, by its name.

    The flux of a positive current rises in the post and falls in the ring. A ring gap that stands
    for one of another length keeps its remanence: a source of flux in parallel with its permeance.
    """
    return MappingProxyType(
        {
            name: piece.remanence if leg == "post" else -piece.remanence
            for name, (leg, piece) in _named_pieces(core, gaps).items()
            if piece.remanence
        }
    )


def _named_pieces(core: Core, gaps: Sequence[Gap]) -> dict[str, tuple[str, GapPiece]]:
    """Return the leg and the piece behind the region of every gap, by its name."""
    legs = {"post": post_pieces(gaps, core.window_height), "ring": ring_pieces(core, gaps)}
    return {
        name: (leg, piece)
        for leg, pieces in legs.items()
        for name, piece in zip(piece_names(pieces, leg), pieces, strict=True)
    }
