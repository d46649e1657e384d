"""The magnetostatic problem as a value: a section, what fills it, and where the turns lie."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from femag.geometry import Section
from femag.materials import AIR, MagnetisationCurve


@dataclass(frozen=True)
class FieldProblem:
    """Find the static field of one current in given turns, and of magnets.

    Parameters
    ----------
    section : Section
        Geometry and walls.
    curves : mapping of str to MagnetisationCurve
        Material of each region that is not air.
    turns_per_area : mapping of str to float
        Turns per area in 1/m2 of each region that carries the current.
    remanences : mapping of str to float
        Remanence along z in T of each region that is a magnet; its curve is linear.
    """

    section: Section
    curves: Mapping[str, MagnetisationCurve] = field(default_factory=dict)
    turns_per_area: Mapping[str, float] = field(default_factory=dict)
    remanences: Mapping[str, float] = field(default_factory=dict)

    def curve_of(self, region: str) -> MagnetisationCurve:
        """Return the material of a region."""
        return self.curves.get(region, AIR)
