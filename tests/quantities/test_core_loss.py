from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.design_file import design_from_toml
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.field.swing import swing
from femag.quantities import core_loss, volume_shares
from femag.quantities.waveform_factor import waveform_factor
from femag.units import MU_0

LOSS = fm.Steinmetz(1.5, 1.45, 2.6, (25e3, 300e3), (0.03, 0.3))
RIPPLE = fm.Ripple(0.8, 1e5, rise=0.4)


@pytest.fixture(scope="module")
def linear() -> fm.Design:
    return fm.Design(
        core=fm.catalogue_core("P 26/16").core(), gaps=(fm.Gap(0.5e-3),),
        windings=(fm.Winding(50, conductor=fm.RoundWire(0.4e-3)),),
        material=fm.LinearCurve(2000.0, LOSS), current=2.0, ripple=RIPPLE,
    )  # fmt: skip


@pytest.fixture(scope="module")
def solved(linear: fm.Design) -> fm.Result:
    return fm.solve(linear)


def loss_of(result: fm.Result) -> fm.CoreLoss:
    assert result.core_loss is not None
    return result.core_loss


def solution_of(design: fm.Design, tolerance: float | None = None) -> FieldSolution:
    tolerance = tolerance or design.tolerance
    return adapted_solution(field_problem(design), design.current, tolerance)[0]


def core_loss_alone(design: fm.Design, tolerance: float | None = None) -> fm.CoreLoss:
    """As in `solve`, without what else that answers."""
    assert design.ripple is not None
    return core_loss(solution_of(design, tolerance), design.ripple, LOSS)


def test_loss_is_the_power_law_of_the_swing_summed_over_the_core(solved: fm.Result) -> None:
    """In a linear core B goes with the current: the swing is 0.8/2 of B at the peak."""
    loss, solution = loss_of(solved), solved.solution
    assert solution is not None
    mesh = solution.sides.mesh
    core = np.array([name.split()[-1] in ("post", "plate", "ring") for name in mesh.names])
    inside = core[mesh.region]
    fields = solution.flux.field, MU_0 * 2000.0 * solution.potential.field
    factor = waveform_factor(RIPPLE, 1.45, 2.6)
    for field, found in zip(fields, loss.total_of_sides, strict=True):
        b = np.hypot(*field[inside].transpose(1, 0, 2))
        density = LOSS.k * 1e5**1.45 * (0.5 * 0.8 / 2.0 * b) ** 2.6
        total = np.sum(solution.sides.discretisation.weight[inside] * density)
        assert found == pytest.approx(factor * total, rel=1e-12)
    assert loss.total == pytest.approx(sum(loss.total_of_sides) / 2.0)
    assert loss.bend == pytest.approx(0.0, abs=1e-12)


def test_the_parts_are_the_whole(solved: fm.Result) -> None:
    loss, core = loss_of(solved), solved.design.core
    assert sum(part.loss for part in loss.parts) == pytest.approx(loss.total)
    volumes = {part.name: part.volume for part in loss.parts}
    assert isinstance(core, fm.PotCore)
    post = np.pi * (core.post_diameter**2 - core.hole_diameter**2) / 4.0
    assert volumes["post"] == pytest.approx(post * (core.window_height - 0.5e-3))
    ring = np.pi * (core.outer_diameter**2 - core.window_diameter**2) / 4.0
    assert volumes["ring"] == pytest.approx(ring * core.window_height)
    plates = np.pi * (core.outer_diameter**2 - core.hole_diameter**2) / 4.0
    assert volumes["plates"] == pytest.approx(plates * (core.height - core.window_height))


def test_loss_scales_with_the_powers_of_frequency_and_swing(linear: fm.Design) -> None:
    solution, _ = adapted_solution(field_problem(linear), 2.0, 1e-2)
    own = core_loss(solution, RIPPLE, LOSS).total
    faster = core_loss(solution, replace(RIPPLE, frequency=3e5), LOSS).total
    larger = core_loss(solution, replace(RIPPLE, peak_to_peak=2.4), LOSS).total
    assert faster / own == pytest.approx(3.0**1.45)
    assert larger / own == pytest.approx(3.0**2.6)


def test_a_linear_core_knows_no_bias(linear: fm.Design) -> None:
    low, high = (core_loss_alone(replace(linear, current=i)).total for i in (0.4, 5.0))
    assert low == pytest.approx(high, rel=1e-9)


def test_loss_converges_with_the_mesh_and_the_sides_meet(linear: fm.Design) -> None:
    coarse, fine, finest = (core_loss_alone(linear, tolerance) for tolerance in (1e-3, 1e-4, 1e-5))
    assert coarse.total == pytest.approx(finest.total, rel=1e-3)
    assert fine.total == pytest.approx(finest.total, rel=2e-4)
    apart = [abs(np.diff(loss.total_of_sides)[0]) / loss.total for loss in (coarse, fine, finest)]
    assert apart[0] < 5e-3
    assert apart[2] < 0.5 * apart[1] < 0.05 * apart[0]


def test_a_saturating_core_in_its_straight_part_is_nearly_linear(linear: fm.Design) -> None:
    curve = fm.FroehlichCurve(2000.0, 0.45, 6.0, LOSS)
    bent = core_loss_alone(replace(linear, material=curve, current=0.85))
    straight = core_loss_alone(replace(linear, current=0.85))
    assert bent.total == pytest.approx(straight.total, rel=2e-3)
    assert abs(bent.bend) < 1e-3


