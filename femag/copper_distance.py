"""How far copper must stay from the gap, and what several small gaps do instead.

The measure is the ripple's squared field over the copper, to which the loss in strands goes, over
what it would be with the gap spread evenly along the post: 1 is the level without fringe field.
Two answers: of the whole winding, when its inner edge moves and the field is solved again with the
turns spread over what is left; and what the gap adds in one thin layer of strands at a distance, in
the field of the winding where it is, which needs no solution of its own.
"""

from __future__ import annotations

import math
import time
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from femag.design import Design, design_hash, wound_coils
from femag.errors import InputError, entry_key, number
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.field.flux_side import flux_side
from femag.field.newton import solved
from femag.field.problem import FieldProblem
from femag.field.regional import agreeing_solution
from femag.geometry import Block, Gap, Winding
from femag.geometry.gaps import ordered_gap
from femag.materials import LinearCurve
from femag.quantities import RippleField
from femag.result import library_versions

Array = NDArray[np.float64]

DISTANCES = (0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0)
"""Distances between post and copper, over the gap's length, that are looked at."""
PIECES = (1, 2, 3, 4, 6, 8)
LEAST_LEFT = 0.1
"""Share of the room between post and the copper's outside that a moved winding keeps at least."""
NEAR = 0.1
"""Distance over the gap's length within which the design's own stands for one of `DISTANCES`."""
SLIVER = 1e-3
"""Share of the post that stays core where the gap is spread."""
ALONG = 400
"""Points along a layer."""
TOLERANCE = 1e-3
FIELD_ACCURACY = 0.02


@dataclass(frozen=True)
class KeepOutCurve:
    """Squared field against distance for one number of pieces.

    Parameters
    ----------
    pieces : int
        Equal gaps, spread evenly along the post.
    pitch : float
        Their distance from centre to centre, m; the window height of one.
    winding : tuple of float
        At each distance: mean of r |B|^2 over the section of a winding whose inner edge is there,
        solved anew, over that with the gap spread evenly.
    layer : tuple of float
        At each distance: 1 and what the gap adds to the mean of |B|^2 along a thin layer there, as
        high as the winding, with the current where the design has it, over the mean at the inner
        edge of the design's copper with the gap spread evenly.
    """

    pieces: int
    pitch: float
    winding: tuple[float, ...]
    layer: tuple[float, ...]


@dataclass(frozen=True)
class KeepOut:
    """Squared field over the copper against its distance from the post.

    Parameters
    ----------
    design : Design
        What was asked.
    gap : float
        Total length of the gap in the post, m.
    distance : float
        Of the design's own copper from the post, m.
    distances : tuple of float
        m, rising.
    curves : tuple of KeepOutCurve
        One for each number of pieces.
    seconds : float
        Wall time.
    versions : dict of str to str
        Versions of this package, Python and the libraries behind the numbers.
    design_hash : str
        Digest of everything in the design that can move a result.
    """

    design: Design
    gap: float
    distance: float
    distances: tuple[float, ...]
    curves: tuple[KeepOutCurve, ...]
    seconds: float
    versions: dict[str, str] = field(repr=False)
    design_hash: str

    def distance_for(self, curve: KeepOutCurve, factor: float) -> float | None:
        """Return the distance in m from which on a winding has at most `factor`; None if farther.

        By straight lines in the logarithm of what is above 1.
        """
        above = np.maximum(np.array(curve.winding) - 1.0, 1e-9)
        high = np.flatnonzero(above > factor - 1.0)
        if not len(high):
            return self.distances[0]
        last = int(high[-1])
        if last == len(above) - 1:
            return None
        ends = np.log(above[[last + 1, last]])
        return float(np.interp(math.log(factor - 1.0), ends, (self.distances[last + 1],
                                                              self.distances[last])))  # fmt: skip


