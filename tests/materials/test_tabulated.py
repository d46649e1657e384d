import time

import numpy as np
import pytest
from scipy.integrate import quad

import femag as fm
from femag.materials.lookup import lookup
from femag.materials.tabulated import TabulatedCurve
from femag.units import MU_0

POINTS = ((25.0, 0.09), (50.0, 0.18), (100.0, 0.28), (250.0, 0.38), (500.0, 0.43), (1200.0, 0.49))
TABLE = TabulatedCurve(POINTS)


def sampled(curve: fm.FroehlichCurve, h: np.ndarray) -> TabulatedCurve:
    return TabulatedCurve(tuple(zip(h.tolist(), curve.flux_density(h).tolist(), strict=True)))


def polarisation(curve, h: np.ndarray) -> np.ndarray:
    return curve.flux_density(h) - MU_0 * h


def test_the_curve_goes_through_its_points() -> None:
    h, b = np.array(TABLE.points).T
    assert TABLE.points[0] == (0.0, 0.0)
    np.testing.assert_allclose(TABLE.flux_density(h), b, rtol=1e-14)
    np.testing.assert_allclose(TABLE.field_strength(b), h, rtol=1e-12)


@pytest.mark.parametrize("points", [POINTS, ((5.0, 0.001), (20.0, 0.4), (22.0, 0.45), (90.0, 0.5))])
def test_value_and_slope_are_continuous(points: tuple[tuple[float, float], ...]) -> None:
    curve = TabulatedCurve(points)
    for values in (curve.flux_density, curve.differential_permeability):
        largest = [
            np.max(np.abs(np.diff(values(np.linspace(0.0, 2.0 * points[-1][0], count + 1)))))
            for count in (200_000, 800_000)
        ]
        assert largest[1] == pytest.approx(largest[0] / 4.0, rel=0.05)


def test_concave_points_give_a_concave_curve() -> None:
    """The purpose of the spline: Schumaker 1983 (from memory)."""
    table = TabulatedCurve(((25.0, 0.1), *POINTS[1:]))
    slope = table.differential_permeability(np.linspace(0.0, 3000.0, 30_001))
    assert np.all(np.diff(slope) <= 1e-12 * slope[0])


@pytest.mark.parametrize("exponent", [1.0, 2.0, 6.0])
def test_samples_of_a_smooth_curve_converge_with_the_third_order(exponent: float) -> None:
    """Quadratic splines with slopes of second order; theory of interpolation."""
    exact = fm.FroehlichCurve(2000.0, 0.45, exponent)
    h = np.linspace(0.0, 2000.0, 20_001)
    errors = []
    for count in (200, 400, 800):
        table = sampled(exact, np.linspace(0.0, 2000.0, count + 1)[1:])
        errors.append(np.max(np.abs(table.flux_density(h) - exact.flux_density(h))))
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert errors[-1] < 2e-6
    assert np.all(orders > 2.7)
    assert table.initial_permeability == pytest.approx(2000.0, rel=1e-2)


def test_initial_slope_of_a_rayleigh_curve() -> None:
    """B = mu_i H + nu H^2 (Rayleigh 1887): a parabola through the first points is exact."""
    h = np.array([2.0, 5.0, 9.0, 20.0])
    b = MU_0 * 1500.0 * h + 2e-5 * h**2
    table = TabulatedCurve(tuple(zip(h, b, strict=True)))
    assert table.initial_permeability == pytest.approx(1500.0, rel=1e-12)
    between = np.linspace(0.0, 9.0, 91)
    expected = MU_0 * 1500.0 * between + 2e-5 * between**2
    np.testing.assert_allclose(table.flux_density(between), expected, rtol=1e-12, atol=1e-15)


def test_saturation_of_the_law_of_approach_is_found_again() -> None:
    """J = Js - c/H^2 (Becker and Doering 1939, from memory), sampled densely at its end."""
    h = np.concatenate([[20.0, 60.0], np.geomspace(200.0, 4000.0, 200)])
    b = MU_0 * h + np.where(h < 100.0, 0.006 * h, 0.48 - 2e3 / h**2)
    table = TabulatedCurve(tuple(zip(h, b, strict=True)))
    assert table.saturation == pytest.approx(0.48, abs=1e-6)
    far = np.geomspace(4e3, 1e6, 50)
    np.testing.assert_allclose(polarisation(table, far), 0.48 - 2e3 / far**2, atol=1e-6)


