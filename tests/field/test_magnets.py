"""Permanent magnets: bounds, superposition, and closed forms of magnets in open space and iron."""

from dataclasses import replace
from functools import cache
from itertools import islice
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design import design_hash
from femag.field.adapt import adapted_solution, inductance_bounds, marked_elements, refinements
from femag.field.bounds import Bounds, FieldSolution, both_sides, field_solution
from femag.field.current_share import current_share
from femag.field.design_problem import field_problem
from femag.field.problem import FieldProblem
from femag.geometry import Cut, Region, open_section, rectangle
from femag.materials import LinearCurve
from femag.mesh import coarse_mesh, refined_mesh
from femag.quantities import (
    flux_through_discs,
    gap_factor,
    incremental_inductance_of_sides,
    mean_flux_densities,
)
from femag.units import MU_0

POST = np.pi * (5.75e-3**2 - 2.75e-3**2)
"""Section of the post of the pot core 26/16, m2."""
SATURATING = fm.FroehlichCurve(2000.0, 0.45, 2.0)


def with_magnet(design: fm.Design, remanence: float = 0.4, recoil: float = 1.05) -> fm.Design:
    return replace(design, gaps=(fm.Gap(0.5e-3, magnet=fm.Magnet(remanence, recoil)),))


def saturating(design: fm.Design, remanence: float) -> fm.Design:
    return replace(with_magnet(design, remanence), material=SATURATING)


@cache
def solved(design: fm.Design, current: float = 1.0, tolerance: float = 1e-3) -> FieldSolution:
    return adapted_solution(field_problem(design), current, tolerance)[0]


def magnet_alone(problem: FieldProblem, rounds: int) -> FieldSolution:
    """Return the fields of a problem without current on a mesh refined a number of times."""
    mesh = coarse_mesh(problem.section)
    solution = field_solution(both_sides(problem, mesh), 0.0)
    for _ in range(rounds):
        mesh, _ = refined_mesh(mesh, marked_elements(solution.local_gap))
        solution = field_solution(both_sides(problem, mesh), 0.0)
    return solution


def in_open_space(polygon: tuple, remanence: float, recoil: float = 1.0) -> FieldProblem:
    extent = np.hypot(*np.asarray(polygon).T).max()
    section = open_section((Region("magnet", "air", polygon),), 60.0 * float(extent))
    return FieldProblem(section, {"magnet": LinearCurve(recoil)}, {}, {"magnet": remanence})


def ball(sides: int, radius: float = 5e-3) -> tuple[tuple[float, float], ...]:
    angles = np.linspace(-np.pi / 2, np.pi / 2, sides + 1)
    corners = radius * np.array([np.cos(angles), np.sin(angles)]).T
    corners[[0, -1], 0] = 0.0
    return tuple((float(r), float(z)) for r, z in corners)


@pytest.mark.parametrize("recoil", [1.0, 1.3, 20.0])
def test_a_magnetised_sphere_has_its_uniform_field_and_energy(recoil: float) -> None:
    """B = 2 Br/(mu_rec + 2) inside, W' = -Br^2 V/(2 mu0 (mu_rec + 2)): textbooks on magnetostatics
    (from memory; two thirds of Br, and the demagnetising factor of a third, for mu_rec = 1).

    The polygon's energy tends to that of the sphere with the square of the number of sides: of 48
    it is 1.1e-3 off, and the limit from 24 and 48 sides within the bounds.
    """
    remanence, radius = 0.4, 5e-3
    energies = []
    for sides in (24, 48):
        solution = magnet_alone(in_open_space(ball(sides), remanence, recoil), 3)
        assert solution.coenergy.relative_half_width < 1e-4
        energies.append(solution.coenergy.value)
    exact = -(remanence**2) * 4 / 3 * np.pi * radius**3 / (2 * MU_0 * (recoil + 2))
    assert (4 * energies[1] - energies[0]) / 3 == pytest.approx(exact, rel=5e-5)
    discs = np.array([[1e-3, 3e-3], [0.0, 1e-3]])
    mean = flux_through_discs(solution, discs) / (np.pi * discs[0] ** 2)
    np.testing.assert_allclose(mean, 2 * remanence / (recoil + 2), rtol=1e-4)


