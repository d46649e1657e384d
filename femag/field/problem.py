"""The magnetostatic problem as a value: a section, what fills it, and where the turns lie."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from femag.design import Design, meshed_section, turns_per_area
from femag.geometry import Section
from femag.geometry.pot import gap_permeabilities
from femag.materials import AIR, LinearCurve, MagnetisationCurve


@dataclass(frozen=True)
class FieldProblem:
    """Find the static field of one current in given turns.

    Parameters
    ----------
    section : Section
        Geometry and walls.
    curves : mapping of str to MagnetisationCurve
        Material of each region that is not air.
    turns_per_area : mapping of str to float
        Turns per area in 1/m2 of each region that carries the current.
    """

    section: Section
    curves: Mapping[str, MagnetisationCurve] = field(default_factory=dict)
    turns_per_area: Mapping[str, float] = field(default_factory=dict)

    def curve_of(self, region: str) -> MagnetisationCurve:
        """Return the material of a region."""
        return self.curves.get(region, AIR)


def field_problem(design: Design, section: Section | None = None) -> FieldProblem:
    """Return the field problem of a design, on `section` instead of its meshed one if given."""
    section = section or meshed_section(design)
    fillings = {
        name: LinearCurve(permeability)
        for name, permeability in gap_permeabilities(design.core, design.gaps).items()
        if permeability != 1.0
    }
    curves: dict[str, MagnetisationCurve] = {}
    for region in section.regions:
        if region.role == "core":
            curves[region.name] = design.material
        elif region.name in fillings:
            curves[region.name] = fillings[region.name]
    return FieldProblem(section, curves, turns_per_area(design))
