from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

import femag as fm
from femag.current_curve import InductanceCurve, inductance_curve
from femag.field.continuation import CommonMesh, relative_half_width, solutions_in_a_row
from femag.field.core_factor import solved_core_factor
from femag.field.design_problem import field_problem
from femag.units import MU_0
from validation.finite_post import run as finite_post
from validation.nonlinear_pot import run as nonlinear_pot
from validation.rows import table_of

CURRENTS = np.linspace(0.5, 8.0, 6)


@pytest.fixture(scope="module")
def saturating() -> fm.Design:
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11e-3, 5.5e-3)
    coil = fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3))
    return fm.Design(core, coil, fm.FroehlichCurve(2000, 0.45, 2), fm.Gap(0.5e-3), tolerance=2e-3)


@pytest.fixture(scope="module")
def curve(saturating: fm.Design) -> InductanceCurve:
    return inductance_curve(saturating, CURRENTS)


def test_one_mesh_serves_every_current_of_a_gapped_post() -> None:
    """Material F2, three currents: two-sided values as in validation/finite_post."""
    lines = [line for line in table_of("finite_post") if line["material"] == "saturating"]
    currents = [float(line["current"]) for line in lines]
    mesh = CommonMesh(finite_post.gapped_post(finite_post.MATERIALS["saturating"]), 5e-5)
    mesh.probe(currents)
    for line, (solution, _) in zip(lines, solutions_in_a_row(mesh.sides, currents), strict=True):
        assert relative_half_width(solution) <= 5e-5
        reference = float(line["coenergy"])
        assert solution.coenergy.lower <= reference * (1 + 1e-8)
        assert solution.coenergy.upper >= reference * (1 - 1e-8)
        linkage = np.mean(solution.flux_linkage_of_sides)
        assert linkage == pytest.approx(float(line["flux_linkage"]), rel=1e-4)


def test_slope_of_the_coenergy_is_the_flux_linkage_and_its_slope_the_incremental_inductance(
    saturating: fm.Design,
) -> None:
    """dW'/dI = lambda on either side, by differences on one mesh."""
    mesh = CommonMesh(field_problem(saturating), 5e-3)
    for current in (1.0, 3.0, 6.0):
        step = 1e-3 * current
        row = solutions_in_a_row(mesh.sides, [current - step, current, current + step])
        (low, _), (middle, state), (high, _) = row
        for side in range(2):
            energies = [s.coenergy.upper if side else s.coenergy.lower for s in (low, high)]
            linkage = middle.flux_linkage_of_sides[side]
            assert (energies[1] - energies[0]) / (2 * step) == pytest.approx(linkage, rel=3e-6)
            change = high.flux_linkage_of_sides[side] - low.flux_linkage_of_sides[side]
            slope = state.incremental_inductance_of_sides[side]
            assert change / (2 * step) == pytest.approx(slope, rel=2e-4)


def test_inductance_falls_and_flux_linkage_rises(curve: InductanceCurve) -> None:
    for low, high in pairwise(curve.points):
        assert high.flux_linkage > low.flux_linkage
        assert high.incremental_inductance < low.incremental_inductance
        assert high.apparent_inductance < low.apparent_inductance
        assert high.incremental_inductance < high.apparent_inductance
    for point in curve.points:
        assert point.coenergy.relative_half_width <= 2e-3
        assert point.coenergy.value > 0.5 * point.current * point.flux_linkage


def test_points_agree_with_single_solutions(curve: InductanceCurve, saturating: fm.Design) -> None:
    for point in curve.points[::2]:
        single = fm.solve(saturating, current=point.current, tolerance=5e-4)
        assert point.coenergy.lower <= single.coenergy.upper
        assert point.coenergy.upper >= single.coenergy.lower
        assert point.flux_linkage == pytest.approx(single.flux_linkage, rel=2e-3)


