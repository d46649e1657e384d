"""A leg of the core with its openings, as regions."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import chain, zip_longest

from femag.geometry.gaps import GapPiece, piece_names
from femag.geometry.section import Polygon, Region


def leg_regions(
    r0: float, r1: float, half_window: float, pieces: Sequence[GapPiece], leg: str
) -> Iterator[Region]:
    """Yield the parts and openings of a leg from above.

    Parameters
    ----------
    r0, r1 : float
        Inner and outer radius of the leg, m.
    half_window : float
        Half the height of the window, m.
    pieces : sequence of GapPiece
        Openings of the leg from below.
    leg : str
        Its name. A leg with one opening has an upper and a lower part, unless the opening lies at a
        plate; the parts and openings of one with several are numbered from below.
    """
    faces = [piece.faces(r0, r1) for piece in pieces]
    floors = (_level(r0, r1, -half_window), *(upper for _, upper in faces))
    ceilings = (*(lower for lower, _ in faces), _level(r0, r1, half_window))
    parts = [
        Region(name, "core", _between(floor, ceiling)) if _has_height(floor, ceiling) else None
        for name, floor, ceiling in zip(
            _part_names(leg, floors, ceilings), floors, ceilings, strict=True
        )
    ]
    openings = [
        Region(name, "air", _between(lower, upper))
        for name, (lower, upper) in zip(piece_names(pieces, leg), faces, strict=True)
    ]
    from_below = chain.from_iterable(zip_longest(parts, openings))
    yield from reversed([region for region in from_below if region is not None])


def _part_names(
    leg: str, floors: Sequence[Polygon], ceilings: Sequence[Polygon]
) -> tuple[str, ...]:
    if len(floors) == 1:
        return (leg,)
    if len(floors) == 2:
        return f"lower {leg}", f"upper {leg}"
    first = 1 if _has_height(floors[0], ceilings[0]) else 0
    return tuple(f"{leg} {place}" for place in range(first, first + len(floors)))


def _level(r0: float, r1: float, height: float) -> Polygon:
    return (r0, height), (r1, height)


def _has_height(floor: Polygon, ceiling: Polygon) -> bool:
    """Return whether there is anything between two faces."""
    return max(z for _, z in ceiling) > min(z for _, z in floor)


def _between(floor: Polygon, ceiling: Polygon) -> Polygon:
    """Return the outline of what lies between two faces, which may touch from inside on."""
    touching = 0
    while floor[touching] == ceiling[touching]:
        touching += 1
    return (*floor[max(touching - 1, 0) :], *reversed(ceiling[touching:]))
