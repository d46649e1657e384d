"""Pull between the halves of the core and between the faces of every gap.

Both are integrals of T . grad(weight), with a weight that is 1 on what is pulled down, 0 on what is
pulled up and in between elsewhere. They differ in where they look: virtual work moves the nodes of
the mesh smoothly, Maxwell's stress is taken in a shell half way between the two bodies, off the
edges where the field is singular. Forces on the turns are left out of either.

A solid that crosses the plane where the halves part, and what fills a gap, is thought cut there:
the pull is what the joint, or the spacer, is pressed with.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from femag.design import Design
from femag.field.bounds import FieldSolution
from femag.geometry import half_window_height, ring_pieces
from femag.geometry.gaps import GapPiece, piece_names, post_pieces, spacer_of
from femag.mesh import SectionMesh
from femag.quantities.nodal_weight import harmonic_weights, nodes_on, shell_weights
from femag.quantities.stress import OfSides, Stress

Array = NDArray[np.float64]
Index = NDArray[np.int64]


STRETCH_STEP = 1e-3
"""Change of a spacer over its thickness for the derivative of the gap that stands for it."""


@dataclass(frozen=True)
class Pull:
    """An attraction along the axis, at the design's current; above 0 where it closes the gap.

    Parameters
    ----------
    name : str
        What is pulled.
    area : float
        Area that bears it, m2.
    stress_of_sides, work_of_sides : tuple of float
        From Maxwell's stress and from virtual work, N: of the flux side and of the potential side.
        Their distances estimate the error and bound nothing.
    """

    name: str
    area: float
    stress_of_sides: OfSides
    work_of_sides: OfSides

    @property
    def by_stress(self) -> float:
        """From Maxwell's stress, N: mean of both sides."""
        return sum(self.stress_of_sides) / 2

    @property
    def by_work(self) -> float:
        """From virtual work, N: mean of both sides."""
        return sum(self.work_of_sides) / 2

    @property
    def force(self) -> float:
        """Mean of both ways, N."""
        return 0.5 * (self.by_stress + self.by_work)

    @property
    def pressure(self) -> float:
        """Force over the area that bears it, Pa."""
        return self.force / self.area


@dataclass(frozen=True)
class Force:
    """The pulls in a core.

    Parameters
    ----------
    halves : Pull
        Of the halves of the core, on what bears it.
    gaps : tuple of Pull
        Of the two faces of every gap, over the section of the leg; the post first, from below.
    """

    halves: Pull
    gaps: tuple[Pull, ...]


@dataclass(frozen=True)
class _Opening:
    """A gap of a leg: the leg's radii in m, and the weights of its parts below and above.

    `stretch` is what a ring that stands for straight legs opens by over what the legs do.
    """

    name: str
    piece: GapPiece
    radii: tuple[float, float]
    below: float
    above: float
    stretch: float = 1.0

    @property
    def area(self) -> float:
        """Section of the leg, m2."""
        return float(np.pi * (self.radii[1] ** 2 - self.radii[0] ** 2))

    @property
    def neutral(self) -> float:
        """Weight of all that is not one of its faces; that of the plate where it lies at one."""
        return self.piece.shares[0]

    @property
    def cuts(self) -> tuple[tuple[float, float, float], ...]:
        """Inner and outer radius and height in m of the cuts through what lies in the gap."""
        filled = self.piece.permeability != 1.0 or self.piece.remanence != 0.0
        inner = self.piece.shape.step_radius if self.piece.shape.closed else self.radii[0]
        return ((inner, self.radii[1], self.piece.middle),) if filled else ()

    @property
    def touching_cuts(self) -> tuple[tuple[float, float, float], ...]:
        """The same where a step leaves no gap."""
        if not self.piece.shape.closed:
            return ()
        lower, _ = self.piece.faces(*self.radii)
        return ((self.radii[0], self.piece.shape.step_radius, lower[0][1]),)


def force_of(design: Design, solution: FieldSolution) -> Force:
    """Return the pulls of a design's solution.

    Loose pieces of the post above the middle count to the upper half, those below it to the lower
    one; one across the middle stays where it is. Where a gap lies at a plate, the pull of its
    faces is that on the post.

    Parameters
    ----------
    design : Design
        The design.
    solution : FieldSolution
        Both fields at its current.
    """
    openings, stress = tuple(_openings(design)), Stress(solution)
    is_half = solution.sides.mesh.section.copies == 2
    solved_for = [o for o in openings if not is_half or o.piece.top > 0.0]
    weights = _weights(design, solution.sides.mesh, openings, solved_for)
    halves = _pull(stress, weights[0], 0.5, _cuts_of_halves(design, openings))
    found = {}
    for opening, weight in zip(solved_for, weights[1:], strict=True):
        twice = is_half and opening.piece.bottom > 0.0  # with its image below the plane
        cuts = [(1.0, *cut) for cut in opening.cuts]
        pull = _pull(stress, weight, opening.neutral, cuts, 0.5 if twice else 1.0)
        found[opening.radii, round(opening.piece.middle, 12)] = opening.stretch * pull
        halves = halves + (opening.stretch - 1.0) * pull
    gaps = tuple(
        _as_pull(o.name, o.area, found[o.radii, round(o.piece.middle * sign, 12)])
        for o in openings
        for sign in (1.0 if o in solved_for else -1.0,)
    )
    return Force(_as_pull(*_bearer(design, openings), halves), gaps)


def _as_pull(name: str, area: float, of_ways: Array) -> Pull:
    (one, other), (first, second) = of_ways.tolist()
    return Pull(name, area, (one, other), (first, second))


