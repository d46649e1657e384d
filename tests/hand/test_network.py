import numpy as np
import pytest
from scipy.optimize import brentq

from femag.errors import InputError, NewtonError
from femag.hand import Branch, NetworkState, network_state
from femag.hand import network as network_module
from femag.materials import AIR, FroehlichCurve, LinearCurve, MagnetisationCurve
from femag.units import MU_0

SOFT = FroehlichCurve(2000.0, 0.45, 1.0)
SHARP = FroehlichCurve(1e5, 0.45, 20.0)


def permeance_branch(start: str, end: str, permeance: float, mmf: float = 0.0) -> Branch:
    """Return a branch of constant permeance in H: an air tube 1 m long of the section due."""
    return Branch(start, end, 1.0, permeance / MU_0, AIR, mmf)


def bridge(mmf: float) -> tuple[Branch, ...]:
    """Five tubes of three materials and a source with a gap: no series or parallel reduction."""
    return (
        Branch("a", "d", 20e-3, 60e-6, SOFT, mmf),
        Branch("a", "b", 10e-3, 30e-6, SHARP),
        Branch("d", "b", 12e-3, 45e-6, SOFT),
        Branch("b", "c", 0.3e-3, 50e-6, AIR),
        Branch("a", "c", 15e-3, 25e-6, LinearCurve(500.0)),
        Branch("c", "d", 9e-3, 35e-6, SHARP),
    )


def outflow(state: NetworkState) -> dict[str, float]:
    total = dict.fromkeys(state.nodes, 0.0)
    for branch, flux in zip(state.branches, state.flux, strict=True):
        total[branch.start] += flux
        total[branch.end] -= flux
    return total


def ring(mmf: float, curve: MagnetisationCurve, gap: float) -> tuple[Branch, ...]:
    """Four core pieces in series, and a gap unless it is 0."""
    sizes = [(9e-3, 80e-6), (4e-3, 95e-6), (16e-3, 130e-6), (4e-3, 95e-6)]
    tubes = [(*size, curve) for size in sizes] + ([(gap, 80e-6, AIR)] if gap else [])
    return tuple(
        Branch(str(i), str((i + 1) % len(tubes)), *tube, mmf if i == 0 else 0.0)
        for i, tube in enumerate(tubes)
    )


def ampere_flux(branches: tuple[Branch, ...]) -> float:
    """Flux of a series loop from Ampere's law, by bracketing."""
    mmf = sum(branch.mmf for branch in branches)

    def excess(flux: float) -> float:
        fall = (b.length * float(b.curve.field_strength(np.array(flux / b.area))) for b in branches)
        return sum(fall) - mmf

    high = 1e-9
    while excess(high) < 0.0:
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=1e-300, rtol=1e-14))


def test_two_permeances_in_series() -> None:
    state = network_state(
        [permeance_branch("a", "b", 2e-6, 10.0), permeance_branch("b", "a", 3e-6)]
    )
    np.testing.assert_allclose(state.flux, 10.0 * 1.2e-6, rtol=1e-13)
    assert state.coenergy == pytest.approx(0.5 * 1.2e-6 * 10.0**2, rel=1e-13)


def test_parallel_permeances_add() -> None:
    state = network_state(
        [
            permeance_branch("a", "b", 5e-6, 8.0),
            permeance_branch("b", "a", 2e-6),
            permeance_branch("b", "a", 3e-6),
        ]
    )
    np.testing.assert_allclose(state.flux, np.array([20.0, 8.0, 12.0]) * 1e-6, rtol=1e-13)
    assert state.energy_inductance(0.5) == pytest.approx(2.5e-6 * 16.0**2, rel=1e-13)


def test_a_balanced_bridge_has_no_flux_in_its_middle() -> None:
    state = network_state(
        [
            permeance_branch("d", "a", 1e-6, 4.0),
            permeance_branch("a", "b", 2e-6),
            permeance_branch("a", "c", 4e-6),
            permeance_branch("b", "d", 3e-6),
            permeance_branch("c", "d", 6e-6),
            permeance_branch("b", "c", 7e-6),
        ]
    )
    assert abs(state.flux[-1]) < 1e-15 * state.flux[0] * 1e3
    assert state.flux[0] == pytest.approx(4.0 / (1e6 + 1 / 3.6e-6), rel=1e-13)


@pytest.mark.parametrize("mmf", [0.01, 3.0, 40.0, 5000.0])
def test_fluxes_sum_to_zero_at_every_node(mmf: float) -> None:
    state = network_state(bridge(mmf))
    for flux in outflow(state).values():
        assert abs(flux) < 1e-9 * np.max(np.abs(state.flux))


@pytest.mark.parametrize("mmf", [0.01, 3.0, 40.0, 5000.0])
def test_branch_fluxes_follow_from_the_potentials(mmf: float) -> None:
    state = network_state(bridge(mmf))
    at = dict(zip(state.nodes, state.potential, strict=True))
    for branch, flux in zip(state.branches, state.flux, strict=True):
        h = (at[branch.start] - at[branch.end] + branch.mmf) / branch.length
        b = float(branch.curve.flux_density(np.array(abs(h)))) * np.sign(h)
        assert flux == pytest.approx(b * branch.area, rel=1e-12)


