"""Both sides together: the co-energy between two bounds, and where the bracket is wide.

For every admissible u and Omega, -F(u) <= W' <= G(Omega), and the width is the integral of
w(B) + w'(H) - B . H, which is nowhere negative (Fenchel and Young).

References
----------
P. Ladeveze and D. Leguillon, "Error estimate procedure in the finite element method and
applications", SIAM J. Numer. Anal. 20 (1983) 485.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from femag.field.discretisation import QUADRATURE_ORDER, Discretisation, discretise
from femag.field.flux_side import flux_side
from femag.field.laws import Laws, material_laws
from femag.field.newton import EXACT, Minimum, evaluated, minimum
from femag.field.potential_side import potential_side
from femag.field.problem import FieldProblem
from femag.field.side import Side
from femag.mesh import SectionMesh
from femag.units import with_common_unit

Array = NDArray[np.float64]
Index = NDArray[np.int64]

FINE_ORDER = 10
"""Quadrature of the final energies of saturating materials, which are no polynomials."""


@dataclass(frozen=True)
class Bounds:
    """A quantity between two bounds.

    Parameters
    ----------
    lower, upper : float
        The bounds.
    unit : str
        SI unit, for print.
    """

    lower: float
    upper: float
    unit: str = ""

    @property
    def value(self) -> float:
        """The midpoint."""
        return 0.5 * (self.lower + self.upper)

    @property
    def half_width(self) -> float:
        """Half the distance between the bounds."""
        return 0.5 * (self.upper - self.lower)

    @property
    def relative_half_width(self) -> float:
        """Half width over the value; infinite where the value is zero."""
        return self.half_width / abs(self.value) if self.value else math.inf

    def scaled(self, factor: float, unit: str) -> Bounds:
        """Return the bounds of a positive multiple."""
        return Bounds(self.lower * factor, self.upper * factor, unit)

    def __str__(self) -> str:
        known = min(max(self.relative_half_width, 1e-9), 1.0)
        digits = min(1 - math.floor(math.log10(known)), 9)
        texts = with_common_unit((self.value, self.lower, self.upper), self.unit, digits)
        lower, upper = (text.split()[0] for text in texts[1:])
        return f"{texts[0]} ({lower} .. {upper})"


@dataclass(frozen=True)
class Sides:
    """A problem discretised on one mesh for both sides."""

    problem: FieldProblem
    discretisation: Discretisation
    laws: Laws
    flux: Side
    potential: Side

    @property
    def mesh(self) -> SectionMesh:
        """The mesh that both sides share."""
        return self.discretisation.mesh

    @property
    def unknowns(self) -> int:
        """Unknowns of both sides together."""
        return self.flux.size + self.potential.size


@dataclass(frozen=True)
class FieldSolution:
    """Both fields of one current.

    Parameters
    ----------
    sides : Sides
        The discretised problem.
    current : float
        A.
    flux, potential : Minimum
        Minimisers of the two sides; their fields are B and H, less and plus remanence in magnets.
    idle : FieldSolution, optional
        Fields without current on the same mesh; with magnets only.
    """

    sides: Sides
    current: float
    flux: Minimum
    potential: Minimum
    idle: FieldSolution | None = None

    @property
    def coenergy(self) -> Bounds:
        """Bounds of the co-energy, J."""
        return Bounds(-self.flux.functional, self.potential.functional, "J")

    @cached_property
    def local_gap(self) -> Array:
        """Share of each element in the width of the bracket, J, (elements,)."""
        return _local_gap(self.sides, self.flux, self.potential)

    @property
    def flux_linkage_of_sides(self) -> tuple[float, float]:
        """Flux linkage in Wb from either side: their difference estimates an error, bounds none."""
        potential = self.sides.potential
        b = self.potential.secant[:, None] * self.potential.field
        from_potential = np.sum(potential.weight * np.sum(b * potential.source, axis=1))
        return float(self.sides.flux.load @ self.flux.x), float(from_potential)

    @property
    def unknowns(self) -> int:
        """Unknowns of both sides together."""
        return self.sides.unknowns


def both_sides(
    problem: FieldProblem,
    mesh: SectionMesh,
    order: int = QUADRATURE_ORDER,
    numbered_as: Sides | None = None,
) -> Sides:
    """Return a problem discretised on a mesh, with quadrature exact to degree `order`.

    The unknowns are in the order of those of `numbered_as`, on the same mesh, if it is given.
    """
    discretisation = discretise(mesh, order)
    laws = material_laws(problem, mesh)
    flux, potential = (
        (None, None)
        if numbered_as is None
        else (numbered_as.flux.numbering, numbered_as.potential.numbering)
    )
    return Sides(
        problem,
        discretisation,
        laws,
        flux_side(problem, discretisation, laws, flux),
        potential_side(problem, discretisation, laws, potential),
    )


def for_many_solutions(sides: Sides) -> Sides:
    """Return the same sides with their unknowns in an order that pays after a few solutions."""
    problem, discretisation, laws = sides.problem, sides.discretisation, sides.laws
    orders = [side.numbering.for_many_solutions() for side in (sides.flux, sides.potential)]
    return replace(
        sides,
        flux=flux_side(problem, discretisation, laws, orders[0]),
        potential=potential_side(problem, discretisation, laws, orders[1]),
    )


def field_solution(
    sides: Sides,
    current: float,
    start: Array | None = None,
    accuracy: float = EXACT,
) -> FieldSolution:
    """Return both fields at a current.

    Parameters
    ----------
    sides : Sides
        The discretised problem.
    current : float
        A.
    start : array, (elements, 2, points), optional
        H of a nearby solution to start from.
    accuracy : float
        Accuracy of Newton's method; the bounds hold at any.
    Raises
    ------
    NumericalError
        If a side cannot be solved.
    """
    potential = minimum(sides.potential, current, start, accuracy)
    start_b = _start_of_flux_side(sides, potential) if sides.laws.saturating else None
    flux = minimum(sides.flux, current, start_b, accuracy)
    return FieldSolution(sides, current, flux, potential)


def _start_of_flux_side(sides: Sides, potential: Minimum) -> Array:
    """Return B of the potential side, less the remanence of magnets."""
    b = potential.secant[:, None] * potential.field
    return b if sides.flux.fixed is None else b + sides.flux.fixed


def exact_solution(solution: FieldSolution) -> FieldSolution:
    """Return a solution with Newton's method carried to rounding and energies integrated finely."""
    if not solution.sides.laws.saturating:
        return solution
    return finely_integrated(_converged(solution))


