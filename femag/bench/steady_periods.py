"""The whole periods of a capture with offset and drift taken out, sign and bias settled."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from femag.bench.capture import Array, Capture
from femag.bench.faults import refuse_faults
from femag.bench.periods import (
    folded_periods,
    integral_over_period,
    period_noise,
    without_drift,
)
from femag.bench.wiring import inverted_sense_winding
from femag.errors import InputError

CLOSURE_LIMIT = 0.05
"""Departure of a period from closing, over the swing of the flux, that is refused."""

STEADY_LIMIT = 0.1
"""Change of the amplitude over the record, over its mean, that is refused."""

WORTH_A_NOTE = 0.01

BIASED = 0.1
"""Mean of the current over its swing, beyond which it is a bias and no offset of the probe."""

FEW_SAMPLES = 100


@dataclass(frozen=True, eq=False)
class SteadyPeriods:
    """Whole periods of a steady capture, SI.

    Parameters
    ----------
    period : float
        Length of one, s.
    currents, voltages : array, shape (periods, phases)
        Without offset and drift; the currents with their bias, if they have one.
    bias : float
        Mean current that was kept, A; else 0.
    current_offset, voltage_offset, voltage_drift : float
        What was taken out, A, V, and V in a period.
    closure : float or None
        Largest departure of one period from closing, over the swing of the flux; None from one
        period.
    current_noise, voltage_noise : float
        Standard deviation of a sample, A and V.
    notes : tuple of str
        What was assumed or treated.
    """

    period: float
    currents: Array
    voltages: Array
    bias: float
    current_offset: float
    voltage_offset: float
    voltage_drift: float
    closure: float | None
    current_noise: float
    voltage_noise: float
    notes: tuple[str, ...]

    @property
    def count(self) -> int:
        """Number of whole periods."""
        return int(self.currents.shape[0])

    @property
    def current(self) -> Array:
        """Mean of all periods, A, shape (phases,)."""
        return np.asarray(self.currents.mean(axis=0))

    @property
    def voltage(self) -> Array:
        """Mean of all periods, V, shape (phases,)."""
        return np.asarray(self.voltages.mean(axis=0))


def steady_periods(
    capture: Capture, frequency: float | None = None, *, flat_tops: bool = False
) -> SteadyPeriods:
    """Return the whole periods of a capture.

    Parameters
    ----------
    capture : Capture
        The record.
    frequency : float, optional
        Hz, to within 5 %; found from the data when left out.
    flat_tops : bool
        Flat tops of a channel are real, not clipped.

    Raises
    ------
    InputError
        If the capture is no steady periodic record of a current and the voltage that its flux
        induces; the line says what it looks like instead.
    """
    refuse_faults(capture, flat_tops=flat_tops)
    folded = folded_periods(capture, frequency)
    currents, current_line = without_drift(folded.current)
    voltages, voltage_line = without_drift(folded.voltage)
    is_inverted = inverted_sense_winding(currents.mean(axis=0), voltages.mean(axis=0), capture.name)
    sign = -1.0 if is_inverted else 1.0
    offset = float(current_line[0])
    bias = offset if abs(offset) > BIASED * np.ptp(currents.mean(axis=0)) else 0.0
    closure = _closure(voltages, folded.period)
    _refuse_unsteady(capture.name, currents, closure)
    notes = _notes(currents, closure, is_biased=bias != 0.0, is_inverted=is_inverted)
    return SteadyPeriods(
        period=folded.period,
        currents=currents + bias,
        voltages=sign * voltages,
        bias=bias,
        current_offset=offset - bias,
        voltage_offset=sign * float(voltage_line[0]),
        voltage_drift=sign * float(voltage_line[1]),
        closure=closure,
        current_noise=period_noise(currents),
        voltage_noise=period_noise(voltages),
        notes=(*capture.notes, *notes),
    )


def _closure(voltages: Array, period: float) -> float | None:
    """Return the largest departure from closing, None from a single period."""
    if voltages.shape[0] == 1:
        return None
    swing = np.ptp(integral_over_period(voltages.mean(axis=0), period))
    return float(period * np.abs(voltages.mean(axis=1)).max() / swing)


def _refuse_unsteady(name: str, currents: Array, closure: float | None) -> None:
    amplitudes = np.abs(np.fft.rfft(currents, axis=1)[:, 1])
    change = float(np.ptp(amplitudes) / amplitudes.mean())
    if change > STEADY_LIMIT:
        raise InputError(
            f"the drive is not steady: its amplitude changes by {change:.0%} over the record",
            file=name, accepted=f"a record after the start, steady within {STEADY_LIMIT:.0%}",
        )  # fmt: skip
    if closure is not None and closure > CLOSURE_LIMIT:
        raise InputError(
            f"the loop does not close: a period ends {closure:.1%} of the flux swing from where "
            "it began", file=name,
            accepted=f"a steady record that closes within {CLOSURE_LIMIT:.0%}",
        )  # fmt: skip


def _notes(
    currents: Array, closure: float | None, *, is_biased: bool, is_inverted: bool
) -> list[str]:
    notes = []
    if is_inverted:
        notes.append("the sense winding was connected the other way round; its sign was changed")
    if currents.shape[1] < FEW_SAMPLES:
        notes.append(f"only {currents.shape[1]} samples in a period")
    if closure is None:
        notes.append("one period only: whether the loop closes cannot be told from the offset")
    elif closure > WORTH_A_NOTE:
        notes.append(f"periods close within {closure:.1%} of the flux swing only")
    if is_biased:
        notes.append(
            "the drive has a bias: B counts from the middle of its swing, and remanence and "
            "coercive field have no meaning"
        )
    return notes
