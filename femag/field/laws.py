"""Material laws at the quadrature points, for both sides.

Both sides ask for the same two numbers: the secant (H/B or B/H) and the tangent (dH/dB or
dB/dH) at a field magnitude; the Hessian of either energy follows from them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.problem import FieldProblem
from femag.materials import MagnetisationCurve
from femag.mesh import SectionMesh
from femag.units import MU_0

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True)
class Laws:
    """Materials on a mesh.

    Parameters
    ----------
    permeability : array, (elements, 1)
        Initial permeability in H/m, that of the linear materials.
    saturating : tuple of (curve, elements)
        The nonlinear materials and where they are.
    remanence : array, (elements, 1)
        Remanence along z in T, of magnets only, which are linear.
    """

    permeability: Array
    saturating: tuple[tuple[MagnetisationCurve, Index], ...]
    remanence: Array

    @property
    def has_magnets(self) -> bool:
        """Whether any element has a remanence."""
        return bool(np.any(self.remanence))

    def magnet_energy(self, weight: Array) -> float:
        """Return the integral of |Br|^2 / (2 mu) in J, for weights (elements, points) in m3."""
        return float(np.sum(weight * self.remanence**2 / (2.0 * self.permeability)))

    def of_flux_density(self, b: Array) -> tuple[Array, Array]:
        """Return H/B and dH/dB, (elements, points), at magnitudes `b` in T."""
        secant = np.broadcast_to(1.0 / self.permeability, b.shape).copy()
        tangent = secant.copy()
        for curve, elements in self.saturating:
            part = b[elements]
            h = curve.field_strength(part)
            secant[elements] = _ratio(h, part, secant[elements])
            tangent[elements] = 1.0 / curve.differential_permeability(h)
        return secant, tangent

    def of_field_strength(self, h: Array) -> tuple[Array, Array]:
        """Return B/H and dB/dH, (elements, points), at magnitudes `h` in A/m."""
        secant = np.broadcast_to(self.permeability, h.shape).copy()
        tangent = secant.copy()
        for curve, elements in self.saturating:
            part = h[elements]
            secant[elements] = _ratio(curve.flux_density(part), part, secant[elements])
            tangent[elements] = curve.differential_permeability(part)
        return secant, tangent

    def energy_density(self, b: Array) -> Array:
        """Return the integral of H dB, J/m3, (elements, points)."""
        density = 0.5 * b**2 / self.permeability
        for curve, elements in self.saturating:
            density[elements] = curve.energy_density(b[elements])
        return density

    def coenergy_density(self, h: Array) -> Array:
        """Return the integral of B dH, J/m3, (elements, points)."""
        density = 0.5 * h**2 * self.permeability
        for curve, elements in self.saturating:
            density[elements] = curve.coenergy_density(h[elements])
        return density


def material_laws(problem: FieldProblem, mesh: SectionMesh) -> Laws:
    """Return the laws of a problem's materials on a mesh."""
    curves = [problem.curve_of(name) for name in mesh.names]
    initial = MU_0 * np.array([curve.initial_permeability for curve in curves])
    nonlinear = dict.fromkeys(curve for curve in curves if not curve.is_linear)
    saturating = tuple(
        (curve, np.flatnonzero(np.array([c == curve for c in curves])[mesh.region]))
        for curve in nonlinear
    )
    remanence = np.array([problem.remanences.get(name, 0.0) for name in mesh.names])
    return Laws(initial[mesh.region][:, None], saturating, remanence[mesh.region][:, None])


def axial_field(magnitude: Array, points: int) -> Array | None:
    """Return a field along z (elements, 2, points) from (elements, 1); None if it is zero."""
    if not np.any(magnitude):
        return None
    field = np.zeros((len(magnitude), 2, points))
    field[:, 1] = magnitude
    return field


def _ratio(numerator: Array, denominator: Array, at_zero: Array) -> Array:
    tiny = denominator < 1e-30
    return np.where(tiny, at_zero, numerator / np.where(tiny, 1.0, denominator))
