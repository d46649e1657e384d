"""What a design has to keep: limits as a value."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, fields
from typing import Literal

from femag.errors import InputError, number
from femag.units import ACCEPTED, TEMPERATURE

Sense = Literal["least", "most"]

ABSOLUTE_ZERO = -273.15


@dataclass(frozen=True)
class Limit:
    """One limit.

    Parameters
    ----------
    key : str
        Its name in `Requirements` and in the design file.
    words : str
        What is limited, for print.
    unit : str
        SI unit; "C" for degrees Celsius.
    sense : {"least", "most"}
        Which side of the limit is accepted.
    value : float
        The limit, SI.
    """

    key: str
    words: str
    unit: str
    sense: Sense
    value: float


KINDS: dict[str, tuple[str, str, Sense]] = {
    "inductance_least": ("inductance", "H", "least"),
    "inductance_most": ("inductance", "H", "most"),
    "incremental_inductance": ("incremental inductance", "H", "least"),
    "flux_density": ("flux density, post", "T", "most"),
    "core_flux_density": ("flux density, core", "T", "most"),
    "loss": ("loss", "W", "most"),
    "force": ("force", "N", "most"),
    "copper_clearance": ("copper to gap", "m", "least"),
    "temperature": ("temperature assumed", "C", "least"),
}
"""Words, unit and sense of every limit."""


@dataclass(frozen=True)
class Requirements:
    """Limits that a design has to keep at its peak current; None where there is none.

    Parameters
    ----------
    inductance_least, inductance_most : float, optional
        Of the energy inductance, H.
    incremental_inductance : float, optional
        Of the incremental inductance, H.
    flux_density : float, optional
        Of the mean flux density through the post where it is largest, T.
    core_flux_density : float, optional
        Of the mean flux density through the fullest section of the core, T.
    loss : float, optional
        Of core and copper together, W.
    force : float, optional
        Of the force with which the halves of the core pull at each other, N.
    copper_clearance : float, optional
        Of the distance between metal of a winding and the edge of a gap, m.
    temperature : float, optional
        Degrees Celsius that every conductor has to be computed at, or above: what the design
        assumes, not what it reaches.
    fit : bool
        Whether every winding has to be laid of real conductors that fit.

    Raises
    ------
    InputError
        If a limit is not above zero, or no inductance is left between two limits.
    """

    inductance_least: float | None = None
    inductance_most: float | None = None
    incremental_inductance: float | None = None
    flux_density: float | None = None
    core_flux_density: float | None = None
    loss: float | None = None
    force: float | None = None
    copper_clearance: float | None = None
    temperature: float | None = None
    fit: bool = False

    def __post_init__(self) -> None:
        for limit in self.limits():
            lowest = ABSOLUTE_ZERO if limit.unit == "C" else 0.0
            accepted = ACCEPTED.get(limit.unit, TEMPERATURE) + f", above {lowest:g}"
            if not lowest < number(limit.value, f"require.{limit.key}", accepted) < math.inf:
                raise InputError(
                    "out of range", key=f"require.{limit.key}", value=limit.value,
                    accepted=accepted,
                )  # fmt: skip
        least, most = self.inductance_least, self.inductance_most
        if least is not None and most is not None and not least < most:
            raise InputError(
                "no inductance is left between the limits", key="require.inductance_most",
                value=most, accepted=f"more than inductance_least, {least:g} H",
            )  # fmt: skip

    def limits(self) -> Iterator[Limit]:
        """Yield every limit that is given."""
        for key, (words, unit, sense) in KINDS.items():
            value = getattr(self, key)
            if value is not None:
                yield Limit(key, words, unit, sense, value)

    def __bool__(self) -> bool:
        return any(getattr(self, field.name) not in (None, False) for field in fields(self))