def _converged(solution: FieldSolution) -> FieldSolution:
    sides, current = solution.sides, solution.current
    flux = minimum(sides.flux, current, solution.flux.field)
    potential = minimum(sides.potential, current, solution.potential.field)
    idle = _converged(solution.idle) if solution.idle else None
    return replace(solution, flux=flux, potential=potential, idle=idle)


def finely_integrated(solution: FieldSolution, order: int = FINE_ORDER) -> FieldSolution:
    """Return a solution's fields with their energies integrated to degree `order`.

    Any admissible field gives a bound, so that fields found with few quadrature points may stay.
    """
    return _evaluated_on(both_sides(solution.sides.problem, solution.sides.mesh, order), solution)


def coenergy_on(sides: Sides, solution: FieldSolution) -> Bounds:
    """Return the bounds of the co-energy in J with the quadrature points of other sides."""
    current = solution.current
    return Bounds(
        -sides.flux.functional(solution.flux.x, current),
        sides.potential.functional(solution.potential.x, current),
        "J",
    )


def _evaluated_on(sides: Sides, solution: FieldSolution) -> FieldSolution:
    """Return a solution's fields on the same mesh with other quadrature points."""
    current = solution.current
    flux = evaluated(sides.flux, solution.flux, current)
    potential = evaluated(sides.potential, solution.potential, current)
    idle = _evaluated_on(sides, solution.idle) if solution.idle else None
    return FieldSolution(sides, current, flux, potential, idle)


def _local_gap(sides: Sides, flux: Minimum, potential: Minimum) -> Array:
    """Return the integral of w(B) + w'(H) - B . H over each element, J."""
    b, h = flux.field, potential.field
    density = (
        sides.laws.energy_density(np.hypot(b[:, 0], b[:, 1]))
        + sides.laws.coenergy_density(np.hypot(h[:, 0], h[:, 1]))
        - np.sum(b * h, axis=1)
    )
    if sides.flux.fixed is not None and sides.potential.fixed is not None:
        less, plus = sides.flux.fixed, sides.potential.fixed
        density = density + np.sum(b * plus + less * h - 0.5 * less * plus, axis=1)
    return np.asarray(np.sum(sides.discretisation.weight * density, axis=1))
