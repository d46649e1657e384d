"""Shaped gaps in the field: the more core there is, the larger the inductance, whatever the shape.

The co-energy of a current grows where the permeability grows anywhere (the co-energy density does,
and it is a minimum over one set of fields), so that bounds of nested cores must be in order.
"""

from dataclasses import replace
from functools import cache
from itertools import pairwise

import numpy as np
import pytest

import femag as fm
from femag.design import whole_section
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import Bounds
from femag.field.design_problem import field_problem
from femag.geometry import gap_faces
from femag.quantities import gap_factor, plain_gap_reluctance
from femag.units import MU_0

TOLERANCE = 2e-4
R0, R1 = 2.75e-3, 5.75e-3
"""Hole and post of the pot core 26/16, m."""


@cache
def solved(design: fm.Design, gap: fm.Gap, tolerance: float = TOLERANCE) -> Bounds:
    problem = field_problem(replace(design, gaps=(gap,)))
    return inductance_bounds(adapted_solution(problem, 1.0, tolerance)[0])


def in_order(*rising: Bounds) -> bool:
    """Whether values can rise as given: no lower bound above the upper bound of a later one."""
    return all(low.lower <= high.upper for i, low in enumerate(rising) for high in rising[i + 1 :])


def apart(low: Bounds, high: Bounds) -> bool:
    """Whether one value is surely below the other."""
    return low.upper < high.lower


def test_zero_slope_is_the_flat_gap(pot_26_16: fm.Design) -> None:
    flat = solved(pot_26_16, fm.Gap(0.5e-3))
    assert solved(pot_26_16, fm.Gap(0.5e-3, rim_length=0.5e-3)) == flat


def test_a_step_of_equal_length_is_the_flat_gap(pot_26_16: fm.Design) -> None:
    flat = solved(pot_26_16, fm.Gap(0.5e-3))
    same = solved(pot_26_16, fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.5e-3)))
    assert in_order(flat, same)
    assert in_order(same, flat)


@pytest.mark.parametrize("place", [{}, {"pieces": 2}, {"offset": 3e-3}], ids=str)
@pytest.mark.parametrize("other", [0.1e-3, 1e-3])
def test_a_cone_lies_between_its_flat_gaps(
    pot_26_16: fm.Design, other: float, place: dict[str, float]
) -> None:
    cone = solved(pot_26_16, fm.Gap(0.5e-3, rim_length=other, **place), 1e-3)
    short, long = (solved(pot_26_16, fm.Gap(x, **place), 1e-3) for x in sorted((0.5e-3, other)))
    assert apart(long, cone)
    assert apart(cone, short)


@pytest.mark.parametrize("length", [0.1e-3, 1e-3])
@pytest.mark.parametrize("diameter", [6.5e-3, 8e-3, 11e-3])
def test_a_step_lies_between_its_flat_gaps(
    pot_26_16: fm.Design, diameter: float, length: float
) -> None:
    stepped = solved(pot_26_16, fm.Gap(0.5e-3, step=fm.Step(diameter, length)), 1e-3)
    short, long = (solved(pot_26_16, fm.Gap(x), 1e-3) for x in sorted((0.5e-3, length)))
    assert apart(long, stepped)
    assert apart(stepped, short)


def test_a_step_as_wide_as_the_post_is_the_flat_gap_of_its_length(pot_26_16: fm.Design) -> None:
    """Missing inductance at 0.2, 0.1 and 0.02 mm from the rim: 6.1, 3.2 and 0.7 %.

    At the hole a thin collar still draws flux, so that the other limit is slow: 20 % more than the
    wide gap at 0.2 mm, 8 % at 0.02 mm.
    """
    wide, narrow = solved(pot_26_16, fm.Gap(0.5e-3)), solved(pot_26_16, fm.Gap(0.1e-3))
    radii = (R0 + 0.02e-3, R0 + 0.2e-3, R1 - 0.2e-3, R1 - 0.1e-3, R1 - 0.02e-3)
    steps = [solved(pot_26_16, fm.Gap(0.5e-3, step=fm.Step(2 * r, 0.1e-3))) for r in radii]
    for low, high in pairwise((wide, *steps, narrow)):
        assert apart(low, high)
    shares = [step.value / narrow.value - 1.0 for step in steps[2:]]
    assert shares == pytest.approx([-0.061, -0.032, -0.0066], abs=1e-3)


def test_a_step_tends_to_the_post_that_goes_through(pot_26_16: fm.Design) -> None:
    closed = solved(pot_26_16, fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0)), 1e-3)
    steps = [
        solved(pot_26_16, fm.Gap(0.5e-3, step=fm.Step(8e-3, length)), 1e-3)
        for length in (30e-6, 10e-6, 3e-6)
    ]
    for low, high in pairwise((*steps, closed)):
        assert apart(low, high)
    missing = [1.0 / step.value - 1.0 / closed.value for step in steps]
    assert apart(closed, solved(replace(pot_26_16, gaps=()), fm.Gap(1e-6)))
    for more, less in pairwise(missing):
        assert less < 0.5 * more


@pytest.mark.parametrize("edge", ["chamfer", "edge_radius"])
def test_small_edges_tend_to_the_sharp_rim(pot_26_16: fm.Design, edge: str) -> None:
    sharp = solved(pot_26_16, fm.Gap(0.5e-3), 1e-4)
    sizes = (1e-3, 0.1e-3, 0.01e-3)
    found = [solved(pot_26_16, fm.Gap(0.5e-3, **{edge: size}), 1e-4) for size in sizes]
    assert in_order(*found, sharp)
    assert apart(found[0], sharp)
    assert found[-1].value == pytest.approx(sharp.value, rel=2e-3)


