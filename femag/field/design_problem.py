"""The field problem of a design."""

from __future__ import annotations

from collections.abc import Sequence

from femag.design import Design, meshed_section, turns_per_area
from femag.field.core_factor import core_curve
from femag.field.problem import FieldProblem
from femag.geometry import Core, Gap, Section, gap_permeabilities, gap_remanences
from femag.materials import LinearCurve, MagnetisationCurve


def field_problem(design: Design, section: Section | None = None) -> FieldProblem:
    """Return the field problem of a design, on `section` instead of its meshed one if given."""
    section = section or meshed_section(design)
    core = core_curve(design.core, design.material)
    return FieldProblem(
        section,
        curves_of_regions(section, design.core, design.gaps, core),
        turns_per_area(design),
        gap_remanences(design.core, design.gaps),
    )


def curves_of_regions(
    section: Section, core: Core, gaps: Sequence[Gap], core_material: MagnetisationCurve
) -> dict[str, MagnetisationCurve]:
    """Return the material of every region that is not air: the core's, and fillings of gaps."""
    fillings = {
        name: LinearCurve(permeability)
        for name, permeability in gap_permeabilities(core, gaps).items()
        if permeability != 1.0
    }
    curves: dict[str, MagnetisationCurve] = {}
    for region in section.regions:
        if region.role == "core":
            curves[region.name] = core_material
        elif region.name in fillings:
            curves[region.name] = fillings[region.name]
    return curves
