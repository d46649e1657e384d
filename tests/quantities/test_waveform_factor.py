import math

import numpy as np
import pytest
from scipy.integrate import quad

from femag.quantities.waveform_factor import loop_shares, mean_power_of_sine, waveform_factor
from femag.ripple import Ripple

EXPONENTS = [(1.45, 2.6), (1.0, 2.0), (2.0, 2.0), (1.7, 1.6)]


def k_i(alpha: float, beta: float) -> float:
    """k_i over k, by the published integral."""
    integral, _ = quad(lambda t: abs(math.cos(t)) ** alpha, 0.0, math.pi / 2.0, epsabs=1e-13)
    return 1.0 / ((2.0 * math.pi) ** (alpha - 1.0) * 4.0 * integral * 2.0 ** (beta - alpha))


def sampled(shares: list[float], levels: list[float], scale: float = 1.0) -> Ripple:
    return Ripple.of_samples(np.column_stack([shares, scale * np.array(levels)]), 1e5)


@pytest.mark.parametrize(("alpha", "beta"), EXPONENTS)
def test_a_sine_gives_steinmetz_back(alpha: float, beta: float) -> None:
    """The published integral over a sine of swing 2 and period 1 is the law's 1."""
    slope, _ = quad(
        lambda t: abs(2.0 * math.pi * math.cos(2.0 * math.pi * t)) ** alpha, 0.0, 0.25,
        epsabs=1e-13,
    )  # fmt: skip
    published = k_i(alpha, beta) * 4.0 * slope * 2.0 ** (beta - alpha)
    assert published == pytest.approx(1.0, rel=1e-9)
    assert waveform_factor(Ripple(2.0, 1e5, "sine"), alpha, beta) == 1.0
    phase = np.linspace(0.0, 1.0, 2001)
    drawn = Ripple.of_samples(np.column_stack([phase, np.cos(2.0 * np.pi * phase)]), 1e5)
    drawn = sampled(list(phase), [*np.cos(2.0 * np.pi * phase[:-1]), 1.0])
    assert waveform_factor(drawn, alpha, beta) == pytest.approx(1.0, abs=2e-6)


@pytest.mark.parametrize(("alpha", "beta"), EXPONENTS)
@pytest.mark.parametrize("rise", [0.5, 0.4, 0.05])
def test_a_triangle_has_its_closed_form(alpha: float, beta: float, rise: float) -> None:
    """Over a swing of 2: k_i 2^(b-a) 2^a (D^(1-a) + (1-D)^(1-a)), from the published equation."""
    expected = k_i(alpha, beta) * 2.0**beta
    expected *= rise ** (1.0 - alpha) + (1.0 - rise) ** (1.0 - alpha)
    assert waveform_factor(Ripple(7.0, 1e5, rise=rise), alpha, beta) == pytest.approx(
        expected, rel=1e-9
    )


def test_the_mean_power_of_a_sine_is_its_integral() -> None:
    assert mean_power_of_sine(1.0) == pytest.approx(2.0 / math.pi)
    assert mean_power_of_sine(2.0) == pytest.approx(0.5)


def test_minor_loops_count_with_their_own_swing() -> None:
    """Up to 6, back to 4, up to 10, down to 7, up to 8, down to 0: two minor loops by hand."""
    shares = [0.0, 0.3, 0.4, 0.7, 0.76, 0.8, 1.0]
    ripple = sampled(shares, [0.0, 6.0, 4.0, 10.0, 7.0, 8.0, 0.0])
    alpha, beta = 1.45, 2.6

    def loop(pieces: list[tuple[float, float]]) -> float:
        """Integral of |di/dt|^alpha over pieces of (current, time)."""
        return sum(abs(current / time) ** alpha * time for current, time in pieces)

    minor = loop([(2.0, 0.1), (2.0, 0.1)]) * 2.0 ** (beta - alpha)
    minor += loop([(1.0, 0.04), (1.0, 0.025)]) * 1.0 ** (beta - alpha)
    pieces = [(6.0, 0.3), (4.0, 0.2), (3.0, 0.06), (7.0, 0.175)]
    major = loop(pieces) * 10.0 ** (beta - alpha)
    expected = k_i(alpha, beta) * (minor + major) * (2.0 / 10.0) ** beta
    assert waveform_factor(ripple, alpha, beta) == pytest.approx(expected, rel=1e-9)
    heights = [share.height for share in loop_shares(ripple, alpha)]
    assert heights == pytest.approx([0.2, 0.1, 1.0])


def test_nested_loops_are_taken_apart() -> None:
    """Down from 8 to 2 with a rise from 4 to 5 on the way back up: a loop inside a minor loop."""
    levels = [0.0, 8.0, 2.0, 5.0, 4.0, 10.0, 0.0]
    ripple = sampled([0.0, 0.2, 0.4, 0.5, 0.6, 0.9, 1.0], levels)
    heights = [share.height for share in loop_shares(ripple, 1.5)]
    assert heights == pytest.approx([0.1, 0.6, 1.0])


def test_the_weights_of_all_loops_are_that_of_the_whole_waveform() -> None:
    rng = np.random.default_rng(5)
    inside = np.sort(rng.uniform(0.01, 0.99, 200))
    shares, levels = [0.0, *inside, 1.0], rng.normal(size=202)
    levels[-1] = levels[0]
    ripple = sampled(shares, list(levels))
    slopes = np.diff(levels) / np.diff(shares) / np.ptp(levels)
    whole = np.sum(np.abs(slopes) ** 1.4 * np.diff(shares))
    loops = loop_shares(ripple, 1.4)
    assert sum(loop.weight for loop in loops) == pytest.approx(whole)
    reversals = np.count_nonzero(np.diff(np.sign(slopes))) + (slopes[0] * slopes[-1] < 0)
    assert 2 * len(loops) == reversals
    assert loops[-1].height == pytest.approx(1.0)
    assert max(loop.height for loop in loops[:-1]) < 1.0


def test_neither_scale_nor_mean_nor_where_the_period_starts_counts() -> None:
    shares, levels = np.array([0.0, 0.3, 0.4, 0.7, 1.0]), np.array([0.0, 6.0, 4.0, 10.0, 0.0])
    own = waveform_factor(sampled(list(shares), list(levels)), 1.45, 2.6)
    assert waveform_factor(sampled(list(shares), list(3.0 - 5.0 * levels)), 1.45, 2.6) == (
        pytest.approx(own)
    )
    later = [0.0, 0.1, 0.4, 0.7, 1.0]  # the same period from its second corner on
    turned = waveform_factor(sampled(later, [6.0, 4.0, 10.0, 0.0, 6.0]), 1.45, 2.6)
    assert turned == pytest.approx(own)


def test_level_pieces_add_nothing_to_what_the_steep_ones_give() -> None:
    """Half the period at rest: the slopes double, their time halves."""
    rested = sampled([0.0, 0.25, 0.5, 0.75, 1.0], [0.0, 1.0, 1.0, 0.0, 0.0])
    triangle = waveform_factor(Ripple(1.0, 1e5), 1.45, 2.6)
    assert waveform_factor(rested, 1.45, 2.6) == pytest.approx(triangle * 2.0**0.45)
