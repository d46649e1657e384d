"""What the speed table computes from its times; the times themselves are not a test's business."""

import pytest

from femag.field.design_problem import field_problem
from validation import speed
from validation.pot_core_26_16.run import pot_core_design
from validation.speed import Budget, budget_lines, time_to_error


@pytest.mark.parametrize(
    ("levels", "seconds"),
    [
        ([(1.0, 0.9), (2.0, 0.999), (3.0, 1.0001)], 2.0),
        ([(1.0, 1.0), (2.0, 0.9), (3.0, 1.0001)], 3.0),
        ([(1.0, 0.9), (2.0, 0.99)], None),
    ],
)
def test_the_time_to_an_error_ends_where_the_error_stays_small(
    levels: list[tuple[float, float]], seconds: float | None
) -> None:
    assert time_to_error(levels, 2e-3, 1.0) == seconds


@pytest.mark.parametrize(
    ("budget", "kept"),
    [
        (Budget("a", 0.2, 0.3), True),
        (Budget("a", 0.4, 0.3), False),
        (Budget("a", 0.4, 0.3, beside=2.0), True),
        (Budget("a", 0.4, 0.3, beside=1.0), False),
        (Budget("a", None, 0.3, note="skipped: ngsolve is not installed"), None),
    ],
)
def test_a_budget_is_kept_or_not_or_not_measured(budget: Budget, kept: bool | None) -> None:
    assert budget.kept is kept
    lines = list(budget_lines(budget))
    assert all(len(line) <= 80 for line in lines)
    assert (budget.note in lines[-1]) or not budget.note


def test_levels_get_closer_and_take_longer(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(speed, "RUNS", 1)
    levels = speed.field_levels(field_problem(pot_core_design()))
    times = [seconds for seconds, _ in levels]
    assert times == sorted(times)
    assert abs(levels[-1][1] - 650.189e-6) < abs(levels[0][1] - 650.189e-6)


def test_a_missing_peer_is_said_in_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("importlib.util.find_spec", lambda name: None)
    assert speed.peer_levels("uniform") == "skipped: ngsolve is not installed"