def test_a_saturated_core_swings_less_and_bends(linear: fm.Design, solved: fm.Result) -> None:
    curve = fm.FroehlichCurve(2000.0, 0.45, 2.0, LOSS)
    design = replace(linear, material=curve, ripple=replace(RIPPLE, peak_to_peak=2.0))
    solution = solution_of(replace(design, current=5.0), 1e-2)
    deep = core_loss(solution, RIPPLE, LOSS)
    assert deep.total < 0.2 * loss_of(solved).total
    knee = core_loss(solution, replace(RIPPLE, peak_to_peak=4.0), LOSS)
    assert 0.02 < knee.bend < 0.5


def test_the_swing_of_a_saturating_core_is_the_difference_of_two_solutions(
    linear: fm.Design,
) -> None:
    """The flux linkage of the change alone is that of the peak less that of the trough."""
    design = replace(linear, material=fm.FroehlichCurve(2000.0, 0.45, 2.0, LOSS))
    high, low = (solution_of(replace(design, current=current)) for current in (5.0, 2.0))
    between = swing(high, 2.0)
    flux = float(high.sides.flux.load @ between.unknowns)
    apart = high.flux_linkage_of_sides[0] - low.flux_linkage_of_sides[0]
    assert flux == pytest.approx(apart, rel=1e-3)


def test_a_trough_at_zero_swings_by_the_whole_field(linear: fm.Design) -> None:
    design = replace(linear, material=fm.FroehlichCurve(2000.0, 0.45, 2.0, LOSS))
    solution = solution_of(design)
    loss = core_loss(solution, fm.Ripple(2.0, 1e5), LOSS)
    swings = [share.flux_density for share in loss.volume_shares]
    peaks = [share.flux_density for share in volume_shares(solution)]
    assert swings == pytest.approx([0.5 * b for b in peaks], rel=5e-3)


def test_a_magnet_biases_and_does_not_swing(linear: fm.Design) -> None:
    plain = replace(linear, gaps=(fm.Gap(0.5e-3, permeability=1.05),))
    biased = replace(linear, gaps=(fm.Gap(0.5e-3, magnet=fm.Magnet(-0.3, 1.05)),))
    losses = [core_loss_alone(design).total for design in (plain, biased)]
    assert losses[0] == pytest.approx(losses[1], rel=2e-3)


def test_a_negative_current_loses_as_much(linear: fm.Design, solved: fm.Result) -> None:
    turned = core_loss_alone(replace(linear, current=-2.0))
    assert turned.total == pytest.approx(loss_of(solved).total, rel=1e-9)


def test_what_lies_outside_of_the_fit_is_marked(linear: fm.Design) -> None:
    solution, _ = adapted_solution(field_problem(linear), 2.0, 1e-2)
    inside = core_loss(solution, RIPPLE, replace(LOSS, flux_densities=(1e-6, 1.0)))
    assert (inside.frequency_in_range, inside.share_in_range) == (True, 1.0)
    outside = core_loss(solution, RIPPLE, replace(LOSS, frequencies=(1e3, 2e3)))
    assert not outside.frequency_in_range
    assert 0.0 < outside.share_in_range < 1.0
    assert outside.total == inside.total


def test_without_ripple_or_parameters_there_is_no_loss(linear: fm.Design) -> None:
    bare = replace(linear, material=fm.LinearCurve(2000.0))
    result = fm.solve(bare, tolerance=1e-2)
    assert result.core_loss is None
    assert result.loss_budget is not None
    assert result.loss_budget.core is None


def test_without_ripple_what_is_left_is_a_constant_current(linear: fm.Design) -> None:
    result = fm.solve(replace(linear, ripple=None), tolerance=1e-2)
    assert result.core_loss is None
    assert result.loss_budget is not None
    assert result.loss_budget.total == pytest.approx(4.0 * result.copper[0].resistance)
    block = fm.solve(replace(linear, ripple=None, windings=(fm.Winding(50),)), tolerance=1e-2)
    assert block.loss_budget is None


def test_the_budget_adds_what_is_known(solved: fm.Result) -> None:
    budget = solved.loss_budget
    assert budget is not None
    resistance, (copper,) = solved.copper[0].resistance, solved.copper_loss
    assert budget.copper_dc == pytest.approx((2.0 - 0.4) ** 2 * resistance)
    assert copper.total is not None
    assert budget.total == pytest.approx(loss_of(solved).total + copper.total)
    assert budget.missing == ()
    blocks = replace(solved.design, windings=(fm.Winding(50),), material=fm.LinearCurve(2000.0))
    unknown = fm.solve(blocks, tolerance=1e-2).loss_budget
    assert unknown is not None
    assert (unknown.total, len(unknown.missing)) == (0.0, 3)


def test_a_design_file_and_a_result_file_carry_the_loss(
    tmp_path, linear: fm.Design, solved: fm.Result
) -> None:
    fm.write_result(solved, tmp_path / "r.json")
    again = fm.read_result(tmp_path / "r.json")
    assert again == solved
    assert loss_of(again) == loss_of(solved)
    assert design_from_toml(fm.design_toml(linear)) == linear