def test_saturation_currents_are_where_the_incremental_inductance_has_dropped(
    curve: InductanceCurve, saturating: fm.Design
) -> None:
    assert [entry.drop for entry in curve.saturation] == [0.1, 0.2, 0.3]
    for entry in curve.saturation:
        assert entry.current is not None
        found = fm.solve(saturating, current=entry.current, tolerance=5e-4).incremental_inductance
        assert found / curve.initial_inductance == pytest.approx(1 - entry.drop, abs=2e-3)


def test_initial_inductance_is_that_of_the_initial_permeability(
    curve: InductanceCurve, saturating: fm.Design
) -> None:
    linear = fm.solve(replace(saturating, material=fm.LinearCurve(2000)), tolerance=5e-4)
    assert curve.initial_inductance == pytest.approx(linear.inductance.value, rel=1e-3)


def test_a_linear_core_has_one_inductance_and_never_saturates(saturating: fm.Design) -> None:
    curve = inductance_curve(replace(saturating, material=fm.LinearCurve(2000)), [1.0, 5.0, 50.0])
    inductances = [2 * point.coenergy.value / point.current**2 for point in curve.points]
    assert inductances == pytest.approx([inductances[0]] * 3, rel=1e-9)
    assert all(entry.current is None for entry in curve.saturation)


def test_a_wider_gap_shears_the_curve(saturating: fm.Design) -> None:
    """The gap leaves the flux linkage at saturation and moves the current at which it comes."""
    gapped = [
        inductance_curve(replace(saturating, gaps=gaps), [0.02, 2.0, 20.0], drops=[0.3])
        for gaps in ((), fm.Gap(0.2e-3), fm.Gap(1e-3))
    ]
    currents = [curve.saturation[0].current for curve in gapped]
    initial = [curve.initial_inductance for curve in gapped]
    assert currents == sorted(currents)
    assert initial == sorted(initial, reverse=True)
    last = [curve.points[-1].flux_linkage for curve in gapped]
    assert last == pytest.approx([last[0]] * 3, rel=0.06)


def test_order_and_sign_of_the_currents_change_nothing(
    curve: InductanceCurve, saturating: fm.Design
) -> None:
    backwards = inductance_curve(saturating, -CURRENTS[::-1])
    for forth, back in zip(curve.points, backwards.points[::-1], strict=True):
        assert back.current == -forth.current
        assert back.flux_linkage == pytest.approx(-forth.flux_linkage, rel=1e-9)
        assert back.coenergy.value == pytest.approx(forth.coenergy.value, rel=1e-9)
    found = [entry.current for entry in backwards.saturation]
    assert found == pytest.approx([-entry.current for entry in curve.saturation], rel=1e-6)


def test_a_magnet_against_the_current_brings_saturation_later(saturating: fm.Design) -> None:
    def knee(remanence: float) -> float:
        gap = fm.Gap(0.5e-3, magnet=fm.Magnet(remanence))
        found = inductance_curve(
            replace(saturating, gaps=gap), np.linspace(0.2, 8.0, 7), 1e-2, drops=[0.3]
        )
        assert np.sign(found.points[0].magnet_flux_linkage) == np.sign(remanence)
        return found.saturation[0].current

    assert knee(-0.1) > knee(0.1)


def test_a_curve_in_1d_on_one_mesh() -> None:
    """Pot between ideal plates, three decades of current: as in validation/nonlinear_pot."""
    lines = table_of("nonlinear_pot")
    currents = [float(line["current"]) for line in lines]
    mesh = CommonMesh(nonlinear_pot.pot(), 1e-4)
    mesh.probe(currents)
    for line, (solution, _) in zip(lines, solutions_in_a_row(mesh.sides, currents), strict=True):
        reference = float(line["coenergy"])
        assert solution.coenergy.lower <= reference * (1 + 1e-6)
        assert solution.coenergy.upper >= reference * (1 - 1e-6)
        linkage = np.mean(solution.flux_linkage_of_sides)
        assert linkage == pytest.approx(float(line["flux_linkage"]), rel=1e-4)


