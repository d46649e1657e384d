"""The hand calculation of a core: one reluctance network, solved with every fringing formula."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from femag.errors import InputError
from femag.geometry import Core, Gap, gap_length, gap_remanences, half_window_height
from femag.geometry.effective import (
    CoreSection,
    core_factor,
    core_sections,
    effective_parameters,
)
from femag.geometry.gaps import GapPiece, piece_names, post_pieces, spacer_pieces
from femag.hand.fringing import FORMULAS, GapShape, no_fringing
from femag.hand.network import Branch, network_state
from femag.materials import AIR, LinearCurve, MagnetisationCurve
from femag.units import MU_0


@dataclass(frozen=True)
class HandEstimate:
    """What one fringing formula makes of a design.

    Parameters
    ----------
    name : str
        Name of the formula.
    inductance : float
        Energy inductance of the network, H: 2 W'/I^2, or with magnets 2/I^2 times what the current
        adds to W'.
    in_range : bool
        Whether every gap of the design is inside the formula's range; no formula knows any but flat
        faces with sharp rims.
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
    core: Core,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
) -> tuple[HandEstimate, ...]:
    """Return the estimate of every formula; without a gap, of the network alone.

    Parameters
    ----------
    core : Core
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
            in_range=all(
                opening.piece.is_flat and formula.in_range(opening.shape) for opening in openings
            ),
            range=formula.range,
            source=formula.source,
        )
        for formula in formulas
    )


def plain_inductance(
    core: Core,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
) -> float:
    """Return the energy inductance in H of the network without fringing.

    Parameters and errors are those of `hand_estimates`.
    """
    return _inductance(core, gaps, turns, current, curve, no_fringing)


def gap_shapes(core: Core, gaps: Sequence[Gap]) -> tuple[GapShape, ...]:
    """Return the shape of every opening: those of the post from below, then that of the ring.

    A spacer opens both legs in the middle; in the post it adds to a gap that is ground there. The
    height of a shape ends where the nearer side of its post does: at the plate, or in the middle of
    the core towards the next gap. A gap at a plate has the shape of itself and its mirror image
    in the plate together, twice as long, whose fringing factor is its own. The length of shaped
    faces is that at the rim.
    """
    return tuple(opening.shape for opening in _openings(core, gaps))


@dataclass(frozen=True)
class _Opening:
    """A gap in the network: its node, the piece, and its shape for the formulas."""

    node: str
    piece: GapPiece
    shape: GapShape

    @property
    def radii(self) -> tuple[float, float]:
        """Inner and outer radius of its leg, m."""
        return self.shape.inner_radius, self.shape.outer_radius


def _openings(core: Core, gaps: Sequence[Gap]) -> tuple[_Opening, ...]:
    half_height, in_ring = half_window_height(core, gaps), spacer_pieces(gaps)
    in_post, turned = post_pieces(gaps, core.window_height), core.turned
    reaches = [piece.reach(turned.hole_radius, turned.post_radius) for piece in in_post]
    posts = [
        _Opening(node, piece, _post_shape(core, piece, sides, half_height))
        for node, piece, sides in zip(
            piece_names(in_post, "post"),
            in_post,
            _heights(in_post, reaches, half_height),
            strict=True,
        )
    ]
    radii = (turned.ring_outer_radius, turned.ring_inner_radius)
    rings = [
        _Opening(node, piece, GapShape(piece.length, *radii, half_height, "ring"))
        for node, piece in zip(piece_names(in_ring, "ring"), in_ring, strict=True)
    ]
    return (*posts, *rings)


def _post_shape(
    core: Core, piece: GapPiece, sides: tuple[float, float], half_height: float
) -> GapShape:
    """Return the shape of an opening of the post; at a plate, that of it and its mirror image."""
    r0, r1 = core.turned.hole_radius, core.turned.post_radius
    at_plate = half_height in (abs(piece.bottom), abs(piece.top))
    length = piece.rim_length(r0, r1) * (2 if at_plate else 1)
    height = piece.length / 2 + max(sides) if at_plate else min(sides)
    return GapShape(length, r1, r0, height, "post")


def _heights(
    pieces: Sequence[GapPiece], reaches: Sequence[tuple[float, float]], half_height: float
) -> list[tuple[float, float]]:
    """Return the room below and above each piece's middle in m: to mid core or to the plate."""
    if not pieces:
        return []
    between = [0.5 * (low + high) for (_, low), (high, _) in pairwise(reaches)]
    ends = [-half_height, *between, half_height]
    return [
        (piece.middle - low, high - piece.middle)
        for piece, (low, high) in zip(pieces, pairwise(ends), strict=True)
    ]


