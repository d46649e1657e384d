"""Pulls by Maxwell's stress and by virtual work: closed forms, derivatives, laws of mechanics."""

from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.quantities import Force, force_of
from femag.quantities.nodal_weight import harmonic_weights, shell_weights
from femag.quantities.sensitivity import coenergy_derivative, coenergy_slope, deformed_mesh
from femag.quantities.stress import Stress
from femag.units import MU_0
from validation.nonlinear_pot import run as nonlinear_pot
from validation.nonlinear_pot.regenerate import HEIGHT, POST

SATURATING = fm.FroehlichCurve(2000, 0.45, 2)
LOPSIDED = fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 2.8e-3))


def solved(design: fm.Design, tolerance: float = 1e-3) -> tuple[Force, FieldSolution]:
    solution, _ = adapted_solution(field_problem(design), design.current, tolerance)
    return force_of(design, solution), solution


def with_gap_changed(place: int) -> object:
    def change(design: fm.Design, step: float) -> fm.Design:
        gaps = list(design.gaps)
        gaps[place] = replace(gaps[place], length=gaps[place].length + step)
        return replace(design, gaps=tuple(gaps))

    return change


CASES = {
    "post": {},
    "saturating": {"material": SATURATING, "current": 4.0},
    "spacer": {"gaps": (fm.Gap(0.3e-3, "all"),)},
    "both": {"gaps": (fm.Gap(0.3e-3), fm.Gap(0.2e-3, "all"))},
    "three pieces": {"gaps": (fm.Gap(0.9e-3, pieces=3),)},
    "off the middle": {"gaps": (fm.Gap(0.5e-3, offset=2e-3),)},
    "rounded": {"gaps": (fm.Gap(0.5e-3, edge_radius=0.3e-3),)},
    "step": {"gaps": (fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0)),)},
    "whole window": {"windings": (fm.Winding(50),)},
    "straight legs": {
        "core": fm.catalogue_core("ETD 29/16/10").core(),
        "windings": (fm.Winding(50, fm.Block(6e-3, 10e-3, -9e-3, 9e-3)),),
        "gaps": (fm.Gap(0.3e-3, "all"),),
    },
}


@pytest.mark.parametrize("case", CASES)
def test_stress_and_virtual_work_agree_with_the_derivative_by_the_gap(
    pot_26_16: fm.Design, case: str
) -> None:
    """Grinding the post moves its faces; a spacer moves the halves."""
    design = replace(pot_26_16, **CASES[case])
    force, solution = solved(design)
    for pull in (force.halves, *force.gaps):
        assert pull.force > 0.0
        assert pull.by_stress == pytest.approx(pull.by_work, rel=5e-4)
        assert pull.stress_of_sides == pytest.approx(pull.work_of_sides, rel=1e-3)
        assert pull.pressure * pull.area == pytest.approx(pull.force, rel=1e-12)
    for place, gap in enumerate(design.gaps):
        step = 1e-5 * gap.length
        slopes = coenergy_derivative(solution, design, with_gap_changed(place), step)
        if gap.leg == "all":
            moved = force.halves.force
        else:
            ground = [pull.force for pull in force.gaps if pull.name.startswith("post")]
            moved = float(np.mean(ground))
        assert -np.mean(slopes) == pytest.approx(moved, rel=5e-4)


def test_virtual_work_is_the_derivative_of_the_discrete_energies(pot_26_16: fm.Design) -> None:
    """For the nodes' own motion the stress gives the difference quotient of either side."""
    _, solution = solved(replace(pot_26_16, material=SATURATING, current=4.0), 5e-3)
    step, mesh = 1e-8, solution.sides.mesh
    change = with_gap_changed(0)
    less, more = (
        field_problem(change(replace(pot_26_16, material=SATURATING), sign * step))
        for sign in (-1.0, 1.0)
    )
    moved = [deformed_mesh(mesh, problem.section).triangles.p[1] for problem in (less, more)]
    work = Stress(solution).work((moved[1] - moved[0]) / (2 * step))
    slopes = coenergy_slope(solution, less, more, 2 * step)
    assert np.negative(work) == pytest.approx(slopes, rel=1e-5)


def test_a_uniform_gap_pulls_with_b_squared_over_two_mu0(pot_26_16: fm.Design) -> None:
    """A gap that is short beside the post, without window leakage to speak of."""
    core = replace(pot_26_16.core, hole_diameter=0.0)
    design = replace(
        pot_26_16, core=core, gaps=(fm.Gap(5e-6),), material=fm.LinearCurve(1e5), tolerance=1e-2
    )
    force, solution = solved(design, 1e-2)
    (gap,) = force.gaps
    flux = np.mean(solution.flux_linkage_of_sides) / 50
    area = np.pi * 5.75e-3**2
    assert gap.area == pytest.approx(area, rel=1e-12)
    assert gap.force == pytest.approx(flux**2 / (2 * MU_0 * area), rel=1e-2)


@pytest.mark.parametrize("current", [100.0, 1000.0])
def test_a_cut_in_a_uniform_field_carries_b_squared_over_two_mu0(current: float) -> None:
    """Post of the one-dimensional pot: what the cut adds is the slit's stress less the core's."""
    problem = nonlinear_pot.pot()
    solution, _ = adapted_solution(problem, current, nonlinear_pot.TOLERANCE)
    row = next(r for r in nonlinear_pot.table_of("nonlinear_pot") if float(r["current"]) == current)
    b, area = float(row["B_post"]), np.pi * POST**2
    inside = nonlinear_pot.MATERIAL.energy_density(np.array(b))
    wanted = area * (b**2 / (2 * MU_0) - float(inside))
    found = Stress(solution).pull_of_cut(0.0, POST, 0.3 * HEIGHT)
    assert found == pytest.approx((wanted, wanted), rel=1e-4)


