import math

import numpy as np
import pytest

import femag as fm
from femag.ripple import MOST_HARMONICS, Ripple

SHARES = np.array([0.0, 0.13, 0.2, 0.55, 0.8, 1.0])
CURRENTS = np.array([1.0, 4.0, 2.5, 3.0, 0.5, 1.0])
SAMPLES = Ripple.of_samples(np.column_stack([SHARES, CURRENTS]), 50e3)
ALL = (Ripple(2.0, 1e5), Ripple(2.0, 1e5, rise=0.2), Ripple(3.0, 400.0, "sine"), SAMPLES)
PHASES = (np.arange(200_000) + 0.5) / 200_000


@pytest.mark.parametrize("rise", [0.5, 0.35, 0.05])
def test_a_triangle_has_the_harmonics_of_its_closed_form(rise: float) -> None:
    """|c_n| = pp |sin(n pi D)| / (n^2 pi^2 D (1 - D)), from the integral over both straights."""
    frequencies, found = Ripple(3.0, 2e5, rise=rise).harmonics(40)
    n = np.arange(1, 41)
    expected = 3.0 * np.abs(np.sin(n * np.pi * rise)) / (n**2 * np.pi**2 * rise * (1.0 - rise))
    np.testing.assert_allclose(frequencies, 2e5 * n)
    np.testing.assert_allclose(np.abs(found), expected, rtol=1e-12, atol=1e-15)


def test_a_sine_is_its_first_harmonic() -> None:
    _, found = Ripple(3.0, 400.0, "sine").harmonics(5)
    np.testing.assert_allclose(found, [-1.5, 0, 0, 0, 0])


@pytest.mark.parametrize("ripple", ALL)
def test_the_series_gives_the_current_back(ripple: Ripple) -> None:
    """The rest of a series of second order falls as one over the number of its terms."""
    _, found = ripple.harmonics(4000)
    phase = np.linspace(0.0, 2.0, 41)
    waves = np.exp(2j * np.pi * np.outer(phase, np.arange(1, 4001)))
    np.testing.assert_allclose((waves @ found).real, ripple.current(phase), atol=2e-3)


@pytest.mark.parametrize("ripple", ALL)
def test_mean_rms_and_height_are_those_of_the_current(ripple: Ripple) -> None:
    current = ripple.current(PHASES)
    assert np.mean(current) == pytest.approx(0.0, abs=1e-9)
    assert math.sqrt(np.mean(current**2)) == pytest.approx(ripple.rms, rel=1e-8)
    assert np.ptp(current) == pytest.approx(ripple.peak_to_peak, rel=1e-4)
    _, found = ripple.harmonics(4000)
    assert math.sqrt(np.sum(np.abs(found) ** 2) / 2.0) == pytest.approx(ripple.rms, rel=1e-8)


@pytest.mark.parametrize("ripple", ALL)
@pytest.mark.parametrize("rest", [0.03, 3e-3])
def test_enough_harmonics_leave_the_share_of_squared_slope_they_say(
    ripple: Ripple, rest: float
) -> None:
    slopes = np.diff(ripple.current(PHASES)) / np.diff(PHASES)
    number = ripple.enough_harmonics(rest)

    def held(count: int) -> float:
        _, found = ripple.harmonics(count)
        return float(np.sum(0.5 * (2.0 * np.pi * np.arange(1, count + 1) * np.abs(found)) ** 2))

    whole = float(np.mean(slopes**2))
    assert number < MOST_HARMONICS
    assert 1.0 - held(number) / whole < 1.02 * rest
    assert 1.0 - held(number - 1) / whole > 0.98 * rest


def test_the_current_of_the_drive_is_the_peak() -> None:
    for ripple in ALL:
        assert ripple.bias(5.0) + np.max(ripple.corners[1]) == pytest.approx(5.0)
        assert ripple.trough(5.0) == pytest.approx(5.0 - ripple.peak_to_peak)
        assert (ripple.bias(-5.0), ripple.trough(-5.0)) == (-ripple.bias(5.0), -ripple.trough(5.0))
    assert Ripple(2.0, 1e5, rise=0.1).bias(5.0) == 4.0


def test_a_mean_of_the_samples_does_not_count() -> None:
    shifted = Ripple.of_samples(np.column_stack([SHARES, CURRENTS + 7.0]), 50e3)
    assert shifted.bias(9.0) == pytest.approx(SAMPLES.bias(9.0))
    np.testing.assert_allclose(shifted.harmonics(9)[1], SAMPLES.harmonics(9)[1], atol=1e-14)


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"peak_to_peak": 0.0}, "drive.ripple"),
        ({"peak_to_peak": math.nan}, "drive.ripple"),
        ({"frequency": -1.0}, "drive.frequency"),
        ({"rise": 1.0}, "drive.rise"),
        ({"shape": "square"}, "drive.shape"),
        ({"shape": "samples"}, "drive.waveform"),
        ({"samples": ((0.0, 1.0), (0.5, 2.0), (1.0, 1.0))}, "drive.waveform"),
    ],
)
def test_what_cannot_be_used_is_refused(change: dict[str, object], key: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        Ripple(**({"peak_to_peak": 1.0, "frequency": 1e5} | change))  # type: ignore[arg-type]
    assert caught.value.key == key


@pytest.mark.parametrize(
    ("samples", "problem"),
    [
        ([[0, 1], [1, 1]], "not usable"),
        ([[0, 1], [0.5, 2], [0.9, 1]], "from 0 to 1"),
        ([[0, 1], [0.5, 2], [0.5, 3], [1, 1]], "do not grow"),
        ([[0, 1], [0.5, 2], [1, 1.1]], "does not close"),
        ([[0, 1], [0.5, math.inf], [1, 1]], "out of range"),
        ([[0, 1], [0.5, 1], [1, 1]], "out of range"),
    ],
)
def test_samples_have_to_be_one_period(samples: list[list[float]], problem: str) -> None:
    with pytest.raises(fm.InputError, match=problem):
        Ripple.of_samples(samples, 1e5)