def core_network(
    core: Core,
    gaps: Sequence[Gap],
    mmf: float,
    curve: MagnetisationCurve,
    factor: Callable[[GapShape], float],
) -> tuple[Branch, ...]:
    """Return the branches of a gapped core, closed in a loop, with the winding in the post.

    Where a core factor is published the lengths of all sections are stretched alike to give it.

    Parameters
    ----------
    core : Core
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
    links: list[tuple[str, CoreSection | _Opening]] = []
    openings = _openings(core, gaps)
    stretch = core_factor(core) / effective_parameters(core).c1
    for section in core_sections(core, gap_length(gaps, "post")):
        links.append((section.name, section))
        links += [(part.node, part) for part in openings if part.shape.leg == section.name]
    nodes = [name for name, _ in links]
    branches: list[Branch] = []
    for (node, part), end in zip(links, nodes[1:] + nodes[:1], strict=True):
        if isinstance(part, _Opening):
            branches += _gap_branches(part, end, curve, factor)
        else:
            driven = mmf if node == "post" else 0.0
            branches.append(Branch(node, end, stretch * part.length, part.area, curve, driven))
    return tuple(branches)


def _gap_branches(
    opening: _Opening, end: str, curve: MagnetisationCurve, factor: Callable[[GapShape], float]
) -> list[Branch]:
    """Return what lies between the faces and, if there is any, the air beside it."""
    piece, shape, node = opening.piece, opening.shape, opening.node
    if piece.shape.step_radius > 0.0:
        between = _stepped_branches(opening, end, curve)
    else:
        length = shape.area / piece.area_over_length(*opening.radii)
        between = [_block(piece, node, end, length, shape.area)]
    beside = shape.area * (factor(shape) - 1.0)
    if beside <= 0.0:
        return between
    return [*between, Branch(node, end, piece.rim_length(*opening.radii), beside, AIR)]


def _block(piece: GapPiece, start: str, end: str, length: float, area: float) -> Branch:
    """Return the branch of a block (m, m2) of what fills a gap; a magnet drives flux through it."""
    mmf = piece.remanence / (MU_0 * piece.permeability) * length
    return Branch(start, end, length, area, LinearCurve(piece.permeability), mmf)


def _stepped_branches(opening: _Opening, end: str, curve: MagnetisationCurve) -> list[Branch]:
    """Return the gap outside of a step, and inside of it core and gap in series."""
    piece, node = opening.piece, opening.node
    inside = np.pi * (piece.shape.step_radius**2 - opening.radii[0] ** 2)
    gap = 0.0 if piece.shape.closed else piece.length + piece.shape.step_depth
    through = inside / gap if gap else 0.0
    outside = opening.shape.area - inside
    beside = outside / (piece.area_over_length(*opening.radii) - through)
    branches = [_block(piece, node, end, beside, outside)]
    core = piece.length - gap
    middle = f"{node} step" if core > 0.0 and gap else node
    if core > 0.0:
        branches.append(Branch(node, middle if gap else end, core, inside, curve))
    if gap:
        branches.append(_block(piece, middle, end, gap, inside))
    return branches


def _inductance(
    core: Core,
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
    if not gap_remanences(core, gaps) or curve.is_linear:
        without = [gap.without_remanence() for gap in gaps]
        branches = core_network(core, without, turns * current, curve, factor)
        return network_state(branches).energy_inductance(current)
    driven, idle = (
        network_state(core_network(core, gaps, mmf, curve, factor))
        for mmf in (turns * current, 0.0)
    )
    linked = turns * idle.flux_through("post")
    return 2.0 * (driven.coenergy - idle.coenergy - current * linked) / current**2
