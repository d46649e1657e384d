from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq

import femag as fm
from femag.errors import InputError
from femag.geometry import gap_length
from femag.geometry.effective import core_sections, effective_parameters
from femag.geometry.gaps import Leg
from femag.hand import (
    FORMULAS,
    HandEstimate,
    core_network,
    gap_shapes,
    hand_estimates,
    network_state,
    plain_inductance,
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
    post = np.pi * (core.turned.post_radius**2 - core.turned.hole_radius**2)
    ring = np.pi * (core.turned.ring_outer_radius**2 - core.window_radius**2)
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
    gap = 0.5e-3 / (np.pi * (core.turned.post_radius**2 - core.turned.hole_radius**2))
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
    branches = core_network(pot_26_16.core, POST, 50.0, LINEAR, formula.factor)
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


@pytest.mark.parametrize(
    ("kind", "errors"),
    [
        ({"rim_length": 1e-3}, (-19.7, -8.1, -7.7, -0.4, 7.6, 4.5, 2.5, -3.2)),
        ({"step": fm.Step(8e-3, 0.1e-3)}, (-7.1, -4.6, -4.5, -1.8, 0.3, -0.7, -1.0, -2.9)),
        ({"chamfer": 0.3e-3}, (-14.6, -6.8, -6.4, -2.0, 3.2, 1.2, -0.1, -3.8)),
        ({"edge_radius": 0.3e-3}, (-14.8, -7.2, -6.8, -2.5, 2.6, 0.7, -0.6, -4.2)),
    ],
    ids=str,
)
def test_errors_with_shaped_faces_are_those_of_the_manual(
    pot_26_16: fm.Design, kind: dict[str, object], errors: tuple[float, ...]
) -> None:
    """Solid post, 0.5 mm, measured against this package's own field, in per cent."""
    core = replace(pot_26_16.core, hole_diameter=0.0)
    design = replace(pot_26_16, core=core, gaps=(fm.Gap(0.5e-3, **kind),))
    found = [100 * row.error for row in solve(design, tolerance=1e-3).hand]
    np.testing.assert_allclose(found, errors, atol=0.1)


def block_reluctance(area: float, length: float, permeability: float = 1.0) -> float:
    return length / (MU_0 * permeability * area)


POST_AREA = np.pi * (5.75e-3**2 - 2.75e-3**2)
INSIDE, OUTSIDE = np.pi * (4e-3**2 - 2.75e-3**2), np.pi * (5.75e-3**2 - 4e-3**2)
SLOPE = 0.5e-3 / 3e-3
SHAPED = {
    "taper": (
        fm.Gap(0.5e-3, rim_length=1e-3),
        # 2 pi/b [r1 - r0 - (a/b) ln(l1/l0)] for l = a + b r
        1 / (MU_0 * 2 * np.pi / SLOPE * (3e-3 - (0.5e-3 / SLOPE - 2.75e-3) * np.log(2.0))),
    ),
    "chamfer": (
        fm.Gap(0.5e-3, chamfer=0.3e-3),
        # flat up to the cut at c, then 2 pi r/(l + 2 (r - c)): pi [x - (l/2 - c) ln(l1/l)]
        1
        / MU_0
        / (
            np.pi * (5.45e-3**2 - 2.75e-3**2) / 0.5e-3
            + np.pi * (0.3e-3 - (0.25e-3 - 5.45e-3) * np.log(1.1 / 0.5))
        ),
    ),
    "step": (
        fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.1e-3)),
        1
        / (
            1 / block_reluctance(OUTSIDE, 0.5e-3)
            + 1 / (block_reluctance(INSIDE, 0.1e-3) + block_reluctance(INSIDE, 0.4e-3, 2000.0))
        ),
    ),
    "closed step": (
        fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0)),
        1 / (1 / block_reluctance(OUTSIDE, 0.5e-3) + 1 / block_reluctance(INSIDE, 0.5e-3, 2000.0)),
    ),
    "deep step": (
        fm.Gap(0.5e-3, step=fm.Step(8e-3, 1e-3)),
        1 / (1 / block_reluctance(OUTSIDE, 0.5e-3) + 1 / block_reluctance(INSIDE, 1e-3)),
    ),
}