def test_a_rounded_edge_lies_between_sharp_and_cut(pot_26_16: fm.Design) -> None:
    """The chamfer through the ends of the arc takes more off, the one that touches it less."""
    radius = 0.3e-3
    sharp = solved(pot_26_16, fm.Gap(0.5e-3))
    inner = solved(pot_26_16, fm.Gap(0.5e-3, chamfer=radius))
    outer = solved(pot_26_16, fm.Gap(0.5e-3, chamfer=0.97 * (2 - np.sqrt(2)) * radius))
    rounded = solved(pot_26_16, fm.Gap(0.5e-3, edge_radius=radius))
    assert apart(inner, rounded)
    assert apart(rounded, outer)
    assert apart(outer, sharp)


def test_the_facets_of_a_rounded_edge_are_enough(
    pot_26_16: fm.Design, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Against 32 facets: 6e-5 of L at a radius of 1 mm, 2e-5 at 0.3 mm; it falls with their third
    power."""
    gap = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, edge_radius=1e-3),))
    values = []
    for facets in (4, gap_faces.EDGE_FACETS, 32):
        monkeypatch.setattr(gap_faces, "EDGE_FACETS", facets)
        found = inductance_bounds(adapted_solution(field_problem(gap), 1.0, 4e-5)[0])
        values.append(found.value)
    coarse, own = (abs(value / values[-1] - 1.0) for value in values[:-1])
    assert own < 7e-5
    assert own < 0.3 * coarse


@pytest.mark.parametrize(
    "gap",
    [
        fm.Gap(0.5e-3, rim_length=1e-3, chamfer=0.2e-3),
        fm.Gap(0.6e-3, pieces=2, step=fm.Step(8e-3, 0.2e-3), edge_radius=0.1e-3),
    ],
    ids=str,
)
def test_half_and_whole_section_of_a_shaped_gap_agree(pot_26_16: fm.Design, gap: fm.Gap) -> None:
    design = replace(pot_26_16, gaps=(gap,))
    whole = field_problem(design, whole_section(design))
    assert whole.section.copies == 1
    found = inductance_bounds(adapted_solution(whole, 1.0, 1e-3)[0])
    half = solved(pot_26_16, gap, 1e-3)
    assert in_order(found, half)
    assert in_order(half, found)


@pytest.mark.parametrize("shape", [{"rim_length": 1e-3}, {"step": fm.Step(8e-3, 0.1e-3)}], ids=str)
@pytest.mark.parametrize("offset", [2e-3, 5.25e-3])
def test_shaped_gaps_in_mirror_places_give_one_inductance(
    pot_26_16: fm.Design, shape: dict[str, object], offset: float
) -> None:
    up = solved(pot_26_16, fm.Gap(0.5e-3, offset=offset, **shape), 1e-3)
    down = solved(pot_26_16, fm.Gap(0.5e-3, offset=-offset, **shape), 1e-3)
    assert in_order(up, down)
    assert in_order(down, up)


SHALLOW = [
    fm.Gap(20e-6, rim_length=40e-6),
    fm.Gap(40e-6, rim_length=20e-6),
    fm.Gap(20e-6, step=fm.Step(8e-3, 10e-6)),
    fm.Gap(20e-6, offset=5.5e-3 - 10e-6, rim_length=40e-6),
]


@pytest.mark.parametrize("gap", SHALLOW, ids=str)
def test_a_shallow_gap_has_the_permeance_of_its_faces(pot_26_16: fm.Design, gap: fm.Gap) -> None:
    """Integral of area over length, closed forms below, ideal core: fringing adds 2 to 4 % in the
    middle and 7 % at a plate."""
    design = replace(pot_26_16, gaps=(gap,), material=fm.LinearCurve(1e6))
    if gap.step:
        permeance = MU_0 * np.pi * ((16e-6 - R0**2) / 10e-6 + (R1**2 - 16e-6) / 20e-6)
    else:
        b = (gap.rim_length - gap.length) / (R1 - R0)
        a = gap.length - b * R0
        permeance = MU_0 * 2 * np.pi / b * (R1 - R0 - a / b * np.log(gap.rim_length / gap.length))
    assert plain_gap_reluctance(design) == pytest.approx(1.0 / permeance, rel=1e-9)
    factor = gap_factor(design, adapted_solution(field_problem(design), 1.0, 1e-3)[0])
    assert 1.0 < factor < (1.07 if gap.offset else 1.04)


def test_a_closed_step_swings_from_the_ungapped_core_to_the_gapped_one(
    saturating_26_16: fm.Design,
) -> None:
    """A swinging choke: large at small currents; at large ones the middle of the post saturates."""
    choke = replace(saturating_26_16, gaps=(fm.Gap(0.5e-3, step=fm.Step(7e-3, 0.0)),))
    plain = replace(saturating_26_16, gaps=(fm.Gap(0.5e-3),))

    def incremental(design: fm.Design, current: float) -> float:
        return fm.solve(design, current=current).incremental_inductance

    small, large = (incremental(choke, current) for current in (0.02, 2.0))
    assert small > 10 * incremental(plain, 0.02)
    assert large < 1.2 * incremental(plain, 2.0)