def test_a_magnet_cylinder_has_the_field_of_its_surface_current_on_the_axis() -> None:
    """B_z = Br/2 [(z + h)/sqrt((z + h)^2 + R^2) - (z - h)/sqrt((z - h)^2 + R^2)], the solenoid of a
    current sheet Br/mu0 (textbooks, from memory), averaged over a disc of a fiftieth of R."""
    radius, half, remanence = 5e-3, 3e-3, 1.2
    solution = magnet_alone(in_open_space(rectangle(0.0, radius, -half, half), remanence), 6)
    z = np.array([0.0, 2e-3, 4e-3, 6e-3, 15e-3])
    small = np.full(5, radius / 50)
    mean = flux_through_discs(solution, np.array([small, z])) / (np.pi * small**2)

    def end(height: np.ndarray) -> np.ndarray:
        return height / np.hypot(height, radius)

    np.testing.assert_allclose(mean, remanence / 2 * (end(z + half) - end(z - half)), rtol=2e-3)


def test_flat_and_long_magnets_have_no_and_all_of_their_remanence() -> None:
    """Demagnetising factor towards 1 of a disc and 0 of a rod: B is Br h/sqrt(h^2 + R^2) in the
    middle (the solenoid again), 0.01 and 0.99875 of Br."""
    for radius, half in ((10e-3, 0.1e-3), (1e-3, 20e-3)):
        solution = magnet_alone(in_open_space(rectangle(0.0, radius, -half, half), 1.0), 5)
        disc = np.array([[0.3 * radius], [0.0]])
        found = flux_through_discs(solution, disc) / (np.pi * disc[0] ** 2)
        np.testing.assert_allclose(found, half / np.hypot(half, radius), atol=5e-4)


@pytest.mark.parametrize("recoil", [1.0, 1.05, 3.0])
def test_ideal_iron_takes_all_of_the_remanence(pot_26_16: fm.Design, recoil: float) -> None:
    """A closed magnetic circuit: with H = 0 in iron and magnet B is Br, and lambda = N A Br."""
    design = replace(with_magnet(pot_26_16, -0.4, recoil), material=fm.LinearCurve(1e6))
    idle = solved(design).idle
    assert idle is not None
    assert idle.flux_linkage_of_sides == pytest.approx([-50 * POST * 0.4] * 2, rel=1e-3)


def test_magnets_in_post_and_ring_add_up(pot_26_16: fm.Design) -> None:
    """Thin spacer, ideal iron: flux 2 Br/(1/A_post + 1/A_ring), in one dimension.

    The magnets differ in section, so that some flux passes beside the smaller one: -0.7 %.
    """
    gap = fm.Gap(50e-6, "all", magnet=fm.Magnet(0.4, 1.05))
    design = replace(pot_26_16, gaps=(gap,), material=fm.LinearCurve(1e6))
    ring = np.pi * (12.75e-3**2 - 10.6e-3**2)
    idle = solved(design).idle
    assert idle is not None
    linkage = 50 * 2 * 0.4 / (1 / POST + 1 / ring)
    assert idle.flux_linkage_of_sides == pytest.approx([linkage] * 2, rel=0.01)


def test_positive_current_and_remanence_drive_flux_up_the_post(pot_26_16: fm.Design) -> None:
    cut = (Cut("post", (2.75e-3, 4e-3), (5.75e-3, 4e-3)),)
    for design, current, sign in (
        (pot_26_16, 1.0, 1.0),
        (pot_26_16, -1.0, -1.0),
        (with_magnet(pot_26_16, 0.4), 1e-3, 1.0),
        (with_magnet(pot_26_16, -0.4), 1e-3, -1.0),
    ):
        assert np.sign(mean_flux_densities(solved(design, current), cut)) == sign


def test_linear_flux_linkages_superpose_on_one_mesh(pot_26_16: fm.Design) -> None:
    """lambda(I) = lambda(0) + L I to rounding, on either side with its own L."""
    solution = solved(with_magnet(pot_26_16), 3.0)
    assert solution.idle is not None
    inductances = incremental_inductance_of_sides(solution)
    for total, magnet, inductance in zip(
        solution.flux_linkage_of_sides,
        solution.idle.flux_linkage_of_sides,
        inductances,
        strict=True,
    ):
        assert total == pytest.approx(magnet + 3.0 * inductance, rel=1e-11)
    bounds = inductance_bounds(solution)
    assert (bounds.lower, bounds.upper) == pytest.approx(inductances, rel=1e-10)


