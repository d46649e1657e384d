"""Mean flux density through cuts of the core: fluxes are exact differences of r A."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.design import Design
from femag.field.bounds import FieldSolution
from femag.geometry import Cut, core_cuts
from femag.quantities.inside_elements import flux_field, located, nodal_u

Array = NDArray[np.float64]


@dataclass(frozen=True)
class SectionMean:
    """The mean flux density through one cut.

    Parameters
    ----------
    name : str
        Where the cut lies.
    area : float
        Area of the surface of revolution, m2.
    flux_density : float
        Mean normal flux density, T, without sign.
    """

    name: str
    area: float
    flux_density: float


def section_means(design: Design, solution: FieldSolution) -> tuple[SectionMean, ...]:
    """Return the means through the core's cuts, the larger of both halves where they differ."""
    cuts = core_cuts(design.core, design.gaps)
    upper = np.abs(mean_flux_densities(solution, cuts))
    if solution.sides.mesh.section.copies == 1:
        lower = np.abs(mean_flux_densities(solution, [cut.mirrored() for cut in cuts]))
        upper = np.maximum(upper, lower)
    return tuple(
        SectionMean(cut.name, cut.area, float(mean)) for cut, mean in zip(cuts, upper, strict=True)
    )


def mean_flux_densities(solution: FieldSolution, cuts: Sequence[Cut]) -> Array:
    """Return the mean normal flux density in T of each cut, from the flux side.

    Parameters
    ----------
    solution : FieldSolution
        Both fields.
    cuts : sequence of Cut
        Their ends lie in the mesh.
    """
    ends = np.array([(cut.start, cut.end) for cut in cuts]).reshape(-1, 2).T
    flux = flux_through_discs(solution, ends).reshape(-1, 2)
    return np.asarray((flux[:, 1] - flux[:, 0]) / np.array([cut.area for cut in cuts]))


def flux_through_discs(solution: FieldSolution, points: Array) -> Array:
    """Return the flux in Wb through the disc inside each point: 2 pi r A = 2 pi r^2 u.

    Parameters
    ----------
    solution : FieldSolution
        Both fields.
    points : array, (2, n)
        r and z in m.
    """
    element, local = located(solution, points)
    u, _ = flux_field(solution, nodal_u(solution), local[:, :, None], element)
    return np.asarray(2.0 * np.pi * points[0] ** 2 * u[:, 0])
