"""Factors of eddy currents in wire and foil, against other forms in many digits."""

from collections.abc import Callable

import mpmath as mp
import numpy as np
import pytest

from femag.quantities.ac_factors import (
    foil_crossing_factor,
    foil_skin_factor,
    round_crossing_factor,
    round_skin_factor,
    skin_depth,
)
from femag.units import MU_0

FACTORS = (round_crossing_factor, round_skin_factor, foil_crossing_factor, foil_skin_factor)

# The project's check values: Bessel functions, or hyperbolic ones, in many digits.
PUBLISHED = (
    (round_crossing_factor, (0.5, 1, 2, 3, 4, 6, 10),
     (0.999552617594, 0.9928916073, 0.897641063684, 0.638409909425, 0.369308373043,
      0.123476589113, 0.0287227567985)),
    (round_skin_factor, (1, 2, 4, 10),
     (1.00130072856, 1.02049238886, 1.26464290627, 2.76810760073)),
    (foil_crossing_factor, (1, 2, 4), (0.961120115709, 0.609128056514, 0.0986464263224)),
)  # fmt: skip


def by_field_in_the_wire(ratio: float) -> float:
    """Integrate |E|^2 sigma/2 over the wire with E = -j omega C J1(k r) sin(phi)."""
    a = mp.mpf(ratio) / 2  # in skin depths
    k = mp.sqrt(2) * mp.e ** (-0.25j * mp.pi)
    inside = mp.quad(lambda r: abs(mp.besselj(1, k * r)) ** 2 * r, [0, a / 2, a])
    amplitude = abs(2 / (k * mp.besselj(0, k * a))) ** 2
    return float(amplitude * inside / (a**4 / 4))


def closed(name: str, ratio: float) -> float:
    x = mp.mpf(ratio) * mp.e ** (-0.25j * mp.pi) / mp.sqrt(2)
    xi = mp.mpf(ratio)
    forms = {
        "round_skin_factor": lambda: mp.re(x * mp.besselj(0, x) / (2 * mp.besselj(1, x))),
        "foil_crossing_factor": lambda: (
            6 / xi**3 * (mp.sinh(xi) - mp.sin(xi)) / (mp.cosh(xi) + mp.cos(xi))
        ),
        "foil_skin_factor": lambda: (
            xi / 2 * (mp.sinh(xi) + mp.sin(xi)) / (mp.cosh(xi) - mp.cos(xi))
        ),
    }
    return float(forms[name]())


@pytest.mark.parametrize(("factor", "ratios", "values"), PUBLISHED)
def test_check_values(
    factor: Callable[..., np.ndarray], ratios: tuple[float, ...], values: tuple[float, ...]
) -> None:
    np.testing.assert_allclose(factor(np.array(ratios)), values, rtol=5e-12)  # their last digit


@pytest.mark.parametrize("ratio", [1e-5, 1e-2, 0.7, 3.0, 30.0])
def test_against_other_forms(ratio: float) -> None:
    with mp.workdps(60):
        assert round_crossing_factor(ratio) == pytest.approx(by_field_in_the_wire(ratio), rel=1e-12)
        for factor in FACTORS[1:]:
            expected = closed(factor.__name__, ratio)
            assert factor(ratio) == pytest.approx(expected, rel=1e-12), factor.__name__


@pytest.mark.parametrize("factor", FACTORS)
def test_smooth_from_nothing_to_the_surface_impedance(factor: Callable[..., np.ndarray]) -> None:
    """No step where rounding takes over; above, the limits of a thin skin, C the size over delta:
    32/C^3, C/4 + 1/4, 6/C^3 and C/2 (from the asymptotic forms of the functions)."""
    ratio = np.concatenate([[0.0], np.geomspace(1e-12, 1e4, 2001)])
    value = factor(ratio)
    assert np.all(np.isfinite(value))
    np.testing.assert_allclose(value[ratio < 1e-3], 1.0, rtol=1e-12)
    signs = np.sign(np.diff(value[ratio > 1e-2]))
    rising = "skin" in factor.__name__
    assert np.all((signs[:200] > 0) == rising)
    limit = {
        "round_crossing_factor": 32e-12,
        "round_skin_factor": 2500.25,
        "foil_crossing_factor": 6e-12,
        "foil_skin_factor": 5e3,
    }[factor.__name__]
    assert value[-1] == pytest.approx(limit, rel=2e-4)


def test_skin_depth_of_copper() -> None:
    """2 rho / (omega mu0) = delta^2; 0.209 mm at 100 kHz and 20 C, the textbook figure."""
    assert skin_depth(1e5, 1.7241e-8) == pytest.approx(0.209e-3, rel=2e-3)
    depth = skin_depth([50.0, 5e5], 2e-8)
    np.testing.assert_allclose(depth**2 * 2 * np.pi * np.array([50.0, 5e5]) * MU_0 / 2, 2e-8)