def test_flux_linkage_of_a_magnet_is_that_of_reciprocity(pot_26_16: fm.Design) -> None:
    """lambda = integral of Br . H over the magnet, with H of the winding's field per ampere (the
    reciprocity theorem): the winding alone knows what a magnet will do to it."""
    filled = solved(replace(pot_26_16, gaps=(fm.Gap(0.5e-3, permeability=1.05),)), 1.0, 1e-4)
    sides = filled.sides
    inside = sides.mesh.elements_of("post gap")
    strength = filled.potential.field[inside, 1]
    linkage = 0.4 * np.sum(sides.discretisation.weight[inside] * strength)
    idle = solved(with_magnet(pot_26_16), 1.0, 1e-4).idle
    assert idle is not None
    assert idle.flux_linkage_of_sides == pytest.approx([linkage] * 2, rel=2e-4)


@pytest.mark.parametrize("current", [1e-4, 1.0, -20.0])
@pytest.mark.parametrize("remanence", [0.4, -1.2])
def test_a_linear_design_has_the_inductance_of_its_recoil_permeability(
    pot_26_16: fm.Design, current: float, remanence: float
) -> None:
    """On the mesh of the magnet: the bounds are those of a plain filling, to rounding."""
    with_fill = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, permeability=1.05),))
    solution = solved(with_magnet(pot_26_16, remanence), current)
    plain = field_solution(both_sides(field_problem(with_fill), solution.sides.mesh), current)
    own, wanted = inductance_bounds(solution), inductance_bounds(plain)
    assert own.lower == pytest.approx(wanted.lower, rel=1e-9)
    assert own.upper == pytest.approx(wanted.upper, rel=1e-9)
    assert gap_factor(with_magnet(pot_26_16), solution) == pytest.approx(
        gap_factor(with_fill, plain), rel=1e-8
    )


def test_a_weak_magnet_in_a_wide_core_is_nearly_linear(pot_26_16: fm.Design) -> None:
    """The interval of a saturating core holds the linear value and is no narrower than asked."""
    wide = fm.FroehlichCurve(2000.0, 2.0, 8.0)
    design = replace(with_magnet(pot_26_16, 0.1), material=wide)
    linear = inductance_bounds(solved(with_magnet(pot_26_16, 0.1), 1.0, 1e-4))
    found = inductance_bounds(solved(design, 1.0))
    assert found.lower < linear.lower < linear.upper < found.upper
    assert found.value == pytest.approx(linear.value, rel=2e-4)


@pytest.mark.parametrize("remanence", [0.2, -0.2])
def test_local_gaps_sum_to_the_width_with_magnets(pot_26_16: fm.Design, remanence: float) -> None:
    for design in (with_magnet(pot_26_16, remanence), saturating(pot_26_16, remanence)):
        for solution in islice(refinements(field_problem(design), 3.0), 3):
            assert solution.idle is not None
            for state in (solution, solution.idle):
                width = state.coenergy.upper - state.coenergy.lower
                assert width > 0.0
                assert state.local_gap.sum() == pytest.approx(width, rel=1e-8)
                assert state.local_gap.min() >= -1e-12 * state.local_gap.max()


def test_bounds_of_both_states_close_in_monotonically(pot_26_16: fm.Design) -> None:
    problem = field_problem(saturating(pot_26_16, 0.2))
    steps = list(islice(refinements(problem, 3.0), 3))
    for states in (steps, [step.idle for step in steps]):
        lower = np.array([state.coenergy.lower for state in states])
        upper = np.array([state.coenergy.upper for state in states])
        assert np.all(np.diff(lower) > 0)
        assert np.all(np.diff(upper) < 0)
    assert all(step.idle.coenergy.upper < 0.0 for step in steps)


@pytest.mark.parametrize("current", [0.0, 3.0])
def test_slope_of_the_coenergy_is_the_flux_linkage(pot_26_16: fm.Design, current: float) -> None:
    """dW'/dI = lambda holds for each side on its own mesh, with the magnet's share in both."""
    problem = field_problem(saturating(pot_26_16, 0.2))
    sides = both_sides(problem, coarse_mesh(problem.section))
    step = 1e-3
    low, high = (field_solution(sides, current + d).coenergy for d in (-step, step))
    linkages = field_solution(sides, current).flux_linkage_of_sides
    assert (high.lower - low.lower) / (2 * step) == pytest.approx(linkages[0], rel=1e-6)
    assert (high.upper - low.upper) / (2 * step) == pytest.approx(linkages[1], rel=1e-6)


