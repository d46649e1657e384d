"""Tolerances of the parts of a design, as half ranges: plus or minus so much."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields

from femag.errors import InputError, number

SHARES = ("permeability", "saturation")
"""What is given as a share of its value."""
_LARGEST_SHARE = 0.9


@dataclass(frozen=True)
class PartTolerances:
    """How far each part may be off, either way; 0 where it is taken as exact.

    Parameters
    ----------
    gap : float
        Of the length of every gap, for itself, m.
    post_diameter, window_diameter, window_height : float
        Of the core, m. One size is off by itself, all others stay.
    permeability, saturation : float
        Of the material, as a share: 0.25 for 25 %.
    coil_radial, coil_axial : float
        Of the place of all turns, m.
    """

    gap: float = 0.0
    post_diameter: float = 0.0
    window_diameter: float = 0.0
    window_height: float = 0.0
    permeability: float = 0.0
    saturation: float = 0.0
    coil_radial: float = 0.0
    coil_axial: float = 0.0

    def __post_init__(self) -> None:
        for entry in fields(self):
            is_share = entry.name in SHARES
            most = _LARGEST_SHARE if is_share else math.inf
            accepted = (
                f"a share from 0 to {_LARGEST_SHARE:g}, such as 0.25"
                if is_share
                else "a length of 0 or more, such as '0.01 mm'"
            )
            value = number(getattr(self, entry.name), f"tolerance.{entry.name}", accepted)
            if not (0.0 <= value <= most and math.isfinite(value)):
                raise InputError(
                    "out of range", key=f"tolerance.{entry.name}", value=value, accepted=accepted
                )

    def half_range(self, parameter: str) -> float:
        """Return the half range of a parameter; ``gap.1`` has that of ``gap``."""
        return float(getattr(self, parameter.partition(".")[0]))


CUSTOMARY = PartTolerances(gap=0.01e-3, permeability=0.25)
"""Grinding to 0.01 mm and permeability within 25 %; common practice, no source."""