@pytest.mark.parametrize("end", [30.0, 700.0, 5000.0])
def test_coenergy_equals_quadrature(end: float) -> None:
    """Reference library: scipy's adaptive quadrature (QUADPACK)."""
    knots = [h for h, _ in TABLE.points if 0.0 < h < end]
    expected, _ = quad(lambda h: float(TABLE.flux_density(np.array(h))), 0.0, end, points=knots,
                       epsabs=0.0, epsrel=1e-12, limit=200)  # fmt: skip
    assert TABLE.coenergy_density(np.array(end)) == pytest.approx(expected, rel=1e-11)


@pytest.mark.parametrize("factor", [0.1, 7.0])
def test_scaling_invariance(factor: float) -> None:
    """Stretching H by s and B - mu0 H not at all leaves J(H/s) as it is."""
    h = np.geomspace(1.0, 1e4, 200)
    scaled = TabulatedCurve(
        tuple((factor * a, b + MU_0 * (factor - 1.0) * a) for a, b in TABLE.points)
    )
    np.testing.assert_allclose(
        polarisation(scaled, factor * h), polarisation(TABLE, h), rtol=1e-9, atol=1e-12
    )


def test_curves_are_values() -> None:
    again = TabulatedCurve([[h, b] for h, b in POINTS])
    assert again == TABLE
    assert hash(again) == hash(TABLE)
    assert "1200 A/m" in TABLE.label
    assert TabulatedCurve(POINTS, notes=["two moved"]).label.endswith("; two moved")


def test_shapes_are_kept() -> None:
    h = np.geomspace(1.0, 1e4, 12).reshape(3, 4)
    for values in (h, h[0], h[0, 0]):
        assert np.shape(TABLE.flux_density(np.asarray(values))) == np.shape(values)
        assert np.shape(TABLE.energy_density(np.asarray(values) / 1e4)) == np.shape(values)


@pytest.mark.parametrize(
    ("points", "problem"),
    [
        (((1.0, 0.1), (2.0, 0.2)), "too few points: 2"),
        (((1.0, 0.1), (2.0, 0.2), (2.0, 0.3)), "H does not rise up to the point"),
        (((1.0, 0.1), (2.0, 0.3), (3.0, 0.2)), "B rises less than mu0 H up to the point (3 A/m"),
        (((1e4, 0.1), (2e4, 0.11), (3e4, 0.12)), "B rises less than mu0 H"),
        (((1.0, 0.1), (2.0, float("nan")), (3.0, 0.2)), "not finite"),
        (((1e-3, 0.1), (2e-3, 0.2), (3e-3, 0.25)), "relative permeability 7.96e+07 out of range"),
        (((1e-12, 1e-15), (2.0, 0.2), (3.0, 0.25)), "H out of range; accepted: 1e-09 A/m to"),
        (((1.0, 0.1), (2.0, 0.2), (1e10, 2e4)), "H out of range"),
        (((1.0, 0.1), (2.0, "0.2"), (3.0, 0.25)), "not a number"),
        (((1.0, 0.1), (2.0,), (3.0, 0.25)), "not a pair"),
        ("x", "not points"),
    ],
)
def test_points_that_are_no_curve_are_refused(points, problem: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        TabulatedCurve(points)
    assert caught.value.key == "points"
    assert problem in str(caught.value)


@pytest.mark.parametrize("text", ["two\nlines", 3])
def test_a_name_is_one_printable_line(text: object) -> None:
    with pytest.raises(fm.InputError, match="not printable"):
        TabulatedCurve(POINTS, name=text)


@pytest.mark.parametrize("spread", [1e-3, 0.1, 3.0, 30.0])
def test_lookup_equals_binary_search(spread: float) -> None:
    """Reference library: numpy's searchsorted."""
    random = np.random.default_rng(7)
    limits = np.unique(random.lognormal(0.0, spread, 40))
    near = [np.nextafter(limits, 0.0), limits, np.nextafter(limits, np.inf)]
    values = np.concatenate([[0.0], *near, random.lognormal(0.0, 2.0 * spread, 1000)])
    expected = np.searchsorted(limits, values, side="right")
    np.testing.assert_array_equal(lookup(limits).index_of(values), expected)


def shortest_seconds(work, repeats: int = 9) -> float:
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


@pytest.mark.slow
def test_a_table_costs_no_more_than_a_formula() -> None:
    """What Newton's method asks for, B and slope of H and H and slope of B, at 1e5 points."""
    curve, table = fm.FroehlichCurve(2000.0, 0.45, 2.0), fm.material("mnzn-power-25C")
    h = np.random.default_rng(0).lognormal(4.0, 2.0, (14_000, 7))

    def both_ways(material) -> None:
        b = material.flux_density(h)
        material.differential_permeability(h)
        material.differential_permeability(material.field_strength(b))

    seconds = {
        material: shortest_seconds(lambda m=material: both_ways(m)) for material in (curve, table)
    }
    assert seconds[table] < seconds[curve]