def keep_out(
    design: Design,
    distances: Sequence[float] | None = None,
    pieces: Sequence[int] = PIECES,
) -> KeepOut:
    """Return how the squared field over the copper falls with its distance from the post.

    Parameters
    ----------
    design : Design
        With a gap in the post. The core counts with its initial permeability, and all driven
        windings as one block from the innermost of their turns to the outermost.
    distances : sequence of float, optional
        Between post and copper, m; when left out `DISTANCES` times the gap where there is room,
        and the design's own.
    pieces : sequence of int
        Numbers of equal pieces that the gap's total length is divided into.

    Raises
    ------
    InputError
        If the design has no gap in the post or one with a magnet, or a spacer, or a distance
        leaves no room.
    NumericalError
        If a field cannot be solved.

    Notes
    -----
    The gap-free level is the same design with the whole post filled by a material that has the
    reluctance of gap and post together. Loss goes with the squared field for strands thinner than a
    skin depth; the part of a conductor's own current is not in it.
    """
    started = time.perf_counter()
    gap = _gap_in_post(design)
    room = _copper_block(design)
    post = design.core.turned.post_radius
    own = room.inner_radius - post
    found = _checked_distances(distances, gap.length, room, post)
    edges = tuple(sorted({*found, own}))
    linear = _linear_design(design, _strips(edges, room, post))

    def squares(of: Gap) -> _Squares:
        return _squares(replace(linear, gaps=(of,)), edges, found, own)

    spread = squares(_spread_gap(linear, gap))
    height = design.core.window_height
    curves = [
        _curve(n, height / n, squares(replace(gap, pieces=n, pitch=None, offset=0.0)), spread)
        for n in pieces
    ]
    return KeepOut(
        design=design,
        gap=gap.length,
        distance=own,
        distances=found,
        curves=tuple(curves),
        seconds=time.perf_counter() - started,
        versions=library_versions(),
        design_hash=design_hash(design),
    )


def _linear_design(design: Design, strips: Sequence[Winding]) -> Design:
    """Return the design at small signal, 1 A in strips of copper."""
    return replace(
        design,
        material=LinearCurve(design.material.initial_permeability),
        windings=tuple(strips),
        driven=(),
        ripple=None,
        detail="block",
        current=1.0,
    )


def _curve(pieces: int, pitch: float, squares: _Squares, spread: _Squares) -> KeepOutCurve:
    """Return the squared field of a divided gap over that of the gap spread evenly."""
    winding = squares.windings / spread.windings
    layer = 1.0 + (squares.layers - spread.layers) / spread.at_copper
    return KeepOutCurve(pieces, pitch, tuple(winding.tolist()), tuple(layer.tolist()))


def _gap_in_post(design: Design) -> Gap:
    """Return the one gap of a design, which has to be in the post."""
    accepted = "one gap in the post, without a magnet, and no spacer"
    gap = ordered_gap(design.gaps, "post")
    if gap is None:
        raise InputError("no gap in the post", key="gap", accepted=accepted)
    for index, other in enumerate(design.gaps):
        if other.leg == "all":
            raise InputError(
                "a spacer beside it", key=f"{entry_key('gap', index)}.leg", value=other.leg,
                accepted=accepted,
            )  # fmt: skip
    if gap.magnet is not None:
        raise InputError("a magnet in the gap", key="gap.magnet", accepted=accepted)
    return gap


def _copper_block(design: Design) -> Block:
    """Return the least rectangle that holds the driven windings, m."""
    driven = {winding.name for winding in design.driven_windings}
    blocks = [
        section.block
        for coil in wound_coils(design)
        if coil.winding.name in driven
        for section in coil.sections
    ]
    return Block(
        min(block.inner_radius for block in blocks),
        max(block.outer_radius for block in blocks),
        min(block.bottom for block in blocks),
        max(block.top for block in blocks),
    )


