"""Tolerances: in the design file, in the budget, and against samples on full solutions."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag import cli
from femag.design import design_hash
from femag.design_file import design_from_toml
from femag.field.adapt import adapted_solution
from femag.field.design_problem import field_problem
from femag.tolerance_budget import ToleranceBudget, tolerance_budget

PARTS = fm.PartTolerances(
    gap=0.01e-3, post_diameter=0.2e-3, window_diameter=0.4e-3, window_height=0.2e-3,
    permeability=0.25, coil_radial=0.2e-3, coil_axial=0.3e-3,
)  # fmt: skip
SATURATING = fm.FroehlichCurve(2000, 0.45, 2)


def budget_of(design: fm.Design, tolerances: fm.PartTolerances | None = None) -> ToleranceBudget:
    solution, _ = adapted_solution(field_problem(design), design.current, design.tolerance)
    return tolerance_budget(design, solution, tolerances)


def test_the_budget_sums_what_each_part_does(pot_26_16: fm.Design) -> None:
    budget = budget_of(pot_26_16, PARTS)
    slopes = {s.parameter.name: s.inductance for s in fm.sensitivities(pot_26_16)}
    changes = {entry.name: entry.change for entry in budget.contributions}
    assert changes == pytest.approx(
        {name: slopes[name] * half for name, half in vars(PARTS).items() if half}
    )
    sizes = np.abs(list(changes.values()))
    assert list(sizes) == sorted(sizes, reverse=True)
    assert budget.worst_case == pytest.approx(sizes.sum())
    assert budget.root_sum_square == pytest.approx(np.sqrt(np.sum(sizes**2)))
    assert not budget.is_customary


def test_a_design_without_tolerances_gets_customary_ones(pot_26_16: fm.Design) -> None:
    budget = budget_of(pot_26_16)
    assert budget.is_customary
    assert {entry.name: entry.half_range for entry in budget.contributions} == {
        "gap": 0.01e-3, "permeability": 0.25,
    }  # fmt: skip
    assert budget_of(replace(pot_26_16, gaps=())).contributions[0].name == "permeability"


def test_tolerances_are_read_written_and_move_no_result(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, part_tolerances=PARTS)
    text = fm.design_toml(design)
    assert 'post_diameter = "0.2 mm"' in text.partition("[tolerance]")[2]
    assert design_from_toml(text) == design
    assert design_hash(design) == design_hash(pot_26_16)


@pytest.mark.parametrize(
    ("line", "message"),
    [
        ("gap = 0.01", "tolerance.gap = 0.01: the unit is missing"),
        ('gap = "-0.01 mm"', "tolerance.gap = '-0.01 mm': out of range; accepted: a length"),
        ('permeability = "25 %"', "tolerance.permeability"),
        ("permeability = 25", "tolerance.permeability = 25: out of range; accepted: a share from"),
        ('post = "0.1 mm"', "tolerance.post"),
        ("saturation = 0.05", "tolerance.saturation = 0.05: this design has nothing that it is"),
        ("", "tolerance: no tolerance is above 0"),
    ],
)
def test_unusable_tolerances_get_one_line(
    tmp_path: Path,
    pot_26_16: fm.Design,
    capsys: pytest.CaptureFixture[str],
    line: str,
    message: str,
) -> None:
    file = tmp_path / "design.toml"
    file.write_text(f"{fm.design_toml(replace(pot_26_16, tolerance=1e-2))}\n[tolerance]\n{line}\n")
    assert cli.main(["solve", str(file)]) == 2
    error = capsys.readouterr().err
    assert message in error
    assert error.count("\n") == 1


def test_solve_prints_and_stores_a_budget_where_the_design_gives_tolerances(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    design = replace(pot_26_16, part_tolerances=PARTS, tolerance=5e-3)
    file, answer = tmp_path / "design.toml", tmp_path / "result.json"
    file.write_text(fm.design_toml(design))
    assert cli.main(["solve", str(file), "--json", str(answer)]) == 0
    printed = capsys.readouterr().out
    assert "root sum square" in printed
    assert all(len(line) <= 80 for line in printed.splitlines())
    stored = json.loads(answer.read_text())["tolerance_budget"]
    assert stored["worst_case"] > stored["root_sum_square"] > 0.0
    assert not stored["customary"]
    again = fm.read_result(answer)
    assert again.tolerance_budget == fm.solve(design).tolerance_budget
    assert fm.solve(pot_26_16, tolerance=1e-2).tolerance_budget is None


def test_a_gap_comes_with_a_budget_and_samples(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "design.toml"
    file.write_text(fm.design_toml(replace(pot_26_16, tolerance=5e-3)))
    arguments = ["gap", str(file), "--inductance", "650 uH"]
    answer = tmp_path / "gap.json"
    assert cli.main([*arguments, "--sample", "3", "--json", str(answer)]) == 0
    printed = capsys.readouterr().out
    assert "3 samples, every part uniform within its half range" in printed
    assert "those of common practice stand in" in printed
    document = json.loads(answer.read_text())
    assert document["tolerance_budget"]["customary"]
    sampled = document["sampled"]
    assert sampled["samples"] == 3
    assert sampled["lowest"] <= sampled["mean"] <= sampled["highest"]
    assert cli.main([*arguments, "--sample", "1"]) == 2
    assert "--sample" in capsys.readouterr().err
    with pytest.raises(fm.InputError, match="samples = 1: out of range"):
        fm.sampled_spread(pot_26_16, 1)


def test_samples_are_the_same_for_the_same_seed(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, tolerance=1e-2)
    one, two, other = (fm.sampled_spread(design, 2, seed, PARTS) for seed in (1, 1, 2))
    assert np.array_equal(one.inductances, two.inductances)
    assert not np.array_equal(one.changes, other.changes)
    halves = np.array([PARTS.half_range(name) for name in one.names])
    assert np.all(np.abs(one.changes) <= halves)
    assert one.linear == pytest.approx(one.inductances, rel=5e-3)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("changes", "tolerances", "allowed"),
    [
        ({}, PARTS, 0.02),
        ({"material": SATURATING, "current": 4.0}, replace(PARTS, saturation=0.05), 0.03),
    ],
    ids=["linear", "saturating"],
)
def test_the_budget_is_the_spread_of_full_solutions(
    pot_26_16: fm.Design, changes: dict[str, object], tolerances: fm.PartTolerances, allowed: float
) -> None:
    """Standard deviation at the samples, their mean, and each sample within the worst case."""
    design = replace(pot_26_16, **changes)
    budget = budget_of(design, tolerances)
    spread = fm.sampled_spread(design, 100, 1, tolerances)
    assert spread.standard_deviation == pytest.approx(spread.linear_standard_deviation, rel=allowed)
    assert spread.mean == pytest.approx(float(np.mean(spread.linear)), rel=2e-3)
    assert np.sqrt(3) * spread.linear_standard_deviation == pytest.approx(
        budget.root_sum_square, rel=0.15
    )
    off = np.abs(spread.inductances - budget.inductance)
    assert off.max() <= 1.05 * budget.worst_case


@pytest.mark.slow
def test_the_straight_line_fails_where_a_tolerance_is_a_good_part_of_the_gap(
    pot_26_16: fm.Design,
) -> None:
    """L goes with about 1/gap: what a short gap adds is more than what a long one takes."""
    design = replace(pot_26_16, gaps=(fm.Gap(0.05e-3),))
    spread = fm.sampled_spread(design, 100, 1, fm.PartTolerances(gap=0.03e-3))
    assert spread.mean > 1.02 * float(np.mean(spread.linear))
    assert spread.standard_deviation > 1.1 * spread.linear_standard_deviation


def test_samples_without_a_gap_left_are_refused(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, part_tolerances=fm.PartTolerances(gap=0.6e-3))
    with pytest.raises(
        fm.InputError, match=r"tolerance\.gap = '0.6 mm': .*less than the gap, 0.5 mm"
    ):
        fm.sampled_spread(design, 2)
