"""Derivatives of co-energy, inductance and AL by every parameter of a design, from one solution."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from femag.design import Design
from femag.errors import InputError
from femag.field.bounds import FieldSolution
from femag.field.core_factor import (
    factor_of_coenergy,
    ungapped_problem,
    ungapped_solution,
)
from femag.field.laws import material_laws
from femag.field.problem import FieldProblem
from femag.geometry import Core, core_factor
from femag.materials import MagnetisationCurve, ScaledCurve
from femag.quantities.off_nominal import (
    PLACES,
    SHARES,
    Parameter,
    off_nominal_problem,
    parameters_of,
)
from femag.quantities.sensitivity import coenergy_slope, energies_near
from femag.quantities.stress import OfSides, Stress

STEPS = (1e-5, 1e-6, 1e-7)
"""Changes of a parameter for its derivative, over its value; the first that keeps all corners."""


@dataclass(frozen=True)
class Sensitivity:
    """What a small change of one parameter does.

    Parameters
    ----------
    parameter : Parameter
        Its name, nominal value and unit.
    coenergy_of_sides : tuple of float
        Derivative of the co-energy, J per unit of the parameter, of the flux side and of the
        potential side: that of each discrete energy; estimates, no bounds.
    inductance_of_sides : tuple of float
        Of the energy inductance 2 W'/I^2, H per unit.
    al_of_sides : tuple of float
        Of the inductance over turns squared, H per unit.
    """

    parameter: Parameter
    coenergy_of_sides: OfSides
    inductance_of_sides: OfSides
    al_of_sides: OfSides

    @property
    def inductance(self) -> float:
        """Derivative of the energy inductance, H per unit: mean of both sides."""
        return sum(self.inductance_of_sides) / 2


def sensitivities_of(
    design: Design, solution: FieldSolution, names: Sequence[str] | None = None
) -> tuple[Sensitivity, ...]:
    """Return the derivatives by the parameters of a design, by name or all of them.

    Sizes move the mesh, permeability and saturation change the energy densities, and turns shift
    through the field.

    Raises
    ------
    InputError
        If there is a magnet, whose own energy the inductance leaves out, or a parameter that the
        design has not.
    """
    if solution.sides.laws.has_magnets:
        raise InputError(
            "no derivatives with a magnet", key="gap.magnet", accepted="a gap without a magnet"
        )
    own = {parameter.name: parameter for parameter in parameters_of(design)}
    wanted = own if names is None else names
    for name in wanted:
        if name not in own:
            raise InputError("this design has no such parameter", key=name, accepted=", ".join(own))
    return tuple(_sensitivity(design, solution, own[name]) for name in wanted)


def _sensitivity(design: Design, solution: FieldSolution, parameter: Parameter) -> Sensitivity:
    if parameter.name in PLACES:
        slopes = Stress(solution).slopes_by_coil_place[PLACES.index(parameter.name)]
    elif parameter.name in SHARES:
        slopes = _material_slopes(solution, *_neighbours(design, parameter, STEPS[0]))
    else:
        slopes = _size_slopes(design, solution, parameter)
    of_inductance = 2.0 / design.current**2
    inductance = slopes[0] * of_inductance, slopes[1] * of_inductance
    al = inductance[0] / design.turns**2, inductance[1] / design.turns**2
    return Sensitivity(parameter, slopes, inductance, al)


def _size_slopes(design: Design, solution: FieldSolution, parameter: Parameter) -> OfSides:
    """Return the co-energy's derivative by a size, J/m.

    The plates that stand for straight ones have corners where they bend; a change may add one.
    """
    for share in STEPS[:-1]:
        less, more = _neighbours(design, parameter, share * parameter.value)
        if _same_corners(less, solution.sides.problem) and _same_corners(more, less):
            return coenergy_slope(solution, less, more, 2.0 * share * parameter.value)
    step = STEPS[-1] * parameter.value
    return coenergy_slope(solution, *_neighbours(design, parameter, step), 2.0 * step)


def _same_corners(one: FieldProblem, other: FieldProblem) -> bool:
    first, second = (
        [(region.name, len(region.polygon)) for region in problem.section.regions]
        for problem in (one, other)
    )
    return first == second


def _neighbours(
    design: Design, parameter: Parameter, step: float
) -> tuple[FieldProblem, FieldProblem]:
    """Return the problems with a parameter smaller and larger by a step."""
    law = partial(_nearby_core_curve, design.core)
    less, more = (
        off_nominal_problem(design, {parameter.name: sign * step}, law) for sign in (-1.0, 1.0)
    )
    return less, more


def _nearby_core_curve(
    nominal: Core, core: Core, material: MagnetisationCurve
) -> MagnetisationCurve:
    """Return the curve of a core close to a nominal one: from its ungapped fields on a moved mesh.

    Those of a mesh of its own would differ by more than the change.
    """
    if core.family == "pot":
        return material
    solution = ungapped_solution(nominal.turned, nominal.window_height)
    coenergies = energies_near(solution, ungapped_problem(core.turned, core.window_height))
    return ScaledCurve(material, factor_of_coenergy(float(np.mean(coenergies))) / core_factor(core))


def _material_slopes(solution: FieldSolution, less: FieldProblem, more: FieldProblem) -> OfSides:
    """Return the co-energy's derivative by a material at fixed fields, J a unit of share."""
    sides, apart = solution.sides, 2.0 * STEPS[0]
    weight = sides.discretisation.weight
    b, h = (np.hypot(found.field[:, 0], found.field[:, 1])
            for found in (solution.flux, solution.potential))  # fmt: skip
    low, high = (material_laws(problem, sides.mesh) for problem in (less, more))
    flux = -np.sum(weight * (high.energy_density(b) - low.energy_density(b)))
    potential = np.sum(weight * (high.coenergy_density(h) - low.coenergy_density(h)))
    return float(flux) / apart, float(potential) / apart