@pytest.mark.parametrize(("gap", "reluctance"), SHAPED.values(), ids=SHAPED)
def test_the_block_of_a_shaped_gap_is_the_permeance_between_its_faces(
    pot_26_16: fm.Design, gap: fm.Gap, reluctance: float
) -> None:
    """Closed forms; inside of a step core and gap lie in series, beside the gap outside of it."""
    iron = sum(s.length / s.area for s in core_sections(pot_26_16.core, 0.5e-3))
    wanted = 50**2 / (iron / (MU_0 * 2000.0) + reluctance)
    found = plain_inductance(pot_26_16.core, (gap,), 50, 1.0, LINEAR)
    assert found == pytest.approx(wanted, rel=1e-9)


@pytest.mark.parametrize(("gap", "reluctance"), SHAPED.values(), ids=SHAPED)
def test_no_formula_is_in_range_for_a_shaped_gap(
    pot_26_16: fm.Design, gap: fm.Gap, reluctance: float
) -> None:
    found = estimates(pot_26_16, gaps=(gap,))
    assert not any(estimate.in_range for estimate in found.values())
    plain = found.pop("no fringing").inductance
    assert all(estimate.inductance > plain for estimate in found.values())


def test_fringing_starts_where_the_faces_end(pot_26_16: fm.Design) -> None:
    """The formulas get the length at the rim, with its chamfers; at a plate with its image."""

    def length(**kind: object) -> float:
        (shape,) = gap_shapes(pot_26_16.core, (fm.Gap(0.5e-3, **kind),))
        return 1e3 * shape.length

    assert length(rim_length=1e-3) == pytest.approx(1.0)
    assert length(chamfer=0.3e-3) == length(edge_radius=0.3e-3) == pytest.approx(1.1)
    assert length(step=fm.Step(8e-3, 0.1e-3)) == pytest.approx(0.5)
    assert length(rim_length=1e-3, offset=5.25e-3) == pytest.approx(2.0)
    assert length(chamfer=0.3e-3, offset=5.25e-3) == pytest.approx(1.6)


@pytest.mark.parametrize("remanence", [0.3, -0.3])
@pytest.mark.parametrize("current", [1.0, 6.0])
def test_the_network_with_a_magnet_is_the_circuit_of_one_loop(
    pot_26_16: fm.Design, remanence: float, current: float
) -> None:
    """The flux from one equation, N I = sum of l H(phi/A) + l (phi/A - Br)/mu, solved by bisection,
    and the inductance 2/I^2 times the integral of lambda(i) - lambda(0) over the current."""
    curve = fm.FroehlichCurve(2000.0, 0.45, 2.0)
    gap = fm.Gap(0.5e-3, magnet=fm.Magnet(remanence, 1.1))
    sections = core_sections(pot_26_16.core, 0.5e-3)
    length, area = (np.array([getattr(s, name) for s in sections]) for name in ("length", "area"))

    def drop(flux: float) -> float:
        b = flux / area
        iron = np.sum(length * np.copysign(curve.field_strength(np.abs(b)), b))
        return float(iron + 0.5e-3 * (flux / POST_AREA - remanence) / (MU_0 * 1.1))

    def linkage(amperes: float) -> float:
        limits = (-2.0 * POST_AREA, 2.0 * POST_AREA)
        return 50 * brentq(lambda flux: drop(flux) - 50 * amperes, *limits, xtol=1e-18)

    idle = linkage(0.0)
    added, _ = quad(lambda i: linkage(i) - idle, 0.0, current, epsrel=1e-10, limit=200)
    found = plain_inductance(pot_26_16.core, (gap,), 50, current, curve)
    assert found == pytest.approx(2 * added / current**2, rel=1e-7)


def test_a_magnet_in_a_spacer_drives_flux_through_both_legs(pot_26_16: fm.Design) -> None:
    """Without current and with ideal iron: flux 2 Br/(1/A_post + 1/A_ring)."""
    gap = fm.Gap(0.4e-3, "all", magnet=fm.Magnet(0.3, 1.1))
    ring = np.pi * (12.75e-3**2 - 10.6e-3**2)
    branches = core_network(pot_26_16.core, (gap,), 0.0, fm.LinearCurve(1e6), FORMULAS[0].factor)
    flux = network_state(branches).flux_through("post")
    assert flux == pytest.approx(2 * 0.3 / (1 / POST_AREA + 1 / ring), rel=1e-3)
