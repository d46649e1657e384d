"""Air gaps as an engineer orders them, and where they open the legs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from femag.errors import InputError, entry_key, number
from femag.geometry.gap_faces import FLAT, FaceShape, Step, area_over_length
from femag.geometry.magnets import Magnet
from femag.geometry.section import Polygon
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
    rim_length : float, optional
        Total length at the rim of the post, m, while `length` holds at the axis or the edge of the
        hole; straight in between. Flat faces when left out. Post only, like all that follows
        except for the magnet.
    step : Step, optional
        Another length in the middle of the post. Not beside `rim_length`.
    chamfer : float
        Breadth of a cut at 45 degrees off the rim of the faces, m; 0 for none.
    edge_radius : float
        Radius of the rim of the faces, m; 0 for a sharp one. Not beside `chamfer`.
    magnet : Magnet, optional
        What fills the gap, every piece of it and both legs of a spacer, instead of `permeability`.
    """

    length: float
    leg: Leg = "post"
    pieces: int = 1
    pitch: float | None = None
    offset: float = 0.0
    permeability: float = 1.0
    rim_length: float | None = None
    step: Step | None = None
    chamfer: float = 0.0
    edge_radius: float = 0.0
    magnet: Magnet | None = None

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
        _check_faces(self)
        _check_magnet(self)
        _check_spacer(self)

    @property
    def is_shaped(self) -> bool:
        """Whether the faces are not flat with sharp rims."""
        return self.shape != FLAT

    @property
    def shape(self) -> FaceShape:
        """The faces of one piece."""
        taper = 0.0 if self.rim_length is None else (self.rim_length - self.length) / self.pieces
        flat = FaceShape(taper, chamfer=float(self.chamfer), edge_radius=float(self.edge_radius))
        if self.step is None:
            return flat
        depth = (self.step.length - self.length) / self.pieces
        closed = self.step.length == 0.0
        return replace(flat, step_radius=self.step.diameter / 2, step_depth=depth, closed=closed)

    def without_remanence(self) -> Gap:
        """Return the gap with a filling as permeable as its magnet, if it has one."""
        if self.magnet is None:
            return self
        slope = self.magnet.recoil_permeability
        return replace(self, magnet=None, permeability=slope)

    @property
    def filling(self) -> tuple[float, float]:
        """Relative permeability of what fills the gap, and its remanence in T."""
        if self.magnet is None:
            return self.permeability, 0.0
        return self.magnet.recoil_permeability, self.magnet.remanence


@dataclass(frozen=True)
class GapPiece:
    """One opening of a leg.

    Parameters
    ----------
    bottom, top : float
        Faces, m above the middle of the window; of shaped faces where the flat ones would be.
    permeability : float
        Relative permeability of what fills it.
    remanence : float
        Of what fills it, along the flux of a positive current, T.
    shape : FaceShape
        Of its faces.
    shares : tuple of float
        Share of a taper or step that the lower and the upper face take: half each, or none at a
        plate, which stays flat, and all of it opposite.
    """

    bottom: float
    top: float
    permeability: float = 1.0
    remanence: float = 0.0
    shape: FaceShape = FLAT
    shares: tuple[float, float] = (0.5, 0.5)

    @property
    def length(self) -> float:
        """Distance of the faces, m."""
        return self.top - self.bottom

    @property
    def middle(self) -> float:
        """Middle between the faces, m."""
        return 0.5 * (self.bottom + self.top)

    @property
    def is_flat(self) -> bool:
        """Whether both faces are flat with sharp rims."""
        return self.shape == FLAT

    def faces(self, r0: float, r1: float) -> tuple[Polygon, Polygon]:
        """Return the lower and the upper face as points (r, z) in m from radius r0 to r1."""
        below, above = (self.shape.depths(r0, r1, share) for share in self.shares)
        lower = [(r, self.bottom - depth) for r, depth in below]
        upper = [(r, self.top + depth) for r, depth in above]
        if self.shape.closed:
            touch = self.bottom if self.shares[0] == 0.0 else self.top
            touch = self.middle if self.shares[0] == self.shares[1] else touch
            for face in (lower, upper):
                face[:2] = [(r, touch) for r, _ in face[:2]]
        return tuple(lower), tuple(upper)

    def reach(self, r0: float, r1: float) -> tuple[float, float]:
        """Return the lowest and the highest point in m that its faces reach."""
        lower, upper = self.faces(r0, r1)
        return min(self.bottom, *(z for _, z in lower)), max(self.top, *(z for _, z in upper))

    def rim_length(self, r0: float, r1: float) -> float:
        """Return the distance of its faces at the rim in m, chamfer and rounding included."""
        lower, upper = self.faces(r0, r1)
        return upper[-1][1] - lower[-1][1]

    def area_over_length(self, r0: float, r1: float) -> float:
        """Return the integral of area over length between radii in m: plain permeance over mu."""
        return area_over_length(*self.faces(r0, r1))


def gap_length(gaps: Sequence[Gap], leg: Leg) -> float:
    """Return the length in m of the gap that is ordered for `leg`, 0 if there is none.

    Raises
    ------
    InputError
        If one leg has several gaps; their places would have to be said.
    """
    gap = ordered_gap(gaps, leg)
    return gap.length if gap else 0.0


