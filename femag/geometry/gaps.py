"""Air gaps as an engineer orders them, and where they open the legs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from femag.errors import InputError, entry_key, number
from femag.materials.curves import HIGHEST_PERMEABILITY

Leg = Literal["post", "all"]

MOST_PIECES = 100
SLACK = 1e-12
"""Distance over the window height within which two faces touch."""


@dataclass(frozen=True)
class Gap:
    """One air gap, whole or in pieces.

    Parameters
    ----------
    length : float
        Total length in m: ground away from the post, or added to the height by a spacer.
    leg : {"post", "all"}
        In the centre post only, or in all legs (a spacer between the halves).
    pieces : int
        Number of equal gaps that the length is divided into; post only.
    pitch : float, optional
        Distance of the pieces from centre to centre, m. When left out, window height of the gapped
        set over number of pieces: each piece then lies in the middle of its share of the post.
    offset : float
        Centre of the gap, or of all pieces, above the middle of the window, m; post only.
    permeability : float
        Relative permeability of what fills the gap (spacer, glue); linear.
    """

    length: float
    leg: Leg = "post"
    pieces: int = 1
    pitch: float | None = None
    offset: float = 0.0
    permeability: float = 1.0

    def __post_init__(self) -> None:
        _check_positive("length", self.length, "a length above 0; leave the gap out for an "
                        "ungapped core")  # fmt: skip
        if self.leg not in ("post", "all"):
            raise InputError(
                "unknown leg", key="gap.leg", value=self.leg, accepted="'post' or 'all'"
            )
        _check_pieces(self)
        offset = number(self.offset, "gap.offset", "a length of either sign")
        if not np.isfinite(offset):
            raise InputError(
                "offset out of range", key="gap.offset", value=self.offset,
                accepted="a length of either sign",
            )  # fmt: skip
        object.__setattr__(self, "offset", offset + 0.0)  # -0.0 and 0.0 are one design
        accepted = f"a number from 1 up to {HIGHEST_PERMEABILITY:g}"
        permeability = number(self.permeability, "gap.permeability", accepted)
        if not 1.0 <= permeability <= HIGHEST_PERMEABILITY:
            raise InputError(
                "relative permeability out of range", key="gap.permeability",
                value=self.permeability, accepted=accepted,
            )  # fmt: skip
        _check_spacer(self)


@dataclass(frozen=True)
class GapPiece:
    """One opening of a leg.

    Parameters
    ----------
    bottom, top : float
        Faces, m above the middle of the window.
    permeability : float
        Relative permeability of what fills it.
    """

    bottom: float
    top: float
    permeability: float = 1.0

    @property
    def length(self) -> float:
        """Distance of the faces, m."""
        return self.top - self.bottom

    @property
    def middle(self) -> float:
        """Middle between the faces, m."""
        return 0.5 * (self.bottom + self.top)


def gap_length(gaps: Sequence[Gap], leg: Leg) -> float:
    """Return the length in m of the gap that is ordered for `leg`, 0 if there is none.

    Raises
    ------
    InputError
        If one leg has several gaps; their places would have to be said.
    """
    gap = _ordered_gap(gaps, leg)
    return gap.length if gap else 0.0


def ring_pieces(gaps: Sequence[Gap]) -> tuple[GapPiece, ...]:
    """Return the opening of the ring: that of the spacer, in the middle."""
    spacer = _ordered_gap(gaps, "all")
    if spacer is None:
        return ()
    return (GapPiece(-spacer.length / 2, spacer.length / 2, spacer.permeability),)


def post_pieces(gaps: Sequence[Gap], window_height: float) -> tuple[GapPiece, ...]:
    """Return the openings of the post from below.

    A spacer opens the post in the middle. A gap that is ground there too, in one piece and in the
    middle, becomes one gap with it; any other has to keep clear of it.

    Parameters
    ----------
    gaps : sequence of Gap
        At most one for each leg.
    window_height : float
        Window height of the ungapped set, m.

    Raises
    ------
    InputError
        If the pieces touch each other or the spacer, or leave the post.
    """
    ground, spacer = _ordered_gap(gaps, "post"), ring_pieces(gaps)
    if ground is None:
        return spacer
    key = entry_key("gap", list(gaps).index(ground))
    if ground.length >= window_height:
        raise InputError(
            "the gap is longer than the post", key=f"{key}.length", value=ground.length,
            accepted=f"less than the window height, {window_height * 1e3:g} mm",
        )  # fmt: skip
    if spacer and ground.pieces == 1 and ground.offset == 0.0:
        return (_merged(spacer[0], ground, key),)
    height = window_height + gap_length(gaps, "all")
    pieces = _ground_pieces(ground, height, key)
    for opening in spacer:
        _check_clear(opening, pieces, ground, SLACK * height, key)
    return tuple(sorted((*pieces, *spacer), key=lambda piece: piece.bottom))


def piece_names(pieces: Sequence[GapPiece], leg: str) -> tuple[str, ...]:
    """Return the name of the region of each opening of a leg, numbered if there are several."""
    if len(pieces) == 1:
        return (f"{leg} gap",)
    return tuple(f"{leg} gap {place}" for place in range(1, len(pieces) + 1))


def _ordered_gap(gaps: Sequence[Gap], leg: Leg) -> Gap | None:
    found = [gap for gap in gaps if gap.leg == leg]
    if len(found) > 1:
        raise InputError(
            f"{len(found)} gaps with leg = {leg!r}", key="gap", accepted="one gap for each leg"
        )
    return found[0] if found else None


def _ground_pieces(gap: Gap, height: float, key: str) -> tuple[GapPiece, ...]:
    """Return the pieces of a gap in a post of a height in m; faces at a plate lie on it exactly."""
    piece, half = gap.length / gap.pieces, height / 2
    pitch = height / gap.pieces if gap.pitch is None else gap.pitch
    _check_stack(gap, piece, pitch, half, key)

    def face(place: float) -> float:
        return float(np.copysign(half, place)) if half - abs(place) < SLACK * height else place

    middles = (
        gap.offset + (number - (gap.pieces - 1) / 2) * pitch for number in range(int(gap.pieces))
    )
    return tuple(
        GapPiece(face(middle - piece / 2), face(middle + piece / 2), gap.permeability)
        for middle in middles
    )


def _check_stack(gap: Gap, piece: float, pitch: float, half: float, key: str) -> None:
    """Refuse pieces that touch each other or leave the post; lengths in m."""
    if gap.pieces > 1 and not pitch > piece + SLACK * half:
        raise InputError(
            "the pieces of the gap touch or overlap", key=f"{key}.pitch", value=gap.pitch,
            accepted=f"more than the length of a piece, {piece * 1e3:g} mm",
        )  # fmt: skip
    reach = ((gap.pieces - 1) * pitch + piece) / 2
    if reach > half * (1.0 + SLACK):
        most = (2 * half - piece) / (gap.pieces - 1)
        raise InputError(
            "the pieces of the gap leave the post", key=f"{key}.pitch", value=gap.pitch,
            accepted=f"at most {most * 1e3:g} mm",
        )  # fmt: skip
    if abs(gap.offset) + reach > half * (1.0 + SLACK):
        room = (half - reach) * 1e3
        raise InputError(
            "the gap leaves the post", key=f"{key}.offset", value=gap.offset,
            accepted=f"from -{room:g} mm to {room:g} mm",
        )  # fmt: skip


def _merged(spacer: GapPiece, ground: Gap, key: str) -> GapPiece:
    if spacer.permeability != ground.permeability:
        raise InputError(
            "the gap and the spacer are one gap in the post", key=f"{key}.permeability",
            value=ground.permeability, accepted=f"that of the spacer, {spacer.permeability:g}",
        )  # fmt: skip
    half = (spacer.length + ground.length) / 2
    return GapPiece(-half, half, ground.permeability)


def _check_clear(
    spacer: GapPiece, pieces: Sequence[GapPiece], ground: Gap, slack: float, key: str
) -> None:
    """Refuse pieces that touch the spacer's opening of the post."""
    if all(p.top < spacer.bottom - slack or p.bottom > spacer.top + slack for p in pieces):
        return
    name = "offset" if ground.pieces == 1 else "pieces"
    raise InputError(
        "the gap touches or overlaps the spacer in the post", key=f"{key}.{name}",
        value=getattr(ground, name),
        accepted=f"a gap more than {spacer.top * 1e3:g} mm off the middle, or one piece with "
        "offset 0",
    )  # fmt: skip


