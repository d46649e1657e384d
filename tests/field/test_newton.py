from dataclasses import replace

import numpy as np
import pytest
from scipy.sparse import csc_matrix, identity

import femag as fm
from femag.errors import NewtonError
from femag.field import newton
from femag.field.bounds import Sides, both_sides, field_solution
from femag.field.design_problem import field_problem
from femag.field.newton import backward_error, solved
from femag.mesh import coarse_mesh


def sides_of(design: fm.Design) -> Sides:
    problem = field_problem(design)
    return both_sides(problem, coarse_mesh(problem.section))


@pytest.mark.parametrize("exponent", [1.0, 2.0, 6.0, 20.0])
@pytest.mark.parametrize(
    ("gaps", "permeability"),
    [
        ((), 1e5),
        ((fm.Gap(0.5e-3),), 2000.0),
        pytest.param((), 2000.0, marks=pytest.mark.slow),
        pytest.param((fm.Gap(0.5e-3),), 1e5, marks=pytest.mark.slow),
    ],
)
def test_newton_converges_from_the_first_ampere_to_deep_saturation(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...], exponent: float, permeability: float
) -> None:
    curve = fm.FroehlichCurve(permeability, 0.45, exponent)
    sides = sides_of(replace(pot_26_16, gaps=gaps, material=curve))
    for current in (1e-3, 0.3, 10.0, 1000.0):
        solution = field_solution(sides, current)
        assert solution.coenergy.lower < solution.coenergy.upper


def test_gradient_vanishes_at_the_solution(saturating_26_16: fm.Design) -> None:
    """To the root of the energy's accuracy, which is its square."""
    sides = sides_of(saturating_26_16)
    solution = field_solution(sides, 6.0)
    for side, found in ((sides.flux, solution.flux), (sides.potential, solution.potential)):
        gradient = side.gradient(found.field, found.secant, 6.0)
        forces = side.tested(np.abs(found.field), found.secant)
        assert np.abs(gradient).max() < 1e-7 * np.abs(forces).max()


def test_slope_of_the_coenergy_is_the_flux_linkage(saturating_26_16: fm.Design) -> None:
    """dW'/dI = lambda holds for each side on its own mesh."""
    sides = sides_of(saturating_26_16)
    step = 1e-3
    low, middle, high = (field_solution(sides, 6.0 + d).coenergy for d in (-step, 0.0, step))
    linkages = field_solution(sides, 6.0).flux_linkage_of_sides
    assert (high.lower - low.lower) / (2 * step) == pytest.approx(linkages[0], rel=1e-6)
    assert (high.upper - low.upper) / (2 * step) == pytest.approx(linkages[1], rel=1e-6)
    assert middle.lower < middle.upper


def test_failure_to_converge_tells_its_history(
    saturating_26_16: fm.Design, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(newton, "MAXIMUM_ITERATIONS", 2)
    with pytest.raises(NewtonError) as caught:
        field_solution(sides_of(saturating_26_16), 6.0)
    assert len(caught.value.history) >= 2
    assert "\n" not in str(caught.value)


def test_systems_without_an_answer_are_errors() -> None:
    load = np.ones(3)
    assert solved(csc_matrix(2.0 * identity(3)), load) == pytest.approx(0.5 * load)
    with pytest.raises(fm.NumericalError, match="cannot be solved"):
        solved(csc_matrix(np.diag([1.0, 0.0, 1.0])), load)
    with pytest.raises(fm.NumericalError):
        solved(csc_matrix(np.diag([1.0, np.nan, 1.0])), load)


def test_a_solution_is_judged_by_its_backward_error() -> None:
    """The answer dwarfs the load: rounding leaves a residual that is large beside it alone."""
    apart = 2.0**-40
    matrix = csc_matrix([[1.0, 1.0 - apart], [1.0 - apart, 1.0]])
    load = np.array([1.0, -1.0 + 1e-3])
    found = solved(matrix, load)
    assert backward_error(matrix, found, load) < 1e-15
    assert backward_error(matrix, found + 1e-6 * np.max(np.abs(found)), load) > 1e-7
    assert np.isnan(backward_error(matrix, np.array([np.nan, 0.0]), load))
