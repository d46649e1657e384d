"""The batched assembly and the source field, against scikit-fem's forms and against Stokes' law."""

from dataclasses import replace

import numpy as np
import pytest
from skfem import Basis, BilinearForm, ElementTriP2, LinearForm

import femag as fm
from femag.field.adapt import adapted_solution
from femag.field.bounds import Sides, both_sides, field_solution, finely_integrated
from femag.field.design_problem import field_problem
from femag.field.flux_side import turn_density
from femag.mesh import coarse_mesh
from femag.units import MU_0


def sides_of(design: fm.Design, order: int = 5) -> Sides:
    problem = field_problem(design)
    return both_sides(problem, coarse_mesh(problem.section), order)


@pytest.fixture
def sides(pot_26_16: fm.Design) -> Sides:
    return sides_of(pot_26_16)


def permeability(sides: Sides) -> np.ndarray:
    core = [region.name for region in sides.mesh.section.regions if region.role == "core"]
    in_core = np.isin(np.array(sides.mesh.names)[sides.mesh.region], core)
    return np.where(in_core, 2000.0, 1.0)[:, None] * MU_0


def dof_of_unknown(sides: Sides, unknown: np.ndarray) -> np.ndarray:
    """Return the matrix columns of a side's unknowns in the numbering of the full basis."""
    dofs = sides.discretisation.element_dofs
    number = np.full(int(unknown.max()) + 1, -1)
    number[unknown[unknown >= 0]] = dofs[unknown >= 0]
    return number


def test_flux_side_equals_scikit_fem_forms(sides: Sides) -> None:
    basis = Basis(sides.mesh.triangles, ElementTriP2(), intorder=5)
    mu = permeability(sides)

    @BilinearForm
    def stiffness(u, v, w):
        r = w.x[0]
        axial = (2 * u + r * u.grad[0]) * (2 * v + r * v.grad[0])
        return 2 * 2 * np.pi * r * (r**2 * u.grad[1] * v.grad[1] + axial) / w.mu

    @LinearForm
    def load(v, w):
        return 2 * 2 * np.pi * w.x[0] ** 2 * w.turns * v

    mu_field = np.broadcast_to(mu, basis.dx.shape)
    turns = np.broadcast_to(
        turn_density(sides.problem.turns_per_area, sides.discretisation), basis.dx.shape
    )
    columns = dof_of_unknown(sides, sides.flux.numbering.unknown)
    expected = stiffness.assemble(basis, mu=mu_field)[columns][:, columns]
    zero = np.zeros_like(sides.flux.source)
    own = sides.flux.hessian(zero, *sides.flux.coefficients(zero))
    assert abs(own - expected).max() < 1e-13 * abs(expected).max()
    expected_load = load.assemble(basis, turns=turns)[columns]
    np.testing.assert_allclose(sides.flux.load, expected_load, atol=1e-13 * expected_load.max())


def test_potential_side_equals_scikit_fem_forms(sides: Sides) -> None:
    basis = Basis(sides.mesh.triangles, ElementTriP2(), intorder=5)

    @BilinearForm
    def stiffness(u, v, w):
        return 2 * 2 * np.pi * w.x[0] * w.mu * (u.grad[0] * v.grad[0] + u.grad[1] * v.grad[1])

    mu_field = np.broadcast_to(permeability(sides), basis.dx.shape)
    full = stiffness.assemble(basis, mu=mu_field)
    side = sides.potential
    spread = np.zeros((basis.N, side.size))
    inside = side.numbering.unknown >= 0
    spread[sides.discretisation.element_dofs[inside], side.numbering.unknown[inside]] = 1.0
    zero = np.zeros_like(side.source)
    own = side.hessian(zero, *side.coefficients(zero)).toarray()
    expected = spread.T @ full @ spread
    assert np.abs(own - expected).max() < 1e-13 * np.abs(expected).max()


def test_curl_of_the_source_field_is_the_current_density(sides: Sides) -> None:
    """T is linear in each element: fit it to the quadrature points and take dT_r/dz - dT_z/dr."""
    r, z = np.asarray(sides.discretisation.basis.global_coordinates())
    scale = 1e-3
    turns = turn_density(sides.problem.turns_per_area, sides.discretisation)[:, 0]
    curl = np.empty(len(r))
    for element, (points_r, points_z) in enumerate(zip(r, z, strict=True)):
        centred = np.stack([np.ones_like(points_r), points_r - points_r[0], points_z - points_z[0]])
        centred[1:] /= scale
        fit, *_ = np.linalg.lstsq(centred.T, sides.potential.source[element].T, rcond=None)
        curl[element] = (fit[2, 0] - fit[1, 1]) / scale
    assert turns.max() == pytest.approx(50 / (3.6e-3 * 9.6e-3))
    np.testing.assert_allclose(curl, turns, atol=1e-7 * turns.max())


def test_the_source_field_lives_outside_the_core(sides: Sides) -> None:
    magnitude = np.abs(sides.potential.source).max(axis=(1, 2))
    core = permeability(sides)[:, 0] > MU_0
    assert magnitude[core].max() < 0.2 * magnitude.max()


@pytest.mark.parametrize("order", [6, 8, 10])
def test_quadrature_is_exact_for_linear_materials(pot_26_16: fm.Design, order: int) -> None:
    plain = field_solution(sides_of(pot_26_16), 1.0).coenergy
    finer = field_solution(sides_of(pot_26_16, order), 1.0).coenergy
    assert finer.lower == pytest.approx(plain.lower, rel=1e-11)
    assert finer.upper == pytest.approx(plain.upper, rel=1e-11)


@pytest.mark.parametrize("exponent", [1.0, 2.0, 6.0])
@pytest.mark.parametrize("tolerance", [1e-3, 1e-4])
def test_finer_quadrature_does_not_move_the_bounds_of_a_saturating_core(
    saturating_26_16: fm.Design, exponent: float, tolerance: float
) -> None:
    """The only thing that keeps nonlinear bounds from being rigorous."""
    curve = fm.FroehlichCurve(2000.0, 0.45, exponent)
    problem = field_problem(replace(saturating_26_16, material=curve))
    solution, _ = adapted_solution(problem, 6.0, tolerance)
    finer = finely_integrated(solution, 16).coenergy
    width = finer.upper - finer.lower
    assert abs(finer.lower - solution.coenergy.lower) < 0.01 * width
    assert abs(finer.upper - solution.coenergy.upper) < 0.01 * width