def ordered_gap(gaps: Sequence[Gap], leg: Leg) -> Gap | None:
    """Return the gap that is ordered for `leg`, if there is one.

    Raises
    ------
    InputError
        If one leg has several gaps; their places would have to be said.
    """
    found = [gap for gap in gaps if gap.leg == leg]
    if len(found) > 1:
        raise InputError(
            f"{len(found)} gaps with leg = {leg!r}", key="gap", accepted="one gap for each leg"
        )
    return found[0] if found else None


def spacer_of(gaps: Sequence[Gap]) -> Gap | None:
    """Return the spacer between the halves, if there is one."""
    return ordered_gap(gaps, "all")


def spacer_pieces(gaps: Sequence[Gap]) -> tuple[GapPiece, ...]:
    """Return the opening of the legs at a spacer, in the middle."""
    spacer = spacer_of(gaps)
    if spacer is None:
        return ()
    return (GapPiece(-spacer.length / 2, spacer.length / 2, *spacer.filling),)


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
    ground, spacer = ordered_gap(gaps, "post"), spacer_pieces(gaps)
    if ground is None:
        return spacer
    key = entry_key("gap", list(gaps).index(ground))
    if ground.length >= window_height:
        raise InputError(
            "the gap is longer than the post", key=f"{key}.length", value=ground.length,
            accepted=f"less than the window height, {window_height * 1e3:g} mm",
        )  # fmt: skip
    if spacer and ground.pieces == 1 and ground.offset == 0.0:
        return (_merged(spacer_of(gaps), spacer[0], ground, key),)
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
    faces = [(face(middle - piece / 2), face(middle + piece / 2)) for middle in middles]
    return tuple(
        GapPiece(low, high, *gap.filling, gap.shape, _shares(low, high, half))
        for low, high in faces
    )


def _shares(bottom: float, top: float, half: float) -> tuple[float, float]:
    """Return which share of a taper or step each face takes; a face at a plate stays flat."""
    if bottom == -half:
        return 0.0, 1.0
    return (1.0, 0.0) if top == half else (0.5, 0.5)


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


def _merged(spacer: Gap | None, opening: GapPiece, ground: Gap, key: str) -> GapPiece:
    """Return the opening of a spacer and a gap ground beside it."""
    assert spacer is not None
    problem = "the gap and the spacer are one gap in the post"
    if ground.is_shaped:
        raise InputError(
            f"{problem}, whose faces are flat", key=f"{key}.{_shaping(ground)}",
            accepted="none beside a spacer, or an offset",
        )  # fmt: skip
    if spacer.magnet != ground.magnet:
        raise InputError(problem, key=f"{key}.magnet", accepted="the same magnet in both, or none")
    if spacer.permeability != ground.permeability:
        raise InputError(
            problem, key=f"{key}.permeability",
            value=ground.permeability, accepted=f"that of the spacer, {spacer.permeability:g}",
        )  # fmt: skip
    half = (opening.length + ground.length) / 2
    return GapPiece(-half, half, *ground.filling)


def _shaping(gap: Gap) -> str:
    """Return the first key that shapes the faces of a gap."""
    return next(name for name, plain in _SHAPING if getattr(gap, name) != plain)


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


_SHAPING: tuple[tuple[str, float | None], ...] = (
    ("rim_length", None),
    ("step", None),
    ("chamfer", 0.0),
    ("edge_radius", 0.0),
)
"""Attributes of a gap that shape its faces, with their values for flat and sharp ones."""


def _check_faces(gap: Gap) -> None:
    """Refuse sizes of the faces that make no sense whatever the post."""
    if gap.rim_length is not None:
        _check_positive("rim_length", gap.rim_length, "a length above 0; leave it out for flat "
                        "faces")  # fmt: skip
    if gap.step is not None and not isinstance(gap.step, Step):
        raise InputError("not a step", key="gap.step", value=gap.step, accepted="a Step")
    for name in ("chamfer", "edge_radius"):
        accepted = "a length of 0 or more"
        if not 0.0 <= number(getattr(gap, name), f"gap.{name}", accepted) < np.inf:
            raise InputError(
                "out of range", key=f"gap.{name}", value=getattr(gap, name), accepted=accepted
            )
    for one, other in (("rim_length", "step"), ("chamfer", "edge_radius")):
        if getattr(gap, one) and getattr(gap, other):
            raise InputError(f"stands beside {one}", key=f"gap.{other}", accepted="one of the two")


def _check_magnet(gap: Gap) -> None:
    if gap.magnet is None:
        return
    if not isinstance(gap.magnet, Magnet):
        raise InputError("not a magnet", key="gap.magnet", value=gap.magnet, accepted="a Magnet")
    if gap.permeability != 1.0:
        raise InputError(
            "stands beside a magnet", key="gap.permeability", value=gap.permeability,
            accepted="gap.magnet.recoil_permeability instead",
        )  # fmt: skip


def _check_spacer(gap: Gap) -> None:
    """Refuse a spacer with what only a gap in the post has."""
    if gap.leg == "post":
        return
    for name, plain in (("pieces", 1), ("pitch", None), ("offset", 0.0), *_SHAPING):
        if getattr(gap, name) != plain:
            raise InputError(
                "only a gap in the post has this", key=f"gap.{name}", value=getattr(gap, name),
                accepted="none with leg = 'all'",
            )  # fmt: skip
