"""The field problem of a design."""

from __future__ import annotations

from femag.design import Design, meshed_section, turns_per_area
from femag.field.core_factor import core_curve
from femag.field.problem import FieldProblem
from femag.geometry import Section, gap_permeabilities, gap_remanences
from femag.materials import LinearCurve, MagnetisationCurve


def field_problem(design: Design, section: Section | None = None) -> FieldProblem:
    """Return the field problem of a design, on `section` instead of its meshed one if given."""
    section = section or meshed_section(design)
    fillings = {
        name: LinearCurve(permeability)
        for name, permeability in gap_permeabilities(design.core, design.gaps).items()
        if permeability != 1.0
    }
    core = core_curve(design.core, design.material)
    curves: dict[str, MagnetisationCurve] = {}
    for region in section.regions:
        if region.role == "core":
            curves[region.name] = core
        elif region.name in fillings:
            curves[region.name] = fillings[region.name]
    remanences = gap_remanences(design.core, design.gaps)
    return FieldProblem(section, curves, turns_per_area(design), remanences)
