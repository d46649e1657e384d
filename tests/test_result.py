from dataclasses import replace
from importlib.metadata import version

import pytest

import femag as fm


def test_a_result_carries_what_its_numbers_rest_on(saturating_26_16: fm.Design) -> None:
    result = fm.solve(saturating_26_16, current=4.0, tolerance=2e-3)
    assert (result.design.current, result.design.tolerance) == (4.0, 2e-3)
    assert result.inductance.relative_half_width <= 2e-3
    assert result.versions["gapfield"] == version("gapfield")
    assert set(result.versions) >= {"python", "numpy", "scipy", "scikit-fem", "gmsh"}
    assert len(result.design_hash) == 64
    assert result.unknowns == result.solution.unknowns


def test_same_input_gives_the_same_numbers_bit_for_bit(saturating_26_16: fm.Design) -> None:
    one, two = (fm.solve(saturating_26_16) for _ in range(2))
    assert replace(one, seconds=0.0) == replace(two, seconds=0.0)


def test_definitions_of_the_inductances(pot_26_16: fm.Design) -> None:
    result = fm.solve(pot_26_16, current=2.0)
    energy = 2 * result.coenergy.value / 4.0
    assert result.inductance.value == pytest.approx(energy, rel=1e-12)
    assert result.apparent_inductance == pytest.approx(energy, rel=1e-9)
    assert result.incremental_inductance == pytest.approx(energy, rel=1e-9)
    assert result.al_value == pytest.approx(energy / 2500, rel=1e-12)
    assert result.fringing_factor == pytest.approx(energy / result.plain_inductance, rel=1e-12)
    assert result.flux_linkage == pytest.approx(2.0 * energy, rel=1e-9)


def test_inductances_part_in_saturation(saturating_26_16: fm.Design) -> None:
    result = fm.solve(saturating_26_16, current=10.0)
    energy, apparent = result.inductance.value, result.apparent_inductance
    assert result.incremental_inductance < 0.6 * apparent < 0.6 * energy


def test_hand_formulas_stand_beside_the_field(pot_26_16: fm.Design) -> None:
    result = fm.solve(pot_26_16)
    for row in result.hand:
        share = row.estimate.inductance / result.inductance.value
        assert row.error == pytest.approx(share - 1.0, rel=1e-12)
    plain = result.hand[0]
    assert plain.estimate.inductance == result.plain_inductance


def test_current_cannot_be_zero(pot_26_16: fm.Design) -> None:
    with pytest.raises(fm.InputError, match="a drive current is needed"):
        fm.solve(pot_26_16, current=0.0)


@pytest.mark.parametrize("current", [0.1, 10.0, 100.0])
def test_stored_energy_is_what_the_coenergy_leaves_of_current_times_linkage(
    saturating_26_16: fm.Design, current: float
) -> None:
    """W + W' = lambda I; a saturated core stores less than L I^2 / 2, which is its co-energy."""
    result = fm.solve(saturating_26_16, current=current)
    both = result.stored_energy + result.coenergy.value
    assert both == pytest.approx(result.flux_linkage * current, rel=1e-12)
    assert 0.0 < result.stored_energy < result.coenergy.value * (1 + 2e-3)
    if current > 1.0:
        assert result.stored_energy < 0.9 * result.coenergy.value


def test_a_linear_core_stores_half_of_inductance_times_current_squared(
    pot_26_16: fm.Design,
) -> None:
    result = fm.solve(pot_26_16, current=3.0)
    assert result.stored_energy == pytest.approx(result.inductance.value * 4.5, rel=1e-9)
