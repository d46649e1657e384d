from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.field import adapt
from femag.field.adapt import adapted_solution, marked_elements
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem


@pytest.mark.parametrize("tolerance", [1e-2, 1e-3, 1e-4])
def test_the_asked_tolerance_is_met(saturating_26_16: fm.Design, tolerance: float) -> None:
    seen: list[FieldSolution] = []
    problem = field_problem(saturating_26_16)
    solution, number = adapted_solution(problem, 6.0, tolerance, seen.append)
    assert solution.coenergy.relative_half_width <= tolerance
    assert len(seen) == number + 1
    assert seen[-1].unknowns == solution.unknowns


def test_a_tolerance_out_of_reach_stops_with_the_bracket(
    pot_26_16: fm.Design, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(adapt, "MAXIMUM_UNKNOWNS", 8_000)
    design = replace(pot_26_16, tolerance=1e-6)
    with pytest.raises(fm.ToleranceError, match="tolerance 1e-06 not reached") as caught:
        fm.solve(design)
    assert caught.value.exit_code == 3
    assert caught.value.solution.coenergy.relative_half_width < 1e-3
    assert "(650." in str(caught.value)
    assert "\n" not in str(caught.value)


def test_marking_takes_the_fewest_elements_that_hold_the_share() -> None:
    gaps = np.array([1.0, 5.0, 0.0, 3.0, 1.0])
    np.testing.assert_array_equal(marked_elements(gaps, 0.7), [1, 3])
    np.testing.assert_array_equal(marked_elements(gaps, 0.45), [1])
