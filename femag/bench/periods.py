"""Whole periods of a capture: how long one is, how many there are, all laid over each other."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.fft import irfft, next_fast_len, rfft

from femag.bench.capture import Array, Capture
from femag.errors import InputError

ALIKE = 0.15
"""Mean squared difference of two periods over twice the variance, up to which they count as one."""

APART = 0.4
"""The same measure must have risen above this before a repetition counts."""

LEAST_OVERLAP = 0.05
"""Share of a period that has to be seen twice."""

LIVELY = 0.15
"""Standard deviation in the part that is seen twice over that of the record, in one channel."""

LEAST_A_PERIOD = 20
"""Samples."""

MOST_A_PERIOD = 4096
"""Samples; beyond, neighbours are averaged before anything is done."""

HINT_TOLERANCE = 0.05

SHORT_OF_A_PERIOD = 0.99
"""Samples that may be missing at the end of the last period: the step to the next one."""


@dataclass(frozen=True, eq=False)
class FoldedPeriods:
    """Whole periods of both channels, each on the same phases.

    Parameters
    ----------
    period : float
        Length of one, s.
    current, voltage : array, shape (periods, phases)
        A and V, offset and drift still in.
    """

    period: float
    current: Array
    voltage: Array

    @property
    def count(self) -> int:
        """Number of whole periods."""
        return int(self.current.shape[0])


def folded_periods(capture: Capture, frequency: float | None = None) -> FoldedPeriods:
    """Find the period and lay all whole periods over each other.

    Parameters
    ----------
    capture : Capture
        The record.
    frequency : float, optional
        What the frequency is, Hz: the period is sought within 5 % of it, and a record of a single
        period is taken as that.

    Raises
    ------
    InputError
        If there is no whole period, no repetition, or too few samples in a period.
    """
    capture = _thinned(capture, frequency)
    samples = _samples_in_period(capture, frequency)
    if samples < LEAST_A_PERIOD:
        raise InputError(
            f"{samples:.1f} samples in a period are too few", file=capture.name,
            accepted=f"at least {LEAST_A_PERIOD}, better some hundreds: a faster time base",
        )  # fmt: skip
    if samples > 2 * MOST_A_PERIOD:
        return folded_periods(_averaged(capture, int(samples / MOST_A_PERIOD)), frequency)
    count = int((capture.current.size + SHORT_OF_A_PERIOD) / samples)
    phases = round(samples)
    places = samples * (np.arange(count)[:, None] + np.arange(phases) / phases)
    places = np.where(places > capture.current.size - 1, places - samples, places)
    return FoldedPeriods(
        samples * capture.step,
        _values_between(capture.current, places),
        _values_between(capture.voltage, places),
    )


def _thinned(capture: Capture, frequency: float | None) -> Capture:
    if frequency is None:
        return capture
    factor = int(1.0 / (frequency * capture.step) / MOST_A_PERIOD)
    return _averaged(capture, factor) if factor > 1 else capture


def _averaged(capture: Capture, factor: int) -> Capture:
    """Return the capture with each `factor` samples averaged into one."""
    size = capture.current.size // factor * factor
    return Capture(
        capture.name,
        capture.step * factor,
        capture.current[:size].reshape(-1, factor).mean(axis=1),
        capture.voltage[:size].reshape(-1, factor).mean(axis=1),
        capture.notes,
    )


def _samples_in_period(capture: Capture, frequency: float | None) -> float:
    differences = np.maximum(_differences(capture.current), _differences(capture.voltage))
    if frequency is None:
        return _refined(differences, _first_repetition(differences, capture))
    expected = 1.0 / (frequency * capture.step)
    if expected > capture.current.size + SHORT_OF_A_PERIOD:
        raise InputError(
            f"the record of {capture.duration:.4g} s is shorter than one period of "
            f"{frequency:g} Hz", file=capture.name, accepted="a record of whole periods",
        )  # fmt: skip
    if expected * (1.0 + LEAST_OVERLAP + HINT_TOLERANCE) > capture.current.size:
        return expected
    low, high = (round(expected * (1.0 + sign * HINT_TOLERANCE)) for sign in (-1, 1))
    lag = low + int(np.argmin(differences[low : high + 1]))
    if differences[lag] > ALIKE:
        raise InputError(
            f"nothing repeats at {frequency:g} Hz", file=capture.name,
            accepted="the frequency of the drive within 5 %",
        )  # fmt: skip
    return _refined(differences, lag)


def _differences(channel: Array) -> Array:
    """Return for every lag the mean squared difference over twice the variance, shape (n,).

    0 is a perfect repetition, 1 no relation, 2 the opposite sign (the average magnitude difference
    of speech processing, with squares so that a fast Fourier transform does it).
    """
    x = channel - channel.mean()
    size = x.size
    padded = next_fast_len(2 * size, real=True)
    spectrum = rfft(x, padded)
    products = irfft(np.abs(spectrum) ** 2, padded)[:size]
    squares = np.concatenate(([0.0], np.cumsum(x**2)))
    lags = np.arange(size)
    energy = squares[size - lags] + (squares[size] - squares[lags])
    return np.asarray((energy - 2.0 * products) / (2.0 * np.mean(x**2) * (size - lags)))


def _first_repetition(differences: Array, capture: Capture) -> int:
    """Return the first lag in samples after which both channels repeat.

    Raises
    ------
    InputError
        If none does; the line says whether less than a period was seen.
    """
    size = differences.size
    last = int(size / (1.0 + LEAST_OVERLAP))
    apart = np.flatnonzero(differences[:last] > APART)
    start = int(apart[0]) if apart.size else last
    alike = start + np.flatnonzero(differences[start:last] < ALIKE)
    if alike.size:
        run = alike[: int(np.argmax(np.diff(alike, append=size + alike[-1] + 2) > 1)) + 1]
        lag = int(run[np.argmin(differences[run])])
        if lag + 1 < last and _is_lively(capture, lag):
            return lag
    if _turns_of(capture.current) <= 2:
        raise InputError(
            "no whole period: the current passes its middle "
            f"{_turns_of(capture.current)} times and nothing repeats", file=capture.name,
            accepted="a record of at least 1.2 periods, better 5 or more; for exactly one period, "
            "--frequency",
        )  # fmt: skip
    raise InputError(
        "no periodicity: current and voltage do not repeat", file=capture.name,
        accepted="a steady, periodic drive with noise well under the signal",
    )  # fmt: skip


def _is_lively(capture: Capture, lag: int) -> bool:
    """Tell whether anything happens in the part that is seen twice; a flat top proves nothing."""
    return any(
        np.std(channel[lag:]) > LIVELY * np.std(channel)
        for channel in (capture.current, capture.voltage)
    )


def _turns_of(channel: Array) -> int:
    """Return how often a channel passes the middle of its swing, with a band against noise."""
    middle, half = 0.5 * (channel.max() + channel.min()), 0.5 * np.ptp(channel)
    far = channel[np.abs(channel - middle) > 0.25 * half] - middle
    return int(np.count_nonzero(np.diff(np.sign(far))))


def _refined(differences: Array, lag: int) -> float:
    """Return the period in samples, from its highest multiple that half the record still shows."""
    period, multiple = _least_between(differences, lag), 1
    while 2 * multiple * period < 0.75 * differences.size:
        multiple *= 2
        around = round(multiple * period)
        room = np.arange(max(around - 3, 1), min(around + 4, differences.size - 1))
        nearest = int(room[np.argmin(differences[room])])
        period = _least_between(differences, nearest) / multiple
    return period


def _least_between(differences: Array, lag: int) -> float:
    """Return where the parabola through a lag and its neighbours is least."""
    if not 1 <= lag < differences.size - 1:
        return float(lag)
    before, here, after = differences[lag - 1 : lag + 2]
    curvature = before - 2.0 * here + after
    return lag + (float(np.clip(0.5 * (before - after) / curvature, -1, 1)) if curvature > 0 else 0)


def _values_between(channel: Array, places: Array) -> Array:
    """Return values at fractional sample numbers, from the cubic through the four nearest."""
    left = np.clip(np.floor(places).astype(np.intp), 1, channel.size - 3)
    share = places - left
    weights = _cubic_weights(share)
    return sum(
        (
            weight * channel[left + offset]
            for weight, offset in zip(weights, (-1, 0, 1, 2), strict=True)
        ),
        start=np.zeros_like(places),
    )


def _cubic_weights(s: Array) -> tuple[Array, Array, Array, Array]:
    """Return Lagrange's weights of the points -1, 0, 1 and 2 at s."""
    return (
        -s * (s - 1.0) * (s - 2.0) / 6.0,
        (s + 1.0) * (s - 1.0) * (s - 2.0) / 2.0,
        -(s + 1.0) * s * (s - 2.0) / 2.0,
        (s + 1.0) * s * (s - 1.0) / 6.0,
    )


