"""Forces along z from the stress of the field, which both sides give.

T = B H - w'(H) 1 in every material; in air that is Maxwell's. Its divergence is the force density:
J x B in a winding, none inside of a homogeneous material, so that the core is pulled at its faces
only. The force on what a weight counts is the integral of T . grad(weight): no surface has to be
meshed, and where the weight is constant the field plays no part.

The same integral is the derivative of the discrete co-energy of either side, at fixed unknowns and
current, when the nodes of the mesh move along z by the weight: B is carried along as a flux, H as
a circulation, and the turns with the mesh.

References
----------
J. L. Coulomb, "A methodology for the determination of global electromechanical quantities from a
finite element analysis and its application to the evaluation of magnetic forces, torques and
stiffness", IEEE Trans. Magn. 19 (1983) 2514 (from memory); J. R. Melcher, Continuum
Electromechanics, MIT Press 1981, section 3.10, for the stress of nonlinear materials (from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.field.flux_side import turn_density
from femag.field.newton import Minimum
from femag.quantities.inside_elements import from_quadrature, located
from femag.units import MU_0

Array = NDArray[np.float64]
OfSides = tuple[float, float]
"""From the flux side and from the potential side."""

CUT_POINTS = 48
"""Points of the quadrature along a cut."""


@dataclass(frozen=True)
class SideField:
    """The whole field of one side at the quadrature points.

    Parameters
    ----------
    b, h : array, (elements, 2, points)
        Flux density in T and field strength in A/m.
    coenergy : array, (elements, points)
        Co-energy density w'(H), J/m3; without what a magnet has at H = 0.
    """

    b: Array
    h: Array
    coenergy: Array

    @property
    def axial_stress(self) -> Array:
        """What crosses a surface along r and along z of axial momentum, N/m2, (e, 2, points)."""
        flow = self.b * self.h[:, 1:]
        flow[:, 1] -= self.coenergy
        return np.asarray(flow)


@dataclass(frozen=True)
class Stress:
    """The stress of a solution.

    Parameters
    ----------
    solution : FieldSolution
        Both fields.
    """

    solution: FieldSolution

    @cached_property
    def fields(self) -> tuple[SideField, SideField]:
        """Of the flux side and of the potential side."""
        return _flux_field(self.solution.flux), _potential_field(self.solution)

    @cached_property
    def element_stress(self) -> tuple[Array, Array]:
        """Integrals of the axial stress over every element, N m, (elements, 2), of both sides."""
        weight = self.solution.sides.discretisation.weight[:, None]
        flux, potential = (np.sum(weight * f.axial_stress, axis=2) for f in self.fields)
        return np.asarray(flux), np.asarray(potential)

    @cached_property
    def slopes(self) -> Array:
        """Gradients of the nodes' linear functions on every element, 1/m, (elements, 2, 3)."""
        triangles = self.solution.sides.mesh.triangles
        first, second, third = triangles.p[:, triangles.t].transpose(1, 0, 2)
        (r1, z1), (r2, z2) = second - first, third - first
        one, other = np.array([z2, -r2]), np.array([-z1, r1])
        slopes = np.stack([-one - other, one, other]) / (r1 * z2 - z1 * r2)
        return np.asarray(slopes.transpose(2, 1, 0))

    def work(self, weight: Array) -> OfSides:
        """Return the integral of T . grad(weight), N, for weights of the mesh's nodes (nodes,).

        It is what a motion by `weight` m along z takes from the co-energy, over m.
        """
        nodal = weight[self.solution.sides.mesh.triangles.t.T]
        gradient = np.einsum("ecn,en->ec", self.slopes, nodal)
        flux, potential = (float(np.sum(own * gradient)) for own in self.element_stress)
        return flux, potential

    def force_on_turns(self, weight: Array) -> OfSides:
        """Return the axial force on the turns in N, each counted by nodal weights (nodes,)."""
        turns, volume = self._turns, self.solution.sides.discretisation.weight
        carrying = np.flatnonzero(turns)
        nodal = weight[self.solution.sides.mesh.triangles.t.T[carrying]]
        share = (nodal @ self._linears) * volume[carrying] * turns[carrying, None]
        current = self.solution.current
        flux, potential = (-current * float(np.sum(share * f.b[carrying, 0])) for f in self.fields)
        return flux, potential

    @property
    def slopes_by_coil_place(self) -> tuple[OfSides, OfSides]:
        """Derivatives of the co-energy by a shift of all driven turns, J/m.

        First along r, then along z: the force on the turns, which is what the energies change by
        when the turns move through a fixed mesh. Along z it is zero where z = 0 is a mirror plane.
        """
        sides = self.solution.sides
        ampere_turns = self.solution.current * self._turns[:, None] * sides.discretisation.weight
        radial = [float(np.sum(ampere_turns * f.b[:, 1])) for f in self.fields]
        if sides.mesh.section.copies == 2:
            return (radial[0], radial[1]), (0.0, 0.0)
        axial = [-float(np.sum(ampere_turns * f.b[:, 0])) for f in self.fields]
        return (radial[0], radial[1]), (axial[0], axial[1])

    def pull_of_cut(self, inner: float, outer: float, height: float) -> OfSides:
        """Return what a horizontal cut through a solid adds to the pull across it, N.

        In a slit without width B along z and H along r are those of the solid: its stress is
        Bz^2/(2 mu0) - mu0 Hr^2/2, and the solid's own is taken off.

        Parameters
        ----------
        inner, outer, height : float
            Where the cut is, m.
        """
        points, weights = np.polynomial.legendre.leggauss(CUT_POINTS)
        radius = inner + (outer - inner) * (points + 1.0) / 2.0
        ring = np.pi * (outer - inner) * weights * radius
        element, local = located(self.solution, np.array([radius, np.full(CUT_POINTS, height)]))
        spread = from_quadrature(self.solution, local)
        pulls = []
        for own in self.fields:
            bz, hr = (np.sum(spread * f[element], axis=1) for f in (own.b[:, 1], own.h[:, 0]))
            solid = np.sum(spread * own.axial_stress[element, 1], axis=1)
            slit = bz**2 / (2.0 * MU_0) - 0.5 * MU_0 * hr**2
            pulls.append(float(np.sum(ring * (slit - solid))))
        return pulls[0], pulls[1]

    @property
    def _turns(self) -> Array:
        """Turns per area of every element, 1/m2, (elements,)."""
        sides = self.solution.sides
        return turn_density(sides.problem.turns_per_area, sides.discretisation)[:, 0]

    @property
    def _linears(self) -> Array:
        """The nodes' linear functions at the quadrature points, (3, points)."""
        x, y = self.solution.sides.discretisation.basis.quadrature[0]
        return np.stack([1.0 - x - y, x, y])


def _flux_field(flux: Minimum) -> SideField:
    """Return the field of the flux side: it holds B less the remanence of magnets."""
    side = flux.side
    b = flux.field if side.fixed is None else flux.field - side.fixed
    h = flux.secant[:, None] * flux.field
    energy = side.density(np.hypot(flux.field[:, 0], flux.field[:, 1]))
    return SideField(b, h, np.sum(b * h, axis=1) - energy)


def _potential_field(solution: FieldSolution) -> SideField:
    """Return the field of the potential side: it holds H plus remanence over permeability."""
    found, laws = solution.potential, solution.sides.laws
    side = found.side
    h = found.field if side.fixed is None else found.field - side.fixed
    b = found.secant[:, None] * found.field
    coenergy = side.density(np.hypot(found.field[:, 0], found.field[:, 1]))
    return SideField(b, h, coenergy - laws.remanence**2 / (2.0 * laws.permeability))