@pytest.mark.parametrize(
    ("gaps", "exponent"),
    [
        ((), 6.0),
        ((fm.Gap(0.5e-3),), 1.0),
        pytest.param((), 1.0, marks=pytest.mark.slow),
        pytest.param((fm.Gap(0.5e-3),), 6.0, marks=pytest.mark.slow),
    ],
)
def test_steep_and_soft_knees_converge(
    saturating: fm.Design, gaps: tuple[fm.Gap, ...], exponent: float
) -> None:
    """From the linear range to 50 times the knee, with and without a gap."""
    design = replace(saturating, material=fm.FroehlichCurve(2000, 0.45, exponent), gaps=gaps)
    found = inductance_curve(design, np.geomspace(0.02, 100.0, 8), 5e-3)
    linkages = [point.flux_linkage for point in found.points]
    assert linkages == sorted(linkages)


@pytest.mark.slow
def test_silicon_steel_without_a_gap_converges(saturating: fm.Design) -> None:
    design = replace(saturating, material=fm.FroehlichCurve(1e5, 2.0, 6.0), gaps=())
    found = inductance_curve(design, np.geomspace(1e-3, 50.0, 8), 5e-3)
    assert found.points[-1].incremental_inductance < 1e-2 * found.initial_inductance


@pytest.mark.parametrize(
    "currents",
    [
        [1.0],
        [1.0, 1.0],
        [0.0, 1.0],
        [-1.0, 1.0],
        [0.0, 0.0, 1.0, 2.0],
        [1.0, 1e10],
        [1.0, float("nan")],
    ],
)  # fmt: skip
def test_bad_currents_get_one_line(saturating: fm.Design, currents: list[float]) -> None:
    with pytest.raises(fm.InputError, match=r"currents = .*: .*; accepted: two currents or more"):
        inductance_curve(saturating, currents)


def test_a_tolerance_out_of_reach_is_said(saturating: fm.Design) -> None:
    with pytest.raises(fm.InputError, match=r"drops = 1.5"):
        inductance_curve(saturating, [1.0, 2.0], 5e-3, drops=[1.5])


def test_a_curve_may_begin_without_current(curve: InductanceCurve, saturating: fm.Design) -> None:
    found = inductance_curve(saturating, [0.0, *CURRENTS])
    rest = found.points[0]
    assert (rest.current, rest.flux_linkage, rest.coenergy.value) == (0.0, 0.0, 0.0)
    assert rest.apparent_inductance == rest.incremental_inductance
    assert rest.incremental_inductance == pytest.approx(curve.initial_inductance, rel=1e-9)
    magnet = replace(saturating, gaps=fm.Gap(0.5e-3, magnet=fm.Magnet(0.1)))
    rest = inductance_curve(magnet, [0.0, 1.0, 2.0], 1e-2).points[0]
    assert rest.flux_linkage == rest.magnet_flux_linkage > 0.0
    assert rest.coenergy.upper < 0.0


def test_without_a_gap_the_core_decides_and_with_a_long_one_the_air(saturating: fm.Design) -> None:
    """Gapless: mu0 mu_i N^2/C1 up to leakage. Long gap: the core hardly matters, nor its knee."""
    bare = replace(saturating, gaps=())
    found = inductance_curve(bare, [1e-3, 1.0])
    wanted = MU_0 * 2000 * 50**2 / solved_core_factor(bare.core.turned, bare.core.window_height)
    assert found.initial_inductance == pytest.approx(wanted, rel=1e-2)
    assert found.points[-1].incremental_inductance < 0.1 * found.initial_inductance
    long = replace(saturating, gaps=fm.Gap(8e-3))
    airy = inductance_curve(long, [1e-3, 1.0])
    ideal = fm.solve(replace(long, material=fm.LinearCurve(1e5)), tolerance=2e-3)
    assert airy.initial_inductance == pytest.approx(ideal.inductance.value, rel=2e-2)
    drop = airy.points[-1].incremental_inductance / airy.initial_inductance
    assert drop == pytest.approx(1.0, abs=2e-3)