def period_noise(periods: Array) -> float:
    """Return the standard deviation of a channel's noise, from how periods differ at equal phase.

    Parameters
    ----------
    periods : array, shape (periods, phases)
        At least one; of a single one, from its third differences instead.

    Notes
    -----
    Medians over the phases, so that edges which move by a share of a sample do not count.
    """
    count = periods.shape[0]
    if count == 1:
        third = np.diff(periods[0], n=3)
        return float(np.median(np.abs(third)) / (0.6745 * np.sqrt(20.0)))
    from scipy.special import gammaincinv

    median_share = 2.0 * float(gammaincinv((count - 1) / 2.0, 0.5)) / (count - 1)
    return float(np.sqrt(np.median(np.var(periods, axis=0, ddof=1)) / median_share))


def without_drift(periods: Array) -> tuple[Array, Array]:
    """Take offset and drift out of whole periods.

    One or two periods: their mean; three or more: the straight line through the means of all.

    Parameters
    ----------
    periods : array, shape (periods, phases)
        A channel.

    Returns
    -------
    array, shape (periods, phases)
        What is left.
    array, shape (2,)
        Offset at the middle of the record, and its change in a period.
    """
    count, phases = periods.shape
    line = np.array([periods.mean(), 0.0])
    middle = np.arange(count) - 0.5 * (count - 1)
    if count > 2:
        line[1] = float(np.sum(middle * periods.mean(axis=1)) / np.sum(middle**2))
    within = (np.arange(phases) - 0.5 * (phases - 1)) / phases
    return periods - line[0] - line[1] * (middle[:, None] + within), line


def integral_over_period(rate: Array, period: float) -> Array:
    """Return the integral of a periodic rate over its period, starting at 0, same phases.

    Parameters
    ----------
    rate : array, shape (..., phases)
        Mean zero over the period, else the integral does not close.
    period : float
        s.

    Notes
    -----
    Each step integrates the cubic through the four nearest samples. The amplitude of a sine with n
    samples is wrong by (11/720) (2 pi/n)^4 of itself, and that of the trapezoid by (2 pi/n)^2/12.
    """
    step = period / rate.shape[-1]
    back, one, two = (np.roll(rate, shift, axis=-1) for shift in (1, -1, -2))
    increments = step / 24.0 * (13.0 * (rate + one) - back - two)
    total = np.cumsum(increments, axis=-1)
    return np.concatenate((np.zeros_like(total[..., :1]), total[..., :-1]), axis=-1)
