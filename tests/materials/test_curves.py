import mpmath
import numpy as np
import pytest

import femag as fm
from femag.materials import ResaturatedCurve, ScaledCurve, TabulatedCurve
from femag.units import MU_0

CURVES = [
    fm.LinearCurve(1.0),
    fm.LinearCurve(2000.0),
    *(
        fm.FroehlichCurve(mu, js, n)
        for mu in (1.5, 60.0, 2000.0, 1e5)
        for js in (0.3, 2.4)
        for n in (1.0, 1.3, 2.0, 6.0, 20.0)
    ),
    *(ScaledCurve(fm.FroehlichCurve(2000.0, 0.45, 2.0), factor) for factor in (0.4, 1.0, 2.5)),
    ScaledCurve(fm.LinearCurve(300.0), 1.2),
    ResaturatedCurve(fm.FroehlichCurve(2000.0, 0.45, 2.0), 0.7),
    ResaturatedCurve(fm.material("mnzn-power-60C"), 1.3),
    *(curve for material in fm.material_library() for _, curve in material.curves),
    fm.material("mnzn-power-60C"),
    ScaledCurve(fm.material("silicon-steel"), 1.7),
    TabulatedCurve(((10.0, 0.2), (20.0, 0.21), (1e3, 0.21 + MU_0 * 980.0))),
    TabulatedCurve(((10.0, 1e-3), (20.0, 0.4), (30.0, 0.5), (31.0, 0.9))),
]
H = np.concatenate([[0.0], np.logspace(-3, 7, 300)])


@pytest.mark.parametrize("curve", CURVES, ids=repr)
def test_flux_density_and_field_strength_are_inverse(curve) -> None:
    b = curve.flux_density(H)
    np.testing.assert_allclose(curve.field_strength(b), H, rtol=1e-9, atol=1e-12)


@pytest.mark.parametrize("curve", CURVES, ids=repr)
def test_energies_are_a_legendre_pair_to_rounding(curve) -> None:
    b = curve.flux_density(H)
    product = b * H
    both = curve.energy_density(b) + curve.coenergy_density(H)
    np.testing.assert_allclose(both, product, rtol=1e-13)


@pytest.mark.parametrize("curve", CURVES, ids=repr)
def test_fenchel_young_holds_off_the_curve(curve) -> None:
    b = curve.flux_density(H)[None, 1:]
    h = H[1:, None]
    excess = curve.energy_density(b) + curve.coenergy_density(h) - b * h
    assert np.all(excess >= -1e-12 * b * h)


@pytest.mark.parametrize("curve", CURVES, ids=repr)
def test_slope_and_energies_are_derivatives(curve) -> None:
    h = 1.03 * np.logspace(-1, 5, 60)  # no point of a table: its slope has kinks there
    step = 1e-5 * h
    slope = (curve.flux_density(h + step) - curve.flux_density(h - step)) / (2 * step)
    np.testing.assert_allclose(curve.differential_permeability(h), slope, rtol=1e-6)
    b = (curve.coenergy_density(h + step) - curve.coenergy_density(h - step)) / (2 * step)
    np.testing.assert_allclose(curve.flux_density(h), b, rtol=1e-6)


@pytest.mark.parametrize("curve", CURVES, ids=repr)
def test_no_material_lets_less_flux_through_than_air(curve) -> None:
    """At no field is the slope below mu0, and far out it is mu0."""
    if curve.initial_permeability > 1.0:
        assert np.all(np.diff(curve.flux_density(H)) > 0.0)
    slope = curve.differential_permeability(H)
    factor = getattr(curve, "factor", 1.0)
    assert np.all(slope >= factor * MU_0 * (1.0 - 1e-12))
    if not curve.is_linear:
        assert curve.differential_permeability(np.array(1e13)) == pytest.approx(factor * MU_0)


@pytest.mark.parametrize("exponent", [1.0, 1.3, 2.0, 6.0, 20.0])
@pytest.mark.parametrize("share", [1e-4, 0.3, 1.0, 3.0, 1e4])
def test_coenergy_equals_quadrature(exponent: float, share: float) -> None:
    """Reference library: mpmath's adaptive quadrature at 30 digits."""
    curve = fm.FroehlichCurve(2000.0, 0.45, exponent)
    knee = 0.45 / (MU_0 * 1999.0)
    with mpmath.workdps(30):
        polarisation = mpmath.quad(
            lambda t: t * (1 + t**exponent) ** (-1 / mpmath.mpf(exponent)),
            [0, min(share, 1), share] if share > 1 else [0, share],
        )
        expected = float(0.45 * knee * polarisation) + 0.5 * MU_0 * (share * knee) ** 2
    assert curve.coenergy_density(np.array(share * knee)) == pytest.approx(expected, rel=1e-11)


def test_froehlich_with_exponent_one_has_the_textbook_form() -> None:
    """B = mu0 (H + Ms H/(H + Hc)), Hc = Ms/(mu_i - 1), and its closed inverse and co-energy.

    Closed forms: computed for this project by hand from the definition.
    """
    curve = fm.FroehlichCurve(2000.0, 0.45)
    ms = 0.45 / MU_0
    hc = ms / 1999.0
    np.testing.assert_allclose(curve.flux_density(H), MU_0 * (H + ms * H / (H + hc)), rtol=1e-14)
    b = np.linspace(0.01, 2.0, 50)
    p = hc + ms - b / MU_0
    closed = (-p + np.sqrt(p**2 + 4 * b * hc / MU_0)) / 2
    np.testing.assert_allclose(curve.field_strength(b), closed, rtol=1e-9)
    h = H[H > 1.0]
    coenergy = MU_0 * (h**2 / 2 + ms * (h - hc * np.log1p(h / hc)))
    np.testing.assert_allclose(curve.coenergy_density(h), coenergy, rtol=1e-9)


def test_limits_of_the_curve() -> None:
    curve = fm.FroehlichCurve(2000.0, 0.45, 2.0)
    ends = curve.differential_permeability(np.array([0.0, 1e12])) / MU_0
    np.testing.assert_allclose(ends, [2000.0, 1.0], rtol=1e-9)
    assert curve.flux_density(np.array(1e9)) - MU_0 * 1e9 == pytest.approx(0.45, rel=1e-6)


@pytest.mark.parametrize(
    ("make", "key"),
    [
        (lambda: fm.LinearCurve(0.9), "permeability"),
        (lambda: fm.LinearCurve(float("nan")), "permeability"),
        (lambda: fm.FroehlichCurve(1.0, 0.4), "permeability"),
        (lambda: fm.FroehlichCurve(2000.0, 0.0), "saturation"),
        (lambda: fm.FroehlichCurve(2000.0, 0.4, 0.9), "exponent"),
    ],
)
def test_impossible_parameters_are_refused(make, key: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        make()
    assert caught.value.key == key
    assert caught.value.accepted
