from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

import femag as fm
from femag.errors import InputError
from femag.geometry import gap_length
from femag.geometry.gaps import Leg
from femag.hand import (
    FORMULAS,
    HandEstimate,
    core_sections,
    effective_parameters,
    gap_shapes,
    hand_estimates,
    network_state,
    plain_inductance,
    pot_network,
)
from femag.materials import MagnetisationCurve
from femag.result import solve
from femag.units import MU_0

FIELD = 650.1891e-6
"""Pot core 26/16 with 0.5 mm gap, H: computed for this project with a two-sided field solution
(650.1850 to 650.1921 uH) and NGSolve of order 7 on a graded mesh."""

LINEAR = fm.LinearCurve(2000.0)
POST, SPACER = (fm.Gap(0.5e-3),), (fm.Gap(0.4e-3, "all"),)


def estimates(design: fm.Design, **changes: object) -> dict[str, HandEstimate]:
    values = {"gaps": design.gaps, "turns": 50, "current": 1.0, "curve": LINEAR} | changes
    return {estimate.name: estimate for estimate in hand_estimates(design.core, **values)}


def direct_plain_inductance(design: fm.Design, gaps: tuple[fm.Gap, ...]) -> float:
    """N^2 over the sum of reluctances, N = 50, mu_r = 2000."""
    core, spacer, ground = design.core, gap_length(gaps, "all"), gap_length(gaps, "post")
    iron = sum(section.length / section.area for section in core_sections(core, ground))
    post = np.pi * (core.post_radius**2 - core.hole_radius**2)
    ring = np.pi * (core.outer_radius**2 - core.window_radius**2)
    air = (spacer + ground) / post + spacer / ring
    return 50**2 * MU_0 / (iron / 2000.0 + air)


@pytest.mark.parametrize(
    ("name", "error"),
    [
        ("no fringing", -24.67),
        ("gap added to diameter", -16.26),
        ("side path ratio (1, 2)", -16.08),
        ("logarithm of height", -9.27),
        ("probable flux paths", -0.18),
        ("long block, squared", -3.51),
        ("round edge", 1.59),
        ("disc in open space", -10.65),
    ],
)
def test_errors_on_the_pot_core_26_16_are_those_of_the_manual(
    pot_26_16: fm.Design, name: str, error: float
) -> None:
    """As measured against the reference, in per cent."""
    inductance = estimates(pot_26_16)[name].inductance
    assert 100 * (inductance / FIELD - 1) == pytest.approx(error, abs=0.01)


@pytest.mark.parametrize(
    ("hole", "leg", "errors"),
    [
        (0.0, "post", (-15.8, -8.6, -8.4, -0.7, 5.3, 2.4, 1.5, -3.7)),
        (5.5e-3, "all", (-29.9, -19.4, -19.3, -20.8, -1.5, -4.1, -0.6, -21.7)),
        (0.0, "all", (-25.4, -15.1, -15.0, -17.8, 1.8, -0.4, -1.0, -19.3)),
    ],
    ids=["solid post", "spacer", "spacer, solid post"],
)
def test_errors_without_hole_and_with_a_spacer_are_those_of_the_manual(
    pot_26_16: fm.Design, hole: float, leg: Leg, errors: tuple[float, ...]
) -> None:
    """The same core with 0.5 mm, measured against this package's own field, in per cent."""
    core = replace(pot_26_16.core, hole_diameter=hole)
    design = replace(pot_26_16, core=core, gaps=(fm.Gap(0.5e-3, leg),))
    field = solve(design, tolerance=1e-3).inductance.value
    found = [100 * (e.inductance / field - 1) for e in estimates(design).values()]
    np.testing.assert_allclose(found, errors, atol=0.1)


@pytest.mark.parametrize("hole", [2e-3, 5.5e-3, 7.5e-3])
@pytest.mark.parametrize("gap", [0.1e-3, 0.5e-3])
def test_the_round_edge_form_is_as_good_with_a_hole_as_without(
    pot_26_16: fm.Design, hole: float, gap: float
) -> None:
    """Within half a point of L; the hole moves the gap factor from 1.19 to 1.51 at 0.5 mm."""

    def error(diameter: float) -> float:
        core = replace(pot_26_16.core, hole_diameter=diameter)
        result = solve(replace(pot_26_16, core=core, gaps=(fm.Gap(gap),)))
        return {row.estimate.name: row.error for row in result.hand}["round edge"]

    assert error(hole) == pytest.approx(error(0.0), abs=0.005)


@pytest.mark.parametrize("gaps", [POST, SPACER, POST + SPACER], ids=["post", "spacer", "both"])
def test_every_formula_gives_more_than_no_fringing(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...]
) -> None:
    found = estimates(pot_26_16, gaps=gaps)
    assert list(found) == [formula.name for formula in FORMULAS]
    plain = found.pop("no fringing").inductance
    assert plain > 0.0
    assert all(estimate.inductance > plain for estimate in found.values())


@pytest.mark.parametrize("gaps", [(), POST, SPACER, POST + SPACER], ids=str)
@pytest.mark.parametrize("curve", [LINEAR, fm.FroehlichCurve(2000.0, 0.45, 2.0)], ids=str)
def test_no_fringing_is_the_plain_inductance(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...], curve: MagnetisationCurve
) -> None:
    plain = plain_inductance(pot_26_16.core, gaps, 50, 3.0, curve)
    found = estimates(pot_26_16, gaps=gaps, current=3.0, curve=curve)
    assert found["no fringing"].inductance == plain


