"""Pot cores from their dimensions."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType

import numpy as np

from femag.errors import InputError, number
from femag.geometry.gaps import (
    Gap,
    GapPiece,
    gap_length,
    piece_names,
    post_pieces,
    ring_pieces,
)
from femag.geometry.section import Cut, Region, rectangle

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
    def hole_radius(self) -> float:
        """Radius of the hole, m."""
        return self.hole_diameter / 2

    @property
    def post_radius(self) -> float:
        """Radius of the post, m."""
        return self.post_diameter / 2

    @property
    def window_radius(self) -> float:
        """Inner radius of the ring, m."""
        return self.window_diameter / 2

    @property
    def outer_radius(self) -> float:
        """Outer radius of the ring, m."""
        return self.outer_diameter / 2

    @property
    def plate_thickness(self) -> float:
        """Thickness of each end plate, m."""
        return (self.height - self.window_height) / 2


def half_window_height(core: PotCore, gaps: Sequence[Gap]) -> float:
    """Return half the window height of the gapped set in m: a spacer adds to it."""
    return (core.window_height + gap_length(gaps, "all")) / 2


def pot_regions(core: PotCore, gaps: Sequence[Gap]) -> tuple[Region, ...]:
    """Return post, plates, ring, gaps and window as regions, z = 0 in the middle.

    A leg with one opening has an upper and a lower part, unless the opening lies at a plate;
    the parts and openings of one with several are numbered from below.

    Raises
    ------
    InputError
        If a gap does not fit.
    """
    half_window = half_window_height(core, gaps)
    half_height = half_window + core.plate_thickness
    in_post, in_ring = post_pieces(gaps, core.window_height), ring_pieces(gaps)
    return (
        *_leg(core.hole_radius, core.post_radius, half_window, in_post, "post"),
        *_leg(core.window_radius, core.outer_radius, half_window, in_ring, "ring"),
        Region(
            "upper plate",
            "core",
            rectangle(core.hole_radius, core.outer_radius, half_window, half_height),
        ),
        Region(
            "lower plate",
            "core",
            rectangle(core.hole_radius, core.outer_radius, -half_height, -half_window),
        ),
        Region(
            "window",
            "air",
            rectangle(core.post_radius, core.window_radius, -half_window, half_window),
        ),
    )


def pot_cuts(core: PotCore, gaps: Sequence[Gap]) -> tuple[Cut, ...]:
    """Return the cuts through the upper half whose mean flux density is reported."""
    half_window = half_window_height(core, gaps)
    half_height = half_window + core.plate_thickness
    return (
        _cut_at_gap(core, post_pieces(gaps, core.window_height), half_window),
        Cut("post, at the plate", (core.hole_radius, half_window), (core.post_radius, half_window)),
        Cut("plate, at the post", (core.post_radius, half_window), (core.post_radius, half_height)),
        Cut(
            "plate, at the ring",
            (core.window_radius, half_window),
            (core.window_radius, half_height),
        ),
        Cut(
            "ring, at the joint",
            (core.window_radius, gap_length(gaps, "all") / 2),
            (core.outer_radius, gap_length(gaps, "all") / 2),
        ),
    )


class CutWithoutTwin(Cut):
    """A cut whose mirror image lies at nothing that deserves its name."""

    def mirrored(self) -> Cut:
        """Return the cut itself."""
        return self


def _cut_at_gap(core: PotCore, pieces: Sequence[GapPiece], half_window: float) -> Cut:
    """Return the cut along the outermost face that is not at a plate, above rather than below."""
    faces = [face for piece in pieces for face in (piece.bottom, piece.top)]
    face = max((face for face in faces if abs(face) < half_window), key=lambda z: (abs(z), z),
               default=0.0)  # fmt: skip
    lopsided = bool(pieces) and pieces[-1].top != -pieces[0].bottom
    kind = CutWithoutTwin if lopsided else Cut
    return kind("post, at the gap", (core.hole_radius, face), (core.post_radius, face))


def gap_permeabilities(core: PotCore, gaps: Sequence[Gap]) -> Mapping[str, float]:
    """Return the relative permeability of the region of every gap, by its name."""
    legs = {"post": post_pieces(gaps, core.window_height), "ring": ring_pieces(gaps)}
    return MappingProxyType(
        {
            name: piece.permeability
            for leg, pieces in legs.items()
            for name, piece in zip(piece_names(pieces, leg), pieces, strict=True)
        }
    )


def _leg(
    r0: float, r1: float, half_window: float, pieces: Sequence[GapPiece], leg: str
) -> Iterator[Region]:
    """Yield the parts and openings of a leg from above."""
    floors = (-half_window, *(piece.top for piece in pieces))
    ceilings = (*(piece.bottom for piece in pieces), half_window)
    if not pieces:
        names: tuple[str, ...] = (leg,)
    elif len(pieces) == 1:
        names = (f"lower {leg}", f"upper {leg}")
    else:
        first = 1 if ceilings[0] > floors[0] else 0
        names = tuple(f"{leg} {place}" for place in range(first, first + len(floors)))
    parts = [
        Region(name, "core", rectangle(r0, r1, floor, ceiling))
        for name, floor, ceiling in zip(names, floors, ceilings, strict=True)
        if ceiling > floor
    ]
    openings = [
        Region(name, "air", rectangle(r0, r1, piece.bottom, piece.top))
        for name, piece in zip(piece_names(pieces, leg), pieces, strict=True)
    ]
    yield from sorted((*parts, *openings), key=lambda part: -part.polygon[0][1])


def _dimension_error(problem: str, name: str, value: float, accepted: str) -> InputError:
    return InputError(problem, key=f"core.dimensions.{name}", value=value, accepted=accepted)
