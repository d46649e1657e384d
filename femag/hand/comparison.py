"""The hand calculation of a core: one reluctance network, solved with every fringing formula."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from femag.errors import InputError
from femag.geometry import Gap, PotCore, gap_length, half_window_height
from femag.geometry.gaps import GapPiece, piece_names, post_pieces, ring_pieces
from femag.hand.effective import core_sections
from femag.hand.fringing import FORMULAS, GapShape, no_fringing
from femag.hand.network import Branch, network_state
from femag.materials import AIR, LinearCurve, MagnetisationCurve

Tube = tuple[float, float, MagnetisationCurve]
"""Length in m, area in m2, and curve of one branch."""


@dataclass(frozen=True)
class HandEstimate:
    """What one fringing formula makes of a design.

    Parameters
    ----------
    name : str
        Name of the formula.
    inductance : float
        Energy inductance 2 W'/I^2 of the network, H.
    in_range : bool
        Whether every gap of the design is inside the formula's range.
    range : str
        The range in words.
    source : str
        Citation, and how it was checked.
    """

    name: str
    inductance: float
    in_range: bool
    range: str
    source: str


def hand_estimates(
    core: PotCore,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
) -> tuple[HandEstimate, ...]:
    """Return the estimate of every formula; without a gap, of the network alone.

    Parameters
    ----------
    core : PotCore
        The core.
    gaps : sequence of Gap
        At most one for each kind of leg; none for an ungapped core.
    turns : int
        Turns that carry the current.
    current : float
        A.
    curve : MagnetisationCurve
        What the core is made of.

    Raises
    ------
    InputError
        If turns or current cannot be used.
    NumericalError
        If the network cannot be solved.
    """
    openings = _openings(core, gaps)
    formulas = FORMULAS if openings else FORMULAS[:1]
    return tuple(
        HandEstimate(
            name=formula.name,
            inductance=_inductance(core, gaps, turns, current, curve, formula.factor),
            in_range=all(formula.in_range(opening.shape) for opening in openings),
            range=formula.range,
            source=formula.source,
        )
        for formula in formulas
    )


def plain_inductance(
    core: PotCore,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
) -> float:
    """Return the energy inductance in H of the network without fringing.

    Parameters and errors are those of `hand_estimates`.
    """
    return _inductance(core, gaps, turns, current, curve, no_fringing)


def gap_shapes(core: PotCore, gaps: Sequence[Gap]) -> tuple[GapShape, ...]:
    """Return the shape of every opening: those of the post from below, then that of the ring.

    A spacer opens both legs in the middle; in the post it adds to a gap that is ground there. The
    height of a shape ends where the nearer side of its post does: at the plate, or in the middle of
    the core towards the next gap. A gap at a plate has the shape of itself and its mirror image
    in the plate together, twice as long, whose fringing factor is its own.
    """
    return tuple(opening.shape for opening in _openings(core, gaps))


@dataclass(frozen=True)
class _Opening:
    """A gap in the network: its node, length in m, shape for the formulas, and what fills it."""

    node: str
    length: float
    shape: GapShape
    filling: MagnetisationCurve


def _openings(core: PotCore, gaps: Sequence[Gap]) -> tuple[_Opening, ...]:
    half_height, in_ring = half_window_height(core, gaps), ring_pieces(gaps)
    in_post = post_pieces(gaps, core.window_height)
    found = []
    for node, piece, sides in zip(
        piece_names(in_post, "post"), in_post, _heights(in_post, half_height), strict=True
    ):
        shape = _post_shape(core, piece, sides, half_height)
        found.append(_Opening(node, piece.length, shape, LinearCurve(piece.permeability)))
    for node, piece in zip(piece_names(in_ring, "ring"), in_ring, strict=True):
        shape = GapShape(piece.length, core.outer_radius, core.window_radius, half_height, "ring")
        found.append(_Opening(node, piece.length, shape, LinearCurve(piece.permeability)))
    return tuple(found)


def _post_shape(
    core: PotCore, piece: GapPiece, sides: tuple[float, float], half_height: float
) -> GapShape:
    """Return the shape of an opening of the post; at a plate, that of it and its mirror image."""
    at_plate = half_height in (abs(piece.bottom), abs(piece.top))
    length = 2 * piece.length if at_plate else piece.length
    height = piece.length / 2 + max(sides) if at_plate else min(sides)
    return GapShape(length, core.post_radius, core.hole_radius, height, "post")


def _heights(pieces: Sequence[GapPiece], half_height: float) -> list[tuple[float, float]]:
    """Return the room below and above each piece's middle in m: to mid core or to the plate."""
    if not pieces:
        return []
    between = [0.5 * (low.top + high.bottom) for low, high in pairwise(pieces)]
    ends = [-half_height, *between, half_height]
    return [
        (piece.middle - low, high - piece.middle)
        for piece, (low, high) in zip(pieces, pairwise(ends), strict=True)
    ]


def pot_network(
    core: PotCore,
    gaps: Sequence[Gap],
    mmf: float,
    curve: MagnetisationCurve,
    factor: Callable[[GapShape], float],
) -> tuple[Branch, ...]:
    """Return the branches of a gapped pot core, closed in a loop, with the winding in the post.

    Parameters
    ----------
    core : PotCore
        The core.
    gaps : sequence of Gap
        Its gaps.
    mmf : float
        Ampere turns, A.
    curve : MagnetisationCurve
        What the core is made of.
    factor : callable
        Fringing factor of a gap; its excess over 1 is a branch of air parallel to the gap's
        block, which has the permeability of what fills it.
    """
    openings = _openings(core, gaps)
    links: list[tuple[str, list[Tube]]] = []
    for section in core_sections(core, gap_length(gaps, "post")):
        links.append((section.name, [(section.length, section.area, curve)]))
        for opening in openings:
            if opening.shape.leg == section.name:
                links.append((opening.node, _gap_tubes(opening, factor)))
    nodes = [name for name, _ in links]
    return tuple(
        Branch(node, end, length, area, law, mmf if node == "post" else 0.0)
        for (node, tubes), end in zip(links, nodes[1:] + nodes[:1], strict=True)
        for length, area, law in tubes
    )


def _gap_tubes(opening: _Opening, factor: Callable[[GapShape], float]) -> list[Tube]:
    """Return the block between the faces and, if there is any, the air beside it."""
    shape = opening.shape
    block = (opening.length, shape.area, opening.filling)
    beside = shape.area * (factor(shape) - 1.0)
    return [block, (opening.length, beside, AIR)] if beside > 0.0 else [block]


def _inductance(
    core: PotCore,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
    factor: Callable[[GapShape], float],
) -> float:
    if not (np.isfinite(current) and current != 0.0):
        raise InputError(
            "a current is needed", key="current", value=current,
            accepted="a current that is not 0",
        )  # fmt: skip
    if turns < 1:
        raise InputError("no turns", key="turns", value=turns, accepted="1 or more")
    branches = pot_network(core, gaps, turns * current, curve, factor)
    return network_state(branches).energy_inductance(current)