def test_remanence_along_the_current_brings_saturation_earlier(pot_26_16: fm.Design) -> None:
    """At 3 A the knee is reached without a magnet; a bias of -0.2 T takes it far beyond."""
    plain = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, permeability=1.05),), material=SATURATING)
    with_bias, without, against = (
        fm.solve(design, current=3.0, tolerance=2e-3)
        for design in (saturating(pot_26_16, 0.2), plain, saturating(pot_26_16, -0.2))
    )
    for less, more in ((with_bias, without), (without, against)):
        assert less.inductance.upper < more.inductance.lower
        assert less.incremental_inductance < 0.7 * more.incremental_inductance
        assert less.hand[0].estimate.inductance < more.hand[0].estimate.inductance


def test_reversed_current_and_remanence_are_the_same_device(pot_26_16: fm.Design) -> None:
    one = solved(saturating(pot_26_16, 0.2), 3.0)
    other = solved(saturating(pot_26_16, -0.2), -3.0)
    assert other.coenergy.lower == pytest.approx(one.coenergy.lower, rel=1e-9)
    assert current_share(other).upper == pytest.approx(current_share(one).upper, rel=1e-7)
    np.testing.assert_allclose(
        other.flux_linkage_of_sides, -np.array(one.flux_linkage_of_sides), rtol=1e-8
    )


def test_a_finer_mesh_lies_in_the_interval_of_a_coarser_one(pot_26_16: fm.Design) -> None:
    design = saturating(pot_26_16, 0.2)
    coarse, fine = (inductance_bounds(solved(design, 2.0, tol)) for tol in (5e-3, 5e-4))
    assert coarse.lower <= fine.lower <= fine.upper <= coarse.upper
    assert coarse.value == pytest.approx(fine.value, rel=1e-3)  # measured: 6e-4


def test_results_with_magnets_say_what_belongs_to_the_current(pot_26_16: fm.Design) -> None:
    result = fm.solve(with_magnet(pot_26_16), current=2.0)
    energy = result.inductance.value
    assert result.apparent_inductance == pytest.approx(energy, rel=1e-6)
    assert result.incremental_inductance == pytest.approx(energy, rel=1e-6)
    assert result.stored_energy == pytest.approx(2.0 * energy, rel=1e-6)
    assert result.magnet_flux_linkage == pytest.approx(1.546e-3, rel=1e-3)
    assert result.flux_linkage == pytest.approx(result.magnet_flux_linkage + 2.0 * energy, rel=1e-6)
    assert result.magnet_coenergy.upper < 0.0
    # 0.389 T of the magnet and 0.263 T of the current
    assert result.section_means[0].flux_density == pytest.approx(0.652, abs=2e-3)


def test_hand_formulas_of_a_linear_design_do_not_see_the_remanence(pot_26_16: fm.Design) -> None:
    filled = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, permeability=1.05),))
    with_fill = fm.solve(filled, tolerance=5e-3)
    own = fm.solve(with_magnet(pot_26_16), tolerance=5e-3)
    for one, other in zip(own.hand, with_fill.hand, strict=True):
        assert one.estimate == other.estimate


def test_a_result_with_a_magnet_is_written_and_read_back(
    tmp_path: Path, pot_26_16: fm.Design
) -> None:
    result = fm.solve(saturating(pot_26_16, -0.2), current=3.0, tolerance=1e-2)
    fm.write_result(result, tmp_path / "result.json")
    assert fm.read_result(tmp_path / "result.json") == result
    other = saturating(pot_26_16, -0.3)
    assert design_hash(other) != result.design_hash
    plain = fm.solve(pot_26_16, tolerance=1e-2)
    assert plain.magnet_flux_linkage is None
    assert plain.magnet_coenergy is None


def test_without_magnets_there_is_one_solution(pot_26_16: fm.Design) -> None:
    solution = solved(pot_26_16)
    assert solution.idle is None
    assert current_share(solution) == solution.coenergy
    assert isinstance(inductance_bounds(solution), Bounds)
