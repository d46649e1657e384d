"""What comes from the bench: two recorded channels, and the core that they were taken on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, number

Array = NDArray[np.float64]

LEAST_SAMPLES = 40
"""Fewer samples than this hold no period that could be integrated."""


@dataclass(frozen=True, eq=False)
class Capture:
    """Drive current and voltage of the sense winding, sampled at equal steps.

    Parameters
    ----------
    name : str
        Where it comes from, for print.
    step : float
        Time between samples, s.
    current : array, shape (n,)
        Current of the drive winding, A.
    voltage : array, shape (n,)
        Voltage of the sense winding, V.
    notes : tuple of str
        What was assumed or treated while reading.

    Raises
    ------
    InputError
        If the channels are too short, of unequal length, or not all numbers.
    """

    name: str
    step: float
    current: Array
    voltage: Array
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not 0.0 < number(self.step, "step", "a time above 0 s") < np.inf:
            raise InputError("out of range", key="step", value=self.step, accepted="above 0 s")
        if self.current.shape != self.voltage.shape or self.current.ndim != 1:
            raise InputError("current and voltage differ in length", file=self.name)
        if self.current.size < LEAST_SAMPLES:
            raise InputError(
                f"{self.current.size} samples are too few", file=self.name,
                accepted=f"at least {LEAST_SAMPLES}, and some hundreds in each period",
            )  # fmt: skip
        for label, channel in (("current", self.current), ("voltage", self.voltage)):
            bad = np.flatnonzero(~np.isfinite(channel))
            if bad.size:
                raise InputError(
                    f"{bad.size} samples of the {label} are no numbers, the first is sample "
                    f"{bad[0] + 1}", file=self.name, accepted="a record without gaps",
                )  # fmt: skip

    @property
    def duration(self) -> float:
        """Length of the record, s."""
        return self.step * self.current.size


@dataclass(frozen=True)
class CoreUnderTest:
    """The ring or closed core that carries both windings.

    Parameters
    ----------
    drive_turns, sense_turns : int
        Turns of the winding that carries the current, and of the one whose voltage is recorded.
    area : float
        Magnetic section, m2.
    path_length : float
        Magnetic path length, m.

    Raises
    ------
    InputError
        If one of them is not above zero, or turns are not whole.
    """

    drive_turns: int
    sense_turns: int
    area: float
    path_length: float

    def __post_init__(self) -> None:
        for key in ("drive_turns", "sense_turns"):
            value, accepted = getattr(self, key), "a whole number, 1 or more"
            if number(value, key, accepted) < 1 or value != int(value):
                raise InputError("no number of turns", key=key, value=value, accepted=accepted)
        for key in ("area", "path_length"):
            value, accepted = getattr(self, key), "above 0"
            if not 0.0 < number(value, key, accepted) < np.inf:
                raise InputError("out of range", key=key, value=value, accepted=accepted)

    def field_strength(self, current: Array) -> Array:
        """Return H = N i / l in A/m (Ampere's law along the mean path)."""
        return self.drive_turns * current / self.path_length

    def flux_density_rate(self, voltage: Array) -> Array:
        """Return dB/dt = v / (N A) in T/s (Faraday's law)."""
        return voltage / (self.sense_turns * self.area)
