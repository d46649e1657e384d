"""A B-H loop from a capture, and the numbers that are read off it."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np

from femag.bench.branches import (
    branches,
    coercive_field,
    remanence,
    slope_after_tip,
    slope_at_remanence,
)
from femag.bench.capture import Array, Capture, CoreUnderTest
from femag.bench.periods import integral_over_period
from femag.bench.smoothing import smoothed
from femag.bench.steady_periods import SteadyPeriods, steady_periods
from femag.errors import InputError
from femag.units import MU_0

HIGHEST_FLUX_DENSITY = 3.0
"""T; no soft magnetic material comes near it."""

LIKELY_PERMEABILITIES = (1.0, 1e6)

MOST_GROUPS = 10
"""Groups of periods that are left out in turn to see how far the readings scatter."""


@dataclass(frozen=True)
class Readings:
    """What is read off a loop, or the standard errors of that; SI.

    Parameters
    ----------
    peak_field_strength, peak_flux_density : float
        Half the swings of H and B, A/m and T.
    remanence, coercive_field : float or None
        T and A/m, mean of both branches; None under a bias, where neither is defined.
    loss_per_cycle : float
        Area of the loop, J/m3: the mean of current times voltage, so that no integral enters.
    amplitude_permeability : float
        Peak flux density over mu0 times peak field strength.
    remanence_permeability : float or None
        Slope of the loop over mu0 where H is 0, mean of both branches; None under a bias.
    tip_permeability : float
        Slope of the loop over mu0 just after the tips, mean of both.
    """

    peak_field_strength: float
    peak_flux_density: float
    remanence: float | None
    coercive_field: float | None
    loss_per_cycle: float
    amplitude_permeability: float
    remanence_permeability: float | None
    tip_permeability: float


@dataclass(frozen=True, eq=False)
class Loop:
    """A closed B-H loop.

    Parameters
    ----------
    name : str
        The capture.
    core : CoreUnderTest
        Turns, section and path.
    measured : SteadyPeriods
        What the loop was scaled from.
    field_strength, flux_density : array, shape (phases,)
        A/m and T in equal steps of time over one period; zero of B is the middle of its swing.
    readings : Readings
        What is read off it.
    errors : Readings or None
        Standard errors of the readings from the scatter between periods; None from fewer than
        three. They know nothing of gains, of section and path, nor of delays between the channels.
    notes : tuple of str
        What was assumed or treated.
    """

    name: str
    core: CoreUnderTest
    measured: SteadyPeriods
    field_strength: Array
    flux_density: Array
    readings: Readings
    errors: Readings | None
    notes: tuple[str, ...]

    @property
    def frequency(self) -> float:
        """Hz."""
        return 1.0 / self.measured.period

    @property
    def loss_density(self) -> float:
        """Mean power by volume at the capture's frequency, W/m3."""
        return self.readings.loss_per_cycle * self.frequency


def loop_of(
    capture: Capture,
    core: CoreUnderTest,
    frequency: float | None = None,
    *,
    flat_tops: bool = False,
) -> Loop:
    """Return the loop of a capture: integrate the voltage over whole periods, scale, read off.

    Parameters
    ----------
    capture : Capture
        Both channels.
    core : CoreUnderTest
        Turns, section and path.
    frequency : float, optional
        Hz, to within 5 %; found from the data when left out.
    flat_tops : bool
        Flat tops of a channel are real, not clipped.

    Raises
    ------
    InputError
        If the capture is no steady periodic record of a current and the voltage that its flux
        induces, or the flux density is beyond any material.

    References
    ----------
    IEC 60404-6 measures loops like this, with a sense winding and integration (from memory).
    B. Efron, The Jackknife, the Bootstrap and Other Resampling Plans, SIAM 1982, for the standard
    errors (from memory).
    """
    measured = steady_periods(capture, frequency, flat_tops=flat_tops)
    everything = np.ones(measured.count, dtype=bool)
    field_strength, flux_density, readings = _shape(core, measured, everything)
    if readings.peak_flux_density > HIGHEST_FLUX_DENSITY:
        raise InputError(
            f"a peak of {readings.peak_flux_density:.3g} T is beyond any material",
            file=capture.name,
            accepted="section, sense turns and scale of the voltage as they are on the bench",
        )
    return Loop(
        name=capture.name,
        core=core,
        measured=measured,
        field_strength=field_strength,
        flux_density=flux_density,
        readings=readings,
        errors=_standard_errors(core, measured),
        notes=(*measured.notes, *_doubts(readings)),
    )


def _shape(
    core: CoreUnderTest, measured: SteadyPeriods, chosen: np.typing.NDArray[np.bool_]
) -> tuple[Array, Array, Readings]:
    """Return H, B and readings of the mean of chosen periods."""
    current = measured.currents[chosen].mean(axis=0)
    voltage = measured.voltages[chosen].mean(axis=0)
    voltage = voltage - voltage.mean()
    noise = measured.current_noise / np.sqrt(np.count_nonzero(chosen))
    h = core.field_strength(smoothed(current, float(noise)))
    b_rate = core.flux_density_rate(voltage)
    b = integral_over_period(b_rate, measured.period)
    b -= 0.5 * (b.max() + b.min())
    loss = measured.period * float(np.mean(core.field_strength(current) * b_rate))
    return h, b, _readings(h, b, loss, is_biased=measured.bias != 0.0)


def _readings(h: Array, b: Array, loss: float, *, is_biased: bool) -> Readings:
    sides = branches(h, b)
    peaks = 0.5 * float(np.ptp(h)), 0.5 * float(np.ptp(b))
    return Readings(
        *peaks,
        remanence=None if is_biased else remanence(*sides),
        coercive_field=None if is_biased else coercive_field(*sides),
        loss_per_cycle=loss,
        amplitude_permeability=peaks[1] / (MU_0 * peaks[0]),
        remanence_permeability=None if is_biased else slope_at_remanence(*sides) / MU_0,
        tip_permeability=slope_after_tip(*sides) / MU_0,
    )


def _standard_errors(core: CoreUnderTest, measured: SteadyPeriods) -> Readings | None:
    """Return the scatter of the readings as groups of periods are left out (jackknife)."""
    groups = min(measured.count, MOST_GROUPS)
    if groups < 3:
        return None
    group = np.arange(measured.count) * groups // measured.count
    left = [_shape(core, measured, group != number)[2] for number in range(groups)]
    errors: dict[str, float | None] = {}
    for name in (field.name for field in fields(Readings)):
        values = [getattr(readings, name) for readings in left]
        errors[name] = None if None in values else float(np.sqrt(groups - 1) * np.std(values))
    return Readings(**errors)  # type: ignore[arg-type]


def _doubts(readings: Readings) -> list[str]:
    doubts = []
    if readings.loss_per_cycle < 0.0:
        doubts.append(
            "the area of the loop is negative: the channels are shifted in time (delay of the "
            "current probe?), so that loss, coercive field and remanence say nothing"
        )
    low, high = LIKELY_PERMEABILITIES
    if not low <= readings.amplitude_permeability <= high:
        doubts.append(
            f"a permeability of {readings.amplitude_permeability:.3g} is that of no core: check "
            "turns, section, path length and scales"
        )
    return doubts
