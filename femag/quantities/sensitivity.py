"""Derivatives of the co-energy by a design's dimensions and materials, without another solution.

At a minimiser the functional does not change to first order with the unknowns, so that its
derivative by a dimension is that at fixed unknowns on a mesh that moves with the dimension: exact
for the discrete energies of either side. It is taken as a central difference of a few energies.

References
----------
J. L. Coulomb, "A methodology for the determination of global electromechanical quantities from a
finite element analysis and its application to the evaluation of magnetic forces, torques and
stiffness", IEEE Trans. Magn. 19 (1983) 2514 (cited from memory).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
from skfem import Basis, ElementTriP1, condense
from skfem.models.poisson import laplace

from femag.design import Design
from femag.errors import InputError
from femag.field.bounds import FieldSolution, both_sides
from femag.field.design_problem import field_problem
from femag.field.newton import solved
from femag.field.problem import FieldProblem
from femag.geometry import Section
from femag.mesh import SectionMesh, moved_mesh

Array = NDArray[np.float64]
Change = Callable[[Design, float], Design]
"""A design with something changed by an amount."""


def coenergy_derivative(
    solution: FieldSolution, design: Design, change: Change, step: float
) -> tuple[float, float]:
    """Return dW'/dp of the flux side and of the potential side, J per unit of p.

    Parameters
    ----------
    solution : FieldSolution
        The solution of the design.
    design : Design
        The design.
    change : callable
        The design with its parameter p changed by an amount; no region may come or go.
    step : float
        Change for the central difference, small beside the parameter.

    Raises
    ------
    InputError
        If the changed design has other regions.
    """
    less, more = (field_problem(change(design, sign * step)) for sign in (-1.0, 1.0))
    return coenergy_slope(solution, less, more, 2.0 * step)


def coenergy_slope(
    solution: FieldSolution, less: FieldProblem, more: FieldProblem, apart: float
) -> tuple[float, float]:
    """Return the derivative of the co-energy of both sides between two problems near a solution.

    Parameters
    ----------
    solution : FieldSolution
        The solution half way between the two.
    less, more : FieldProblem
        The same regions, with a parameter a little smaller and a little larger.
    apart : float
        Distance of the two parameters.
    """
    low, high = (np.array(energies_near(solution, problem)) for problem in (less, more))
    flux, potential = (high - low) / apart
    return float(flux), float(potential)


def energies_near(solution: FieldSolution, problem: FieldProblem) -> tuple[float, float]:
    """Return both sides' co-energies in J for the unknowns of a solution in a changed problem."""
    old = solution.sides
    mesh = deformed_mesh(old.mesh, problem.section)
    sides = both_sides(problem, mesh, old.discretisation.order, numbered_as=old)
    return (
        -sides.flux.functional(solution.flux.x, solution.current),
        sides.potential.functional(solution.potential.x, solution.current),
    )


def deformed_mesh(mesh: SectionMesh, section: Section) -> SectionMesh:
    """Return a mesh whose nodes follow the outlines of its regions to those of another section.

    Nodes on an outline keep their place between its corners; the others follow smoothly.
    """
    points = mesh.triangles.p.T
    moves = np.full(points.shape, np.nan)
    for start, end, new_start, new_end in _edges(mesh.section, section):
        along = end - start
        share = (points - start) @ along / (along @ along)
        off = np.hypot(*(points - start - share[:, None] * along).T)
        on = (off < 1e-9 * np.ptp(points)) & (share > -1e-9) & (share < 1.0 + 1e-9)
        moves[on] = (new_start + share[on, None] * (new_end - new_start)) - points[on]
    return moved_mesh(mesh, section, points.T + _smooth(mesh, moves).T)


def _edges(old: Section, new: Section) -> list[tuple[Array, Array, Array, Array]]:
    """Return start and end of every edge of the old section, and where they are in the new one.

    The longest come first: where an outline ends on the middle of another one, the shorter edges,
    which come later, say how that point moves.
    """
    if [r.name for r in old.regions] != [r.name for r in new.regions]:
        raise InputError("the change adds or takes away a region", key="change")
    pairs = [(old.domain, new.domain)]
    pairs += [(a.polygon, b.polygon) for a, b in zip(old.regions, new.regions, strict=True)]
    edges = []
    for before, after in pairs:
        if len(before) != len(after):
            raise InputError("the change adds or takes away a corner", key="change")
        p, q = np.asarray(before), np.asarray(after)
        edges += list(zip(p, np.roll(p, -1, axis=0), q, np.roll(q, -1, axis=0), strict=True))
    return sorted(edges, key=lambda edge: -float(np.hypot(*(edge[1] - edge[0]))))


def _smooth(mesh: SectionMesh, moves: Array) -> Array:
    """Return moves of all nodes (n, 2): given ones, and harmonic in between."""
    given = np.flatnonzero(~np.isnan(moves[:, 0]))
    matrix = laplace.assemble(Basis(mesh.triangles, ElementTriP1()))
    found = np.where(np.isnan(moves), 0.0, moves)
    for axis in range(2):
        if np.any(found[given, axis]):
            free, load, known, inside = condense(matrix, x=found[:, axis], D=given)
            known[inside] = solved(csc_matrix(free), load)
            found[:, axis] = known
    return found