@pytest.mark.parametrize("gaps", [(), POST, SPACER, POST + SPACER], ids=str)
def test_plain_inductance_is_turns_squared_over_the_series_reluctance(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...]
) -> None:
    plain = plain_inductance(pot_26_16.core, gaps, 50, 1.0, LINEAR)
    assert plain == pytest.approx(direct_plain_inductance(pot_26_16, gaps), rel=1e-10)


def test_an_ungapped_core_has_its_core_factor_and_one_estimate(pot_26_16: fm.Design) -> None:
    (only,) = hand_estimates(pot_26_16.core, (), 1, 1.0, LINEAR)
    assert only.name == "no fringing"
    assert only.in_range
    factor = effective_parameters(pot_26_16.core).c1
    assert only.inductance == pytest.approx(MU_0 * 2000.0 / factor, rel=1e-10)


def test_effective_permeability_of_a_gapped_core_gives_its_al_value(pot_26_16: fm.Design) -> None:
    """AL = mu0 mu_e / C1, with mu_e from the share of the gap in the path; iron counted once."""
    core = pot_26_16.core
    c1 = effective_parameters(core).c1
    gap = 0.5e-3 / (np.pi * (core.post_radius**2 - core.hole_radius**2))
    mu_e = 2000.0 * c1 / (c1 + (2000.0 - 1.0) * gap)
    al = plain_inductance(core, POST, 1, 1.0, LINEAR)
    assert al == pytest.approx(MU_0 * mu_e / c1, rel=1e-10)


def test_turns_enter_squared_at_equal_ampere_turns(pot_26_16: fm.Design) -> None:
    curve = fm.FroehlichCurve(2000.0, 0.45, 2.0)
    few = estimates(pot_26_16, turns=10, current=30.0, curve=curve)
    many = estimates(pot_26_16, turns=60, current=5.0, curve=curve)
    for name, estimate in few.items():
        assert many[name].inductance == pytest.approx(36 * estimate.inductance, rel=1e-12)


def test_a_linear_core_has_one_inductance_at_every_current(pot_26_16: fm.Design) -> None:
    one = estimates(pot_26_16)
    for current in (-3.0, 1e-3, 1e3):
        for name, estimate in estimates(pot_26_16, current=current).items():
            assert estimate.inductance == pytest.approx(one[name].inductance, rel=1e-11)


def test_saturation_lowers_every_estimate_towards_air(pot_26_16: fm.Design) -> None:
    curve = fm.FroehlichCurve(2000.0, 0.45, 2.0)
    rising = [estimates(pot_26_16, current=i, curve=curve) for i in (0.01, 3.0, 8.0, 30.0, 1e6)]
    linear, air = estimates(pot_26_16), estimates(pot_26_16, curve=fm.LinearCurve(1.0))
    for name in linear:
        values = [found[name].inductance for found in rising]
        assert values[0] == pytest.approx(linear[name].inductance, rel=1e-5)
        assert all(low < high for high, low in pairwise(values))
        assert values[-1] == pytest.approx(air[name].inductance, rel=2e-3)


def test_fringing_flux_passes_beside_the_gap(pot_26_16: fm.Design) -> None:
    formula = next(formula for formula in FORMULAS if formula.name == "round edge")
    branches = pot_network(pot_26_16.core, POST, 50.0, LINEAR, formula.factor)
    state = network_state(branches)
    block, fringe = (
        flux
        for branch, flux in zip(state.branches, state.flux, strict=True)
        if branch.start == "post gap"
    )
    (shape,) = gap_shapes(pot_26_16.core, POST)
    assert fringe / block == pytest.approx(formula.factor(shape) - 1.0, rel=1e-9)
    assert block + fringe == pytest.approx(state.flux[0], rel=1e-9)


def test_a_spacer_opens_post_and_ring_and_raises_the_window(pot_26_16: fm.Design) -> None:
    post, ring = gap_shapes(pot_26_16.core, POST + SPACER)
    assert (post.leg, ring.leg) == ("post", "ring")
    assert post.length == pytest.approx(0.9e-3)
    assert ring.length == pytest.approx(0.4e-3)
    assert post.window_height == ring.window_height == pytest.approx(11.4e-3)


def test_every_gap_has_to_be_in_range(pot_26_16: fm.Design) -> None:
    """0.5 mm is small for the post of 11.5 mm and not for the ring of 2.15 mm."""
    assert estimates(pot_26_16)["gap added to diameter"].in_range
    spacer = estimates(pot_26_16, gaps=(fm.Gap(0.5e-3, "all"),))
    assert not spacer["gap added to diameter"].in_range


@pytest.mark.parametrize("current", [0.0, np.nan, np.inf])
def test_a_current_that_drives_nothing_is_refused(pot_26_16: fm.Design, current: float) -> None:
    with pytest.raises(InputError, match="a current is needed"):
        plain_inductance(pot_26_16.core, POST, 50, current, LINEAR)


def test_no_turns_are_refused(pot_26_16: fm.Design) -> None:
    with pytest.raises(InputError, match="no turns"):
        hand_estimates(pot_26_16.core, POST, 0, 1.0, LINEAR)