def _checked_distances(
    distances: Sequence[float] | None, gap: float, room: Block, post: float
) -> tuple[float, ...]:
    """Return distances in m at which a winding keeps some room."""
    most = (1.0 - LEAST_LEFT) * (room.outer_radius - post)
    if distances is None:
        own = room.inner_radius - post
        usual = [x * gap for x in DISTANCES if x * gap <= most and abs(x * gap - own) > NEAR * gap]
        return tuple(sorted([*usual, own] if 0.0 < own <= most else usual)) or (0.5 * most,)
    accepted = f"rising lengths from above 0 to {1e3 * most:.4g} mm"
    values = [number(distance, "distances", accepted) for distance in distances]
    if not values or sorted(set(values)) != values or values[0] <= 0.0 or values[-1] > most:
        raise InputError("not usable", key="distances", value=list(distances), accepted=accepted)
    own, rounding = room.inner_radius - post, 1e-9 * post
    return tuple(own if abs(value - own) < rounding else value for value in values)


def _strips(edges: Sequence[float], room: Block, post: float) -> list[Winding]:
    """Return the winding cut at all distances, each strip as a winding of its own."""
    radii = [*(post + edge for edge in edges), room.outer_radius]
    return [
        Winding(1, replace(room, inner_radius=inner, outer_radius=outer), f"strip {index}")
        for index, (inner, outer) in enumerate(pairwise(radii))
    ]


def _spread_gap(design: Design, gap: Gap) -> Gap:
    """Return a filling of the whole post with the reluctance of gap and post together."""
    height, core = design.core.window_height, design.material.initial_permeability
    length = (1.0 - SLIVER) * height
    over_permeability = gap.length / gap.permeability + (length - gap.length) / core
    return Gap(length, permeability=length / over_permeability)


@dataclass(frozen=True, eq=False)
class _Squares:
    """Squared field of one gap: of windings and layers at each distance, and at the copper."""

    windings: Array
    layers: Array
    at_copper: float


def _squares(
    design: Design, edges: tuple[float, ...], distances: Sequence[float], own: float
) -> _Squares:
    """Return the squared field of windings that begin, and of layers that lie, at the distances.

    One mesh serves all: strips carry the current or not. `own` is the edge where the winding of the
    layers' field begins.
    """
    problem = field_problem(design)
    strips = [f"winding {winding.name}" for winding in design.windings]
    areas = [winding.block.area for winding in design.windings if winding.block is not None]

    def carrying(first: int) -> FieldProblem:
        density = 1.0 / sum(areas[first:])
        return replace(problem, turns_per_area=dict.fromkeys(strips[first:], density))

    whole = adapted_solution(carrying(0), 1.0, TOLERANCE)[0]
    close = agreeing_solution(whole, strips, FIELD_ACCURACY)
    fields = _fields_of([carrying(first) for first in range(len(edges))], close)
    starts = [edges.index(distance) for distance in distances]
    windings = [fields[i].squared_in(strips[i:]) / sum(areas[i:]) for i in starts]
    *layers, at_copper = (
        _along_layer(fields[edges.index(own)], design, distance) for distance in (*distances, own)
    )
    return _Squares(np.array(windings), np.array(layers), at_copper)


def _fields_of(problems: Sequence[FieldProblem], known: FieldSolution) -> list[RippleField]:
    """Return the fields of one ampere in other turns on the mesh of a linear solution."""
    sides, flux = known.sides, known.flux
    matrix = flux.side.hessian(flux.field, flux.secant, flux.tangent)
    loads = [
        flux_side(problem, sides.discretisation, sides.laws, flux.side.numbering).load
        for problem in problems
    ]
    rates = solved(matrix, np.stack(loads, axis=1), flux.side.numbering.ordering)
    return [RippleField(known, 0.0, flux.side.change(rate)) for rate in rates.T]


def _along_layer(field: RippleField, design: Design, distance: float) -> float:
    """Return the mean of |B|^2 in T2 along the height of the winding at a distance in m."""
    block = design.windings[0].block
    assert block is not None
    z = block.bottom + (np.arange(ALONG) + 0.5) / ALONG * (block.top - block.bottom)
    r = np.full(ALONG, design.core.turned.post_radius + distance)
    return float(np.mean(np.sum(field.at_points(np.stack([r, z])) ** 2, axis=0)))