@pytest.mark.parametrize("mmf", [0.01, 3.0, 40.0, 5000.0])
def test_coenergy_rises_by_the_flux_linkage(mmf: float) -> None:
    turns, current = 20, mmf / 20
    step = 1e-4 * current
    more, less = (
        network_state(bridge(turns * (current + sign * step))).coenergy for sign in (1, -1)
    )
    linkage = network_state(bridge(mmf)).flux_linkage(current)
    assert (more - less) / (2 * step) == pytest.approx(linkage, rel=1e-6)


@pytest.mark.parametrize("mmf", [0.01, 40.0, 5000.0])
def test_energy_and_coenergy_add_up_to_flux_linkage_times_current(mmf: float) -> None:
    state = network_state(bridge(mmf))
    energy = sum(
        branch.area
        * branch.length
        * float(branch.curve.energy_density(np.array(abs(flux) / branch.area)))
        for branch, flux in zip(state.branches, state.flux, strict=True)
    )
    assert energy + state.coenergy == pytest.approx(state.flux_linkage(1.0), rel=1e-9)


@pytest.mark.parametrize("curve", [SOFT, SHARP, FroehlichCurve(60.0, 1.2, 2.0)], ids=str)
@pytest.mark.parametrize("gap", [0.0, 0.05e-3, 0.5e-3])
@pytest.mark.parametrize("mmf", [0.05, 20.0, 200.0, 5e4])
def test_a_series_loop_obeys_amperes_law(curve: FroehlichCurve, gap: float, mmf: float) -> None:
    branches = ring(mmf, curve, gap)
    flux = network_state(branches).flux
    np.testing.assert_allclose(flux, ampere_flux(branches), rtol=1e-9)


@pytest.mark.parametrize("permeability", [1.5, 2000.0, 1e5])
@pytest.mark.parametrize("exponent", [1.0, 6.0, 20.0])
@pytest.mark.parametrize("gap", [0.0, 1e-6, 0.5e-3, 8e-3])
def test_newton_converges_over_six_decades_of_current(
    permeability: float, exponent: float, gap: float
) -> None:
    curve = FroehlichCurve(permeability, 0.45, exponent)
    for current in np.logspace(-3, 3, 13):
        flux = network_state(ring(50 * current, curve, gap)).flux
        np.testing.assert_allclose(flux, flux[0], rtol=1e-8)


def test_reversing_the_source_reverses_the_fluxes() -> None:
    there, back = network_state(bridge(40.0)), network_state(bridge(-40.0))
    np.testing.assert_allclose(back.flux, -there.flux, rtol=1e-9)
    assert back.coenergy == pytest.approx(there.coenergy, rel=1e-12)


def test_a_tube_closed_on_itself_needs_no_potential() -> None:
    state = network_state([Branch("a", "a", 0.1, 50e-6, SOFT, 30.0)])
    assert state.flux[0] == pytest.approx(50e-6 * float(SOFT.flux_density(np.array(300.0))))


def test_parts_that_are_not_connected_are_solved_side_by_side() -> None:
    one, two = ring(20.0, SOFT, 0.1e-3), ring(200.0, SHARP, 0.0)
    renamed = tuple(
        Branch("x" + b.start, "x" + b.end, b.length, b.area, b.curve, b.mmf) for b in two
    )
    both = network_state(one + renamed)
    apart = network_state(one).coenergy + network_state(two).coenergy
    assert both.coenergy == pytest.approx(apart, rel=1e-12)


def test_a_network_without_source_is_at_rest() -> None:
    state = network_state(ring(0.0, SOFT, 0.1e-3))
    assert state.coenergy == 0.0
    assert not np.any(state.flux)


def test_a_constant_permeance_is_an_air_tube_of_that_permeance() -> None:
    branch = permeance_branch("a", "b", 3e-6)
    assert MU_0 * branch.area / branch.length == pytest.approx(3e-6)


def test_the_error_of_a_failed_iteration_holds_its_history(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(network_module, "MAXIMUM_ITERATIONS", 2)
    with pytest.raises(NewtonError) as caught:
        network_state(ring(500.0, SHARP, 1e-6))
    assert len(caught.value.history) == 2


@pytest.mark.parametrize(("length", "area"), [(0.0, 1e-6), (1e-3, -1e-6), (np.nan, 1e-6)])
def test_a_branch_without_size_is_refused(length: float, area: float) -> None:
    with pytest.raises(InputError, match="positive size"):
        Branch("a", "b", length, area, AIR)


def test_a_source_that_is_no_number_is_refused() -> None:
    with pytest.raises(InputError, match="ampere turns"):
        Branch("a", "b", 1e-3, 1e-6, AIR, np.inf)


def test_an_empty_network_is_refused() -> None:
    with pytest.raises(InputError, match="without branches"):
        network_state([])
