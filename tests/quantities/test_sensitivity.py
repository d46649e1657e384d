"""Derivatives of the discrete energies, against differences of solutions and closed forms."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.quantities.sensitivity import coenergy_derivative, deformed_mesh


def solved(design: fm.Design, tolerance: float) -> FieldSolution:
    return adapted_solution(field_problem(design), design.current, tolerance)[0]


def longer_gap(design: fm.Design, change: float) -> fm.Design:
    gap = design.gaps[0]
    return replace(design, gaps=(replace(gap, length=gap.length + change), *design.gaps[1:]))


def wider_post(design: fm.Design, change: float) -> fm.Design:
    diameter = design.core.sizes["post_diameter"] + change
    return replace(design, core=replace(design.core, post_diameter=diameter))


def taller_window(design: fm.Design, change: float) -> fm.Design:
    core = design.core
    sizes = {name: core.sizes[name] + change for name in ("window_height", "height")}
    return replace(design, core=replace(core, **sizes))


def wider_coil(design: fm.Design, change: float) -> fm.Design:
    (winding,) = design.windings
    block = replace(winding.block, inner_radius=winding.block.inner_radius + change)
    return replace(design, windings=(replace(winding, block=block),))


def more_permeable(design: fm.Design, change: float) -> fm.Design:
    permeability = design.material.permeability + change
    return replace(design, material=replace(design.material, permeability=permeability))


CHANGES: list[tuple[Callable[[fm.Design, float], fm.Design], float]] = [
    (longer_gap, 0.5e-3),
    (wider_post, 11.5e-3),
    (taller_window, 11e-3),
    (wider_coil, 6.4e-3),
    (more_permeable, 2000.0),
]


@pytest.mark.parametrize(
    ("change", "size"), CHANGES, ids=lambda value: getattr(value, "__name__", "")
)
@pytest.mark.parametrize("saturating", [False, pytest.param(True, marks=pytest.mark.slow)])
def test_derivatives_agree_with_differences_of_solutions(
    pot_26_16: fm.Design,
    change: Callable[[fm.Design, float], fm.Design],
    size: float,
    saturating: bool,
) -> None:
    material = fm.FroehlichCurve(2000, 0.45, 2) if saturating else fm.LinearCurve(2000)
    design = replace(pot_26_16, material=material, current=3.0)
    found = coenergy_derivative(solved(design, 1e-3), design, change, 1e-5 * size)
    step = 0.01 * size
    low, high = (solved(change(design, sign * step), 5e-5) for sign in (-1.0, 1.0))
    wanted = (high.coenergy.value - low.coenergy.value) / (2 * step)
    assert np.mean(found) == pytest.approx(wanted, rel=1.5e-2)


def test_the_step_hardly_matters(pot_26_16: fm.Design) -> None:
    """The energies are smooth in the moved mesh: the derivative is that of the discrete energy."""
    solution = solved(pot_26_16, 5e-3)
    found = [
        coenergy_derivative(solution, pot_26_16, longer_gap, step)[0] for step in (1e-6, 1e-7, 1e-8)
    ]
    assert found == pytest.approx([found[1]] * 3, rel=1e-6)


def test_more_gap_less_energy_more_core_more_energy(pot_26_16: fm.Design) -> None:
    solution = solved(pot_26_16, 5e-3)
    assert max(coenergy_derivative(solution, pot_26_16, longer_gap, 1e-7)) < 0.0
    assert min(coenergy_derivative(solution, pot_26_16, wider_post, 1e-7)) > 0.0
    assert min(coenergy_derivative(solution, pot_26_16, more_permeable, 1.0)) > 0.0


def test_all_lengths_together_scale_the_energy(pot_26_16: fm.Design) -> None:
    """Euler: a linear device's inductance is homogeneous of degree 1 in its lengths."""

    def scaled(design: fm.Design, change: float) -> fm.Design:
        factor = 1.0 + change
        core = replace(
            design.core, **{name: factor * size for name, size in design.core.sizes.items()}
        )
        (winding,) = design.windings
        block = fm.Block(*(factor * edge for edge in vars(winding.block).values()))
        gaps = tuple(replace(gap, length=factor * gap.length) for gap in design.gaps)
        return replace(design, core=core, gaps=gaps, windings=(replace(winding, block=block),))

    solution = solved(pot_26_16, 5e-3)
    found = coenergy_derivative(solution, pot_26_16, scaled, 1e-4)
    bounds = solution.coenergy
    assert found == pytest.approx((bounds.lower, bounds.upper), rel=1e-6)


def test_a_moved_mesh_has_the_areas_of_its_section(pot_26_16: fm.Design) -> None:
    mesh = solved(pot_26_16, 5e-3).sides.mesh
    section = field_problem(longer_gap(pot_26_16, 0.1e-3)).section
    moved = deformed_mesh(mesh, section)
    assert moved.triangles.t is not None
    back = deformed_mesh(moved, mesh.section)
    np.testing.assert_allclose(back.triangles.p, mesh.triangles.p, atol=2e-6)


def test_a_region_that_comes_is_refused(pot_26_16: fm.Design) -> None:
    solution = solved(pot_26_16, 5e-3)
    with pytest.raises(fm.InputError, match="adds or takes away"):
        coenergy_derivative(solution, pot_26_16, lambda d, _: replace(d, gaps=()), 1e-6)
