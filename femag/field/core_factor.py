"""The factor that gives a core's axisymmetric equivalent the ungapped core's own reluctance."""

from __future__ import annotations

from functools import cache

from femag.design import FAR_RADIUS
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.problem import FieldProblem
from femag.geometry import (
    Core,
    PotCore,
    Region,
    TurnedCore,
    core_factor,
    open_section,
    polygon_area,
    turned_regions,
    upper_half,
)
from femag.materials import LinearCurve, MagnetisationCurve, ScaledCurve
from femag.units import MU_0

GUIDING = 1e4
"""Relative permeability at which hardly any flux leaves an ungapped core."""
ACCURACY = 5e-3
"""Half width between the bounds; their middle is much closer."""


def core_curve(core: Core, material: MagnetisationCurve) -> MagnetisationCurve:
    """Return the curve that fills the solved core: the material's, at H times one factor."""
    if isinstance(core, PotCore):
        return material
    factor = solved_core_factor(core.turned, core.window_height) / core_factor(core)
    return ScaledCurve(material, factor)


def solved_core_factor(turned: TurnedCore, window_height: float) -> float:
    """Return the sum of length over area in 1/m of an ungapped core of revolution in the field.

    It is mu/L of one turn that fills the window (height in m), at a permeability so high that
    the flux stays in the core.
    """
    return factor_of_coenergy(ungapped_solution(turned, window_height).coenergy.value)


def factor_of_coenergy(coenergy: float) -> float:
    """Return the core factor in 1/m that a co-energy in J of an ungapped problem means."""
    return MU_0 * GUIDING / (2.0 * coenergy)


@cache
def ungapped_solution(turned: TurnedCore, window_height: float) -> FieldSolution:
    """Return the fields of an ungapped core of revolution at 1 A; its window height in m."""
    problem = ungapped_problem(turned, window_height)
    return adapted_solution(problem, 1.0, ACCURACY)[0]


def ungapped_problem(turned: TurnedCore, window_height: float) -> FieldProblem:
    """Return the problem of an ungapped core of revolution with one turn in all of the window."""
    regions = turned_regions(turned, window_height / 2)
    window = next(region for region in regions if region.name == "window")
    coil = Region("winding", "winding", window.polygon, parent="window")
    extent = max(turned.ring_outer_radius, window_height / 2 + turned.largest_thickness)
    section = upper_half(open_section((*regions, coil), FAR_RADIUS * extent))
    iron = LinearCurve(GUIDING)
    return FieldProblem(
        section,
        {region.name: iron for region in section.regions if region.role == "core"},
        {"winding": 1.0 / polygon_area(window.polygon)},
    )