def _check_positive(name: str, value: object, accepted: str) -> None:
    if not 0.0 < number(value, f"gap.{name}", accepted) < np.inf:
        raise InputError(
            f"the {'gap' if name == 'length' else name} must be positive",
            key=f"gap.{name}",
            value=value,
            accepted=accepted,
        )


def _check_pieces(gap: Gap) -> None:
    accepted = f"a whole number from 1 to {MOST_PIECES}"
    pieces = number(gap.pieces, "gap.pieces", accepted)
    if not (1 <= pieces <= MOST_PIECES and pieces == int(pieces)):
        raise InputError(
            "number of pieces out of range", key="gap.pieces", value=gap.pieces, accepted=accepted
        )
    if gap.pitch is None:
        return
    _check_positive("pitch", gap.pitch, "a length above 0; leave it out to spread the pieces")
    if pieces == 1:
        raise InputError(
            "one piece has no pitch", key="gap.pitch", value=gap.pitch,
            accepted="several pieces, or no pitch",
        )  # fmt: skip


def _check_spacer(gap: Gap) -> None:
    """Refuse a spacer with what only a gap in the post has."""
    if gap.leg == "post":
        return
    for name, plain in (("pieces", 1), ("pitch", None), ("offset", 0.0)):
        if getattr(gap, name) != plain:
            raise InputError(
                "only a gap in the post has this", key=f"gap.{name}", value=getattr(gap, name),
                accepted="none with leg = 'all'",
            )  # fmt: skip
