"""The field of a small change of the current: that of the ripple, per ampere.

Static: it follows the ripple without delay, as if no eddy current acted back on it, so that every
harmonic has the same field.
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.field.newton import Minimum, minimum
from femag.field.regional import elements_in
from femag.field.side import Side
from femag.field.tangent import flux_tangent, potential_tangent
from femag.mesh import SectionMesh
from femag.quantities.inside_elements import above_mirror, from_quadrature
from femag.units import MU_0

Array = NDArray[np.float64]

AT_ONCE = 50_000
"""Points that are located together, for memory."""


@dataclass(frozen=True)
class RippleField:
    """Flux density per ampere of a small change, in copper and air.

    Parameters
    ----------
    solution : FieldSolution
        Of the design; its mesh is used.
    bias : float
        Current about which the change is small, A.
    per_ampere : array, (elements, 2, points)
        B at the quadrature points of the mesh, T/A; in each element it is a quadratic.
    """

    solution: FieldSolution
    bias: float
    per_ampere: Array

    @property
    def mesh(self) -> SectionMesh:
        """The mesh."""
        return self.solution.sides.mesh

    def at_points(self, points: Array) -> Array:
        """Return (B_r, B_z) at points (2, n) of the whole section in m, (2, n), T/A."""
        inside, sign = above_mirror(self.solution, points)
        starts = range(0, points.shape[1], AT_ONCE)
        found = np.hstack([self._inside(inside[:, i : i + AT_ONCE]) for i in starts])
        return np.stack([sign * found[0], found[1]])

    def _inside(self, points: Array) -> Array:
        """Return (B_r, B_z) at points of the meshed part, from the element that holds each."""
        mapping = self.mesh.triangles.mapping()
        element = np.asarray(self.mesh.triangles.element_finder(mapping)(*points))
        local = mapping.invF(points[:, :, None], tind=element)
        weights = from_quadrature(self.solution, local[:, :, 0])
        return np.asarray(np.einsum("nq,ncq->cn", weights, self.per_ampere[element]))

    def squared_in(self, regions: Collection[str]) -> float:
        """Return the integral of |B|^2 over the volume of regions, T2 m3/A2, as exact as the field.

        Parameters
        ----------
        regions : collection of str
            Names; those that the mesh does not hold are left out.
        """
        elements = elements_in(self.solution, regions)
        b = self.per_ampere[elements]
        weight = self.solution.sides.discretisation.weight[elements]
        return float(np.sum(weight * np.sum(b**2, axis=1)))


def ripple_field(
    solution: FieldSolution, bias: float, side: Literal["flux", "potential"] = "flux"
) -> RippleField:
    """Return the field per ampere of a small change of the current about a bias.

    From the tangent problem at the bias; of a saturating core that is solved again on the mesh of
    the solution, from its field.

    Parameters
    ----------
    solution : FieldSolution
        Of the design at any current.
    bias : float
        A.
    side : {"flux", "potential"}
        B, or mu0 H.

    Raises
    ------
    NumericalError
        If the field at the bias cannot be solved.
    """
    if side == "flux":
        at_bias = _at(solution, solution.flux, bias)
        return RippleField(solution, bias, at_bias.side.change(flux_tangent(at_bias).rate))
    at_bias = _at(solution, solution.potential, bias)
    h = at_bias.side.source + at_bias.side.change(potential_tangent(at_bias).rate)
    return RippleField(solution, bias, MU_0 * h)


def _at(solution: FieldSolution, known: Minimum, current: float) -> Minimum:
    """Return a side's minimiser at a current; of a linear core any has the same tangent."""
    side = known.side
    if current == solution.current or not solution.sides.laws.saturating:
        return known
    if current == 0.0 and side.fixed is None:
        return _nothing(side)
    return minimum(side, current, known.field)


def _nothing(side: Side) -> Minimum:
    """Return the field without current and magnets."""
    x = np.zeros(side.size)
    field = side.field(x, 0.0)
    return Minimum(side, 0.0, x, field, *side.coefficients(field), ())
