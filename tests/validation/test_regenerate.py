"""The stored references are what their scripts compute."""

import math
from itertools import pairwise

import numpy as np
import pytest

import validation.air_coils.regenerate as air_coils
import validation.core_loss.regenerate as core_loss
import validation.coupled_coils.regenerate as coupled_coils
import validation.gap_force.regenerate as gap_force
import validation.nonlinear_pot.regenerate as nonlinear_pot
import validation.round_post_fringing.regenerate as fringing
import validation.sphere.regenerate as sphere
import validation.uniform_field.regenerate as uniform_field
from validation.rows import table_of

LINES = {
    "air_coils": air_coils.lines,
    "coupled_coils": coupled_coils.lines,
    "nonlinear_pot": nonlinear_pot.lines,
    "sphere": sphere.lines,
    "uniform_field": uniform_field.lines,
}


@pytest.mark.slow
def test_the_core_loss_is_what_its_script_sums() -> None:
    for kept, again in zip(table_of("core_loss"), core_loss.lines(), strict=True):
        assert kept == again


@pytest.mark.parametrize("folder", LINES)
def test_reference_csv_is_what_the_script_writes(folder: str) -> None:
    stored, computed = table_of(folder), LINES[folder]()
    assert len(stored) == len(computed)
    for kept, again in zip(stored, computed, strict=True):
        assert kept.keys() == again.keys()
        for key, text in kept.items():
            try:
                assert float(again[key]) == pytest.approx(float(text), rel=2e-12), key
            except ValueError:
                assert again[key] == text


@pytest.mark.parametrize(("a_over_b", "g_over_a"), [(0.4, 0.1), (0.55, 0.2), (0.55, 0.5)])
def test_mode_matching_gives_the_stored_fringing_factors(a_over_b: float, g_over_a: float) -> None:
    line = next(
        line
        for line in table_of("round_post_fringing")
        if (float(line["a_over_b"]), float(line["g_over_a"])) == (a_over_b, g_over_a)
        and line["winding"] == "window"
    )
    factor, root = fringing.fringing_factors(1.0 / a_over_b, g_over_a, 1.0)
    assert factor == pytest.approx(float(line["factor"]), abs=2e-9)
    assert root == pytest.approx(float(line["root_factor"]), abs=1.5e-8)


def test_pulls_are_differences_of_mode_matching_and_of_the_bessel_integral() -> None:
    line = next(line for line in table_of("gap_force") if line["g_over_a"] == "0.5")
    pull = gap_force.post_pull(1.0 / float(line["a_over_b"]), float(line["g_over_a"]))
    assert pull == pytest.approx(float(line["value"]), abs=1.5e-8)
    (coils,) = [line for line in table_of("gap_force") if line["quantity"] == "coils"]
    assert gap_force.coil_pull() == pytest.approx(float(coils["value"]), rel=2e-12)


def test_mode_matching_converges_from_above() -> None:
    factors = [fringing.fringing_factors(2.5, 0.5, 1.0, functions)[0] for functions in (1, 2, 3, 4)]
    assert all(one > two for one, two in pairwise(factors))
    assert factors[3] == pytest.approx(factors[2], abs=1e-7)


def test_mutual_inductance_of_thin_coils_is_that_of_circles() -> None:
    """Radii 0.1 m at 0.1 m: elliptic integrals, computed for this project."""
    size = 1e-4
    one = air_coils.Coil(0.1 - size / 2, 0.1 + size / 2, size)
    other = air_coils.Coil(0.1 - size / 2, 0.1 + size / 2, size, 0.1)
    assert air_coils.mutual_inductance(one, other) == pytest.approx(4.940784630798e-8, rel=1e-6)


@pytest.mark.parametrize(
    ("material", "current_density"),
    [("saturating", 1e7), ("saturating", 5e7), ("linear 2000", 1e7)],
)
def test_the_co_energy_of_the_sphere_is_the_integral_of_its_flux_linkage(
    material: str, current_density: float
) -> None:
    points, weights = np.polynomial.legendre.leggauss(40)
    edges = np.concatenate([[0.0], np.geomspace(1e-3, 1.0, 12)])
    area = sphere.sphere_values(material, current_density).ampere_turns
    total = 0.0
    for low, high in pairwise(edges):
        shares = low + (high - low) * (points + 1.0) / 2.0
        linkages = [
            sphere.sphere_values(material, s * current_density).flux_linkage for s in shares
        ]
        total += area * (high - low) / 2.0 * float(weights @ linkages)
    assert total == pytest.approx(
        sphere.sphere_values(material, current_density).coenergy, rel=1e-9
    )


def test_the_linear_sphere_has_the_closed_inductance_of_a_thin_shell() -> None:
    """Sheet winding: L = (2 pi/3) mu0 a mu_r/(mu_r + 2); here for the field inside, B = 2 mu0 K."""
    values = sphere.sphere_values("linear 10", 1e7)
    sheet = 1e7 * (sphere.SHELL - sphere.SPHERE)
    b = 2.0 * sphere.MU_0 * sheet * 10.0 / 12.0
    assert values.flux_density == pytest.approx(b, rel=1e-12)


@pytest.mark.parametrize("current", [10.0, 1000.0])
def test_the_flux_linkage_of_the_pot_is_the_slope_of_its_co_energy(current: float) -> None:
    step = 1e-4 * current
    after, before = (
        nonlinear_pot.pot_values(current + sign * step)["coenergy"] for sign in (1.0, -1.0)
    )
    slope = (after - before) / (2.0 * step)
    assert slope == pytest.approx(nonlinear_pot.pot_values(current)["flux_linkage"], rel=1e-7)


def test_the_exact_field_carries_the_energy_of_its_closed_form() -> None:
    """Integral of mu0 H^2 over the cylinder, with the field integrated numerically."""
    radius, height = uniform_field.RADIUS, uniform_field.HEIGHT
    r = (np.arange(20_000) + 0.5) / 20_000 * radius
    for wall, zero in (("normal", radius), ("tangential", 2.0 * radius / 3.0)):
        h = (zero - r) / (radius * height)
        energy = uniform_field.MU_0 * 2.0 * math.pi * height * np.sum(r * h**2) * radius / 20_000
        assert energy == pytest.approx(uniform_field.inductance(wall, 1.0, 1.0), rel=1e-7)
