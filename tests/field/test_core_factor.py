"""Ungapped cores beside their published core factor, and what the factor on H leaves alone."""

from dataclasses import replace
from math import log, pi

import pytest

import femag as fm
from femag.field.core_factor import core_curve, solved_core_factor
from femag.geometry import Core, TurnedCore, catalogue_core, core_factor
from femag.materials import LinearCurve, ScaledCurve
from femag.units import MU_0


def ungapped_al(core: Core, permeability: float) -> float:
    design = fm.Design(core, fm.Winding(1), LinearCurve(permeability), tolerance=2e-3)
    return fm.solve(design).al_value


@pytest.mark.parametrize("size", ["RM 8", "PQ 26/20", "ETD 29/16/10", "PM 62/49", "EP 13"])
def test_ungapped_core_has_the_published_core_factor(size: str) -> None:
    """AL = mu0 mu_r / (sum l/A); what leaks through the window adds less than 1 % at 5000."""
    core = catalogue_core(size).core()
    found = ungapped_al(core, 5000.0) / (MU_0 * 5000.0 / core_factor(core))
    assert 0.998 < found < 1.008


def test_core_factor_of_a_toroid_like_pot_is_the_sum_of_its_parts() -> None:
    """Wide thin shell: corners hardly count, each wall is l/A (IEC 60205, general rules)."""
    t, r, h = 0.1e-3, 10e-3, 8e-3
    turned = TurnedCore(r - t, r, r + 8e-3, r + 8e-3 + t, ((r - t, t), (r + 8e-3 + t, t)))
    walls = h / (pi * (r**2 - (r - t) ** 2)) + h / turned.ring_area
    plates = 2 * log((r + 8e-3 + t / 2) / (r - t / 2)) / (2 * pi * t)
    assert solved_core_factor(turned, h) == pytest.approx(walls + plates, rel=0.01)


def test_pot_cores_are_solved_as_they_are(pot_26_16: fm.Design) -> None:
    assert core_curve(pot_26_16.core, pot_26_16.material) is pot_26_16.material


def test_saturation_keeps_its_flux_density() -> None:
    """The factor stretches H only: far into saturation the post's flux density hardly knows it."""
    core = catalogue_core("PQ 26/20").core()
    curve = fm.FroehlichCurve(2200, 0.4, 4)
    assert isinstance(core_curve(core, curve), ScaledCurve)
    means = []
    for factor in (core_factor(core), 1.5 * core_factor(core)):
        changed = replace(core, core_factor=factor)
        design = fm.Design(changed, fm.Winding(20), curve, fm.Gap(0.3e-3), 25.0, tolerance=1e-2)
        means.append(fm.solve(design).section_means[1].flux_density)
    assert means[1] == pytest.approx(means[0], rel=0.03)
    assert means[0] > 0.4


def test_a_core_of_air_is_solved_although_the_factor_is_below_one() -> None:
    """Relative permeability 1: the factor of a PQ core is about 0.8, which is no material."""
    core = catalogue_core("PQ 26/20").core()
    design = fm.Design(core, fm.Winding(10), fm.LinearCurve(1.0), tolerance=1e-2)
    assert fm.solve(design).inductance.relative_half_width <= 1e-2