def test_the_two_halves_pull_each_other_with_one_force(pot_26_16: fm.Design) -> None:
    """Each half alone, against all else held: core and turns above and below the spacer's middle.

    Nothing is symmetric, so that the forces come from different parts of the mesh.
    """
    design = replace(pot_26_16, gaps=(fm.Gap(0.3e-3, "all"),), windings=(LOPSIDED,))
    _, solution = solved(design)
    mesh, forces = solution.sides.mesh, []
    stress = Stress(solution)
    parts = {
        side: np.unique(
            mesh.triangles.t[:, np.concatenate([mesh.elements_of(f"{side} {part}") for part in
                                                ("plate", "post", "ring")])]
        )
        for side in ("upper", "lower")
    }  # fmt: skip
    coil = np.unique(mesh.triangles.t[:, mesh.elements_of("winding main")])
    far = mesh.triangles.facets[:, mesh.walls["far"]].ravel()
    held = np.unique(np.concatenate([*parts.values(), coil, far]))
    for moved in (parts["upper"], parts["lower"], coil):
        weight = np.zeros((1, mesh.triangles.nvertices))
        weight[0, moved] = 1.0
        (smooth,) = harmonic_weights(mesh, weight, held)
        forces.append(-np.array(stress.work(shell_weights(smooth))))
    upper, lower, turns = forces
    assert np.mean(upper) < 0.0 < np.mean(lower)
    assert upper + lower + turns == pytest.approx(np.zeros(2), abs=2e-4 * abs(upper[0]))
    on_turns = stress.force_on_turns(np.ones(mesh.triangles.nvertices))
    assert turns == pytest.approx(on_turns, abs=2e-4 * abs(upper[0]))


def test_a_linear_core_pulls_with_the_square_of_the_current_whatever_its_size(
    pot_26_16: fm.Design,
) -> None:
    force, _ = solved(pot_26_16)
    factor = 3.0
    core = replace(
        pot_26_16.core, **{name: factor * size for name, size in pot_26_16.core.sizes.items()}
    )
    block = fm.Block(*(factor * edge for edge in vars(pot_26_16.windings[0].block).values()))
    larger = replace(
        pot_26_16, core=core, gaps=(fm.Gap(factor * 0.5e-3),), windings=(fm.Winding(50, block),),
        current=2.0,
    )  # fmt: skip
    other, _ = solved(larger)
    for one, two in zip((force.halves, *force.gaps), (other.halves, *other.gaps), strict=True):
        assert two.force == pytest.approx(4.0 * one.force, rel=2e-3)


def test_the_filling_of_a_gap_is_pressed_with_the_stress_at_the_face(pot_26_16: fm.Design) -> None:
    """A thin gap: filled with 4, its flux is four times as large, the pressure at equal flux not.

    Stretching the filling does a quarter of that work: the rest is what a cut through it adds.
    """
    base = replace(pot_26_16, gaps=(fm.Gap(20e-6, permeability=4.0),), tolerance=5e-3)
    force, solution = solved(base, 5e-3)
    (gap,) = force.gaps
    cut = next(mean for mean in fm.solve(base).section_means if mean.name == "post, at the gap")
    assert gap.pressure == pytest.approx(cut.flux_density**2 / (2 * MU_0), rel=2e-2)
    stretched = coenergy_derivative(solution, base, with_gap_changed(0), 1e-10)
    assert -np.mean(stretched) == pytest.approx(gap.force / 4, rel=2e-2)


def test_a_magnet_against_the_current_eases_the_pull(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, material=SATURATING, current=2.0)
    pulls = [
        solved(replace(design, gaps=(fm.Gap(0.5e-3, magnet=fm.Magnet(remanence)),)), 5e-3)[0]
        for remanence in (-0.05, 0.05)
    ]
    for pull in pulls:
        assert pull.halves.by_stress == pytest.approx(pull.halves.by_work, rel=1e-3)
    assert 0.0 < pulls[0].halves.force < pulls[1].halves.force


def test_the_gap_at_a_plate_pulls_the_post_more_than_the_one_in_the_middle(
    pot_26_16: fm.Design,
) -> None:
    """Its field spreads on one side only; moving the face down is the same as a longer gap."""
    force, solution = solved(replace(pot_26_16, gaps=(fm.Gap(0.5e-3, offset=5.25e-3),)))
    (gap,) = force.gaps
    assert gap.by_stress == pytest.approx(gap.by_work, rel=5e-4)
    design = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, offset=5.25e-3),))

    def longer(before: fm.Design, change: float) -> fm.Design:
        length = 0.5e-3 + change
        return replace(before, gaps=(fm.Gap(length, offset=5.5e-3 - length / 2),))

    slopes = coenergy_derivative(solution, design, longer, 5e-9)
    assert -np.mean(slopes) == pytest.approx(gap.force, rel=5e-4)


def test_halves_without_a_gap_are_pulled_at_both_joints(pot_26_16: fm.Design) -> None:
    """An ideal slit: the flux squared over the sections of post and ring."""
    design = replace(pot_26_16, gaps=())
    force, solution = solved(design, 1e-2)
    assert force.gaps == ()
    assert force.halves.name == "joints of post and ring"
    flux = np.mean(solution.flux_linkage_of_sides) / 50
    turned = design.core.turned
    sections = (np.pi * (turned.post_radius**2 - turned.hole_radius**2), turned.ring_area)
    wanted = sum(flux**2 / (2 * MU_0 * section) for section in sections)
    assert force.halves.force == pytest.approx(wanted, rel=2e-2)