def _openings(design: Design) -> Iterator[_Opening]:
    """Yield every gap, of the post first, from below."""
    core, gaps = design.core, design.gaps
    turned, stretch = core.turned, _ring_stretch(design)
    leg = "ring" if core.family == "pot" else "leg"
    legs = (
        ("post", post_pieces(gaps, core.window_height), (turned.hole_radius, turned.post_radius)),
        (leg, ring_pieces(core, gaps), (turned.ring_inner_radius, turned.ring_outer_radius)),
    )
    for leg, pieces, radii in legs:
        between = [
            0.5 + 0.5 * float(np.sign(round(0.5 * (low.top + high.bottom), 12)))
            for low, high in pairwise(pieces)
        ]
        parts = (0.0, *between, 1.0)
        for name, piece, below, above in zip(
            piece_names(pieces, leg), pieces, parts, parts[1:], strict=False
        ):
            yield _Opening(name, piece, radii, below, above, stretch if leg != "post" else 1.0)


def _ring_stretch(design: Design) -> float:
    """Return how much longer the solved ring's gap gets over what the spacer does."""
    spacer = spacer_of(design.gaps)
    if spacer is None or design.core.family == "pot":
        return 1.0
    less, more = (
        design.core.ring_gap(share * spacer.length, spacer.filling[0])
        for share in (1.0 - STRETCH_STEP, 1.0 + STRETCH_STEP)
    )
    return (more - less) / (2.0 * STRETCH_STEP * spacer.length)


def _bearer(design: Design, openings: Sequence[_Opening]) -> tuple[str, float]:
    """Return what the halves are pressed on, and its area in m2."""
    turned = design.core.turned
    post = float(np.pi * (turned.post_radius**2 - turned.hole_radius**2))
    ring = "ring" if design.core.family == "pot" else "legs"
    opened = {opening.radii for opening in openings}
    if len(opened) == 2:
        return "spacer", post + turned.ring_area
    if opened:
        return f"joint of the {ring}", turned.ring_area
    return f"joints of post and {ring}", post + turned.ring_area


def _cuts_of_halves(
    design: Design, openings: Sequence[_Opening]
) -> list[tuple[float, float, float, float]]:
    """Return share, radii and height in m of every cut where the halves part."""
    turned = design.core.turned
    legs = {
        (turned.hole_radius, turned.post_radius),
        (turned.ring_inner_radius, turned.ring_outer_radius),
    }
    closed = legs - {opening.radii for opening in openings}
    return [
        *((1.0, *radii, 0.0) for radii in sorted(closed)),
        *((o.above - o.below, *c) for o in openings for c in (*o.cuts, *o.touching_cuts)),
    ]


def _pull(
    stress: Stress,
    weight: Array,
    neutral: float,
    cuts: Sequence[tuple[float, float, float, float]],
    share: float = 1.0,
) -> Array:
    """Return the pull of what a weight parts in N, (2, 2): first by stress, each of both sides."""
    extra = np.zeros(2)
    for part, inner, outer, height in cuts:
        if stress.solution.sides.mesh.section.copies == 2:
            height = abs(height)
        extra += part * np.array(stress.pull_of_cut(inner, outer, height))
    on_core = [
        np.add(stress.work(own), stress.force_on_turns(own - neutral))
        for own in (shell_weights(weight), weight)
    ]
    return np.asarray(share * np.array(on_core) + extra)


def _weights(
    design: Design, mesh: SectionMesh, openings: Sequence[_Opening], single: Sequence[_Opening]
) -> Array:
    """Return nodal weights (1 + single, nodes): of the halves, then of the faces of each gap.

    Given on the plates, on all faces of gaps, in the plane of symmetry and far away; harmonic in
    between.
    """
    neutral = np.array([0.5, *(opening.neutral for opening in single)])
    total = np.zeros((len(neutral), mesh.triangles.nvertices))
    count = np.zeros(mesh.triangles.nvertices)
    for nodes, values in _given(design, mesh, openings, single, neutral):
        total[:, nodes] += values[:, None]
        count[nodes] += 1
    bodies = np.flatnonzero(count)
    weights = np.tile(neutral[:, None], count.shape)
    weights[:, bodies] = total[:, bodies] / count[bodies]
    walls = mesh.triangles.facets[:, np.concatenate([mesh.walls["far"], mesh.walls["normal"]])]
    weights[:, walls.ravel()] = neutral[:, None]
    return harmonic_weights(mesh, weights, np.union1d(bodies, walls))


def _given(
    design: Design,
    mesh: SectionMesh,
    openings: Sequence[_Opening],
    single: Sequence[_Opening],
    neutral: Array,
) -> Iterator[tuple[Index, Array]]:
    """Yield nodes and their weights, one of each kind; a node where bodies touch comes twice."""
    for name, side in (("lower plate", 0.0), ("upper plate", 1.0)):
        if name in mesh.names:
            nodes = np.unique(mesh.triangles.t[:, mesh.elements_of(name)])
            yield nodes, np.array([side, *neutral[1:]])
    half_window = half_window_height(design.core, design.gaps)
    for opening in openings:
        own = np.array([False, *(opening == other for other in single)])
        for face, of_halves, of_gap in zip(
            opening.piece.faces(*opening.radii), (opening.below, opening.above), (0.0, 1.0),
            strict=True,
        ):  # fmt: skip
            if all(abs(z) == half_window for _, z in face):
                continue  # at a plate
            values = np.where(own, of_gap, neutral)
            values[0] = of_halves
            yield nodes_on(mesh, face), values
