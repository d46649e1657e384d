"""Relations that hold for every design, on a crowd of them drawn at random."""

from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.design import whole_section
from femag.field.adapt import adapted_solution
from femag.field.design_problem import field_problem

pytestmark = pytest.mark.slow


def drawn_design(seed: int) -> fm.Design:
    random = np.random.default_rng(seed)
    post = random.uniform(2e-3, 25e-3)
    window = post * random.uniform(1.4, 2.6)
    height = post * random.uniform(0.5, 2.5)
    core = fm.PotCore(
        post_diameter=post,
        hole_diameter=post * random.choice([0.0, random.uniform(0.1, 0.8)]),
        window_diameter=window,
        outer_diameter=window * random.uniform(1.05, 1.4),
        window_height=height,
        height=height + post * random.uniform(0.2, 0.8),
    )
    gap = fm.Gap(post * 10 ** random.uniform(-3, -0.7), random.choice(["post", "all"]))
    curve = fm.FroehlichCurve(
        10 ** random.uniform(1, 5), random.uniform(0.3, 2.0), random.uniform(1, 10)
    )
    turns = int(random.integers(1, 200))
    ampere_turns = curve.saturation / 4e-7 / np.pi * gap.length * 10 ** random.uniform(-1, 0.5)
    return fm.Design(
        core=core,
        gaps=(gap,) if gap.length < 0.9 * height else (),
        windings=(fm.Winding(turns),),
        material=curve,
        current=ampere_turns / turns,
    )


@pytest.mark.parametrize("seed", range(30))
def test_relations_of_every_design(seed: int) -> None:
    design = drawn_design(seed)
    result = fm.solve(design)
    lower, upper = result.inductance.lower, result.inductance.upper
    assert 0.0 < lower < upper < lower * (1 + 2.1e-3)
    slack = 1.0 + 2 * design.tolerance
    assert result.incremental_inductance < result.apparent_inductance * (1 + 0.05)
    assert result.apparent_inductance < result.inductance.value * slack

    section = whole_section(design)
    whole, _ = adapted_solution(field_problem(design, section), design.current, design.tolerance)
    assert whole.coenergy.lower <= result.coenergy.upper
    assert result.coenergy.lower <= whole.coenergy.upper

    if design.gaps:
        wider = replace(design.gaps[0], length=1.02 * design.gaps[0].length)
        assert fm.solve(replace(design, gaps=(wider,))).inductance.lower < upper


def test_tightest_bounds_of_the_pot_core_hold_the_reference(pot_26_16: fm.Design) -> None:
    """650.1891 uH: computed for this project with NGSolve, order 7, elements down to 0.2 um."""
    bounds = fm.solve(pot_26_16, tolerance=1e-6).inductance
    assert bounds.lower < 650.18915e-6
    assert bounds.upper > 650.18905e-6
    assert bounds.relative_half_width < 1e-6
