import math

import pytest

from femag.line_search import step_length


@pytest.mark.parametrize("minimum", [1e-3, 0.2, 1.0, 7.0, 1e4])
@pytest.mark.parametrize("knee", [1.0, 50.0])
def test_at_most_half_of_the_slope_is_left(minimum: float, knee: float) -> None:
    """A convex function with a flat start or end: slope tanh(knee (x/minimum - 1))."""

    def slope(x: float) -> float:
        return math.tanh(knee * (x / minimum - 1))

    length = step_length(slope, -slope(0.0))
    assert abs(slope(length)) <= 0.5 * abs(slope(0.0))


def test_a_full_step_is_kept_where_newton_is_right() -> None:
    assert step_length(lambda x: x - 1.0, 1.0) == 1.0
    assert step_length(lambda x: 1.2 * x - 1.0, 1.0) == 1.0
    assert step_length(lambda x: 0.0, 0.0) == 1.0
