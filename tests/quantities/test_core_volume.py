import pytest

from femag.field.adapt import adapted_solution
from femag.quantities import core_share_above, volume_shares
from validation.nonlinear_pot.run import pot
from validation.rows import table_of


def test_post_and_return_of_the_one_dimensional_pot_fill_their_shares() -> None:
    """Uniform in post and return, whose volumes are as 25 to 11.5^2 - 10^2; values as in
    validation/nonlinear_pot."""
    line = table_of("nonlinear_pot")[0]
    solution = adapted_solution(pot(), float(line["current"]), 1e-5)[0]
    post, back = abs(float(line["B_post"])), abs(float(line["B_return"]))
    found = [share.flux_density for share in volume_shares(solution, (0.01, 0.55, 0.57, 0.99))]
    assert found == pytest.approx([back, back, post, post], rel=5e-3)
    share_of_post = 25.0 / (25.0 + 11.5**2 - 10.0**2)
    assert core_share_above(solution, (post + back) / 2) == pytest.approx(share_of_post, rel=1e-9)
    assert core_share_above(solution, 1.01 * post) == 0.0
    assert core_share_above(solution, 0.99 * back) == 1.0
