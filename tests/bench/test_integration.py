"""Periods and integrals against closed forms."""

from dataclasses import replace

import numpy as np
import pytest

from femag.bench import Capture
from femag.bench.periods import (
    folded_periods,
    integral_over_period,
    period_noise,
    without_drift,
)


def sines(samples: float, periods: float, *, noise: float = 0.0, step: float = 1e-6) -> Capture:
    """A current that lags its voltage by a quarter, with harmonics in the current."""
    angle = 2.0 * np.pi * (np.arange(int(samples * periods)) / samples + 0.2)
    random = np.random.default_rng(3)
    current = np.sin(angle) + 0.2 * np.sin(3.0 * angle) + noise * random.standard_normal(angle.size)
    return Capture(
        "sines", step, current, np.cos(angle) + noise * random.standard_normal(angle.size)
    )


@pytest.mark.parametrize("samples", [20, 50, 200])
def test_the_integral_of_a_sine_is_as_exact_as_its_formula_says(samples: int) -> None:
    """Gain of the four-point rule on exp(i t), step h: (13 cos(h/2) - cos(3h/2)) h/(24 sin(h/2)),
    which is 1 - 11 h^4/720 + ... (derived here by summing the rule's weights)."""
    angle = 2.0 * np.pi * np.arange(samples) / samples
    integral = integral_over_period(np.cos(angle), 2.0 * np.pi)
    amplitude = 0.5 * np.ptp(integral - integral.mean())
    step = 2.0 * np.pi / samples
    gain = (13.0 * np.cos(step / 2) - np.cos(1.5 * step)) * step / (24.0 * np.sin(step / 2))
    exact = 0.5 * np.ptp(np.sin(angle))
    assert amplitude / exact == pytest.approx(gain, rel=1e-12)
    assert 1.0 - gain == pytest.approx(11.0 / 720.0 * step**4, rel=0.05)
    assert abs(gain - 1.0) < 0.05 * step**2 / 12.0  # against the trapezoid


def test_a_square_wave_integrates_to_a_triangle() -> None:
    """Half the swing of the integral of +-1 over a period of 1 is 1/4; half a sample may
    be lost at an edge."""
    place = (np.arange(1000) + 0.5) / 1000
    integral = integral_over_period(np.where(place < 0.5, 1.0, -1.0), 1.0)
    assert 0.5 * np.ptp(integral) == pytest.approx(0.25, abs=0.5e-3)


@pytest.mark.parametrize("samples", [37.3, 500.0, 1234.56])
@pytest.mark.parametrize("periods", [1.15, 2.5, 7.0, 40.9])
def test_the_period_is_found_between_samples(samples: float, periods: float) -> None:
    folded = folded_periods(sines(samples, periods))
    assert folded.period == pytest.approx(samples * 1e-6, rel=2e-3 / samples**0.5)
    assert folded.count == int(periods + 1e-9)


def test_the_period_is_found_under_noise() -> None:
    """1 % noise; a hundredth of a sample is left over forty periods."""
    folded = folded_periods(sines(400.4, 40.2, noise=0.01))
    assert folded.period == pytest.approx(400.4e-6, rel=2e-5)


def test_a_given_frequency_may_be_a_few_per_cent_off() -> None:
    capture = sines(500.0, 6.3)
    assert folded_periods(capture, 2060.0).period == pytest.approx(500e-6, rel=1e-6)


def test_a_record_of_exactly_one_period_is_used_when_its_frequency_is_given() -> None:
    folded = folded_periods(sines(500.0, 1.0), 2000.0)
    assert folded.count == 1
    assert folded.period == pytest.approx(500e-6, rel=1e-12)


def test_dense_records_are_averaged_down_without_moving_the_period() -> None:
    folded = folded_periods(sines(50_000.0, 4.2))
    assert folded.current.shape[1] <= 8192
    assert folded.period == pytest.approx(50_000e-6, rel=1e-5)


def test_offset_and_drift_are_taken_out() -> None:
    capture = sines(500.0, 8.0)
    ramp = 0.3 + 0.002 * np.arange(capture.current.size) / 500.0
    left, line = without_drift(
        folded_periods(replace(capture, voltage=capture.voltage + ramp)).voltage
    )
    clean = folded_periods(capture).voltage
    assert np.abs(left - clean).max() < 1e-4
    assert line == pytest.approx([0.3 + 0.002 * 4.0, 0.002], rel=2e-3)


@pytest.mark.parametrize("periods", [1, 2, 3, 30])
def test_noise_is_estimated_whatever_the_number_of_periods(periods: int) -> None:
    random = np.random.default_rng(5)
    wave = np.sin(2.0 * np.pi * np.arange(2000) / 2000)
    noisy = wave + 0.01 * random.standard_normal((periods, 2000))
    assert period_noise(noisy) == pytest.approx(0.01, rel=0.1)
