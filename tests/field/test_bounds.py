from dataclasses import replace
from itertools import islice

import numpy as np
import pytest

import femag as fm
from femag.design import whole_section
from femag.field.adapt import adapted_solution, inductance_bounds, refinements
from femag.field.bounds import Bounds, FieldSolution
from femag.field.design_problem import field_problem
from femag.geometry import DIMENSIONS

SATURATIONS = [0.01, 6.0, 60.0]


def solved(design: fm.Design, tolerance: float = 1e-3, *, whole: bool = False) -> FieldSolution:
    section = whole_section(design) if whole else None
    return adapted_solution(field_problem(design, section), design.current, tolerance)[0]


def overlap(one: Bounds, other: Bounds) -> bool:
    return one.lower <= other.upper and other.lower <= one.upper


def test_local_gaps_sum_to_the_width_of_a_linear_problem(pot_26_16: fm.Design) -> None:
    for solution in islice(refinements(field_problem(pot_26_16), 1.0), 4):
        width = solution.coenergy.upper - solution.coenergy.lower
        assert solution.local_gap.sum() == pytest.approx(width, rel=1e-9)
        assert solution.local_gap.min() >= 0.0


@pytest.mark.parametrize("current", SATURATIONS)
def test_local_gaps_sum_to_the_width_of_a_saturating_problem(
    saturating_26_16: fm.Design, current: float
) -> None:
    for solution in islice(refinements(field_problem(saturating_26_16), current), 3):
        width = solution.coenergy.upper - solution.coenergy.lower
        assert solution.local_gap.sum() == pytest.approx(width, rel=1e-9)
        assert solution.local_gap.min() >= -1e-12 * solution.local_gap.max()


@pytest.mark.parametrize("current", [1.0, 60.0])
def test_bounds_close_in_monotonically(saturating_26_16: fm.Design, current: float) -> None:
    steps = list(islice(refinements(field_problem(saturating_26_16), current), 5))
    lower = np.array([step.coenergy.lower for step in steps])
    upper = np.array([step.coenergy.upper for step in steps])
    assert np.all(np.diff(lower) > 0)
    assert np.all(np.diff(upper) < 0)
    assert np.all(lower < upper)


def rate(design: fm.Design, least: int, most: int) -> float:
    """Return the slope of log width against log unknowns from `least` to `most` unknowns."""
    unknowns, widths = [], []
    for solution in refinements(field_problem(design), design.current):
        if solution.unknowns >= least:
            unknowns.append(solution.unknowns)
            widths.append(solution.coenergy.relative_half_width)
        if solution.unknowns > most:
            break
    return float(np.polyfit(np.log(unknowns), np.log(widths), 1)[0])


def test_width_shrinks_at_the_optimal_rate_of_adaptive_p2(pot_26_16: fm.Design) -> None:
    """Quadratic elements on well graded meshes: the squared energy error falls as unknowns^-2.

    Binev, Dahmen and DeVore, Numer. Math. 97 (2004) 219 (cited from memory), for the optimality.
    """
    assert rate(pot_26_16, 4_000, 40_000) < -1.9


def test_width_of_a_saturating_core_shrinks_at_the_same_rate(saturating_26_16: fm.Design) -> None:
    assert rate(saturating_26_16, 4_000, 25_000) < -1.9


@pytest.fixture(scope="module")
def closely_bounded(pot_26_16: fm.Design) -> Bounds:
    return inductance_bounds(solved(pot_26_16, 1e-5))


@pytest.mark.parametrize("scale", [1e-3, 0.3, 8.0, 700.0])
def test_scaling_all_lengths_scales_the_inductance(
    pot_26_16: fm.Design, closely_bounded: Bounds, scale: float
) -> None:
    one = closely_bounded
    other = inductance_bounds(solved(scaled(pot_26_16, scale), 1e-5))
    assert overlap(one.scaled(scale, "H"), other)
    assert other.value == pytest.approx(scale * one.value, rel=1e-5)


def test_scaling_by_a_power_of_two_scales_both_bounds(pot_26_16: fm.Design) -> None:
    one = inductance_bounds(solved(pot_26_16))
    other = inductance_bounds(solved(scaled(pot_26_16, 8.0)))
    assert other.lower == pytest.approx(8.0 * one.lower, rel=1e-12)
    assert other.upper == pytest.approx(8.0 * one.upper, rel=1e-12)


def test_scaling_lengths_and_current_scales_a_saturating_core(
    saturating_26_16: fm.Design,
) -> None:
    one = inductance_bounds(solved(saturating_26_16))
    larger = replace(scaled(saturating_26_16, 2.0), current=2.0 * saturating_26_16.current)
    other = inductance_bounds(solved(larger))
    assert other.value == pytest.approx(2.0 * one.value, rel=1e-6)


def scaled(design: fm.Design, scale: float) -> fm.Design:
    core = fm.PotCore(**{name: scale * getattr(design.core, name) for name in DIMENSIONS})
    block = fm.Block(**{name: scale * v for name, v in vars(design.windings[0].block).items()})
    gaps = tuple(fm.Gap(scale * gap.length, gap.leg) for gap in design.gaps)
    return replace(design, core=core, windings=(fm.Winding(50, block),), gaps=gaps)


def test_inductance_goes_with_turns_squared(saturating_26_16: fm.Design) -> None:
    doubled = replace(
        saturating_26_16,
        windings=(fm.Winding(100, saturating_26_16.windings[0].block),),
        current=saturating_26_16.current / 2,
    )
    one, other = (inductance_bounds(solved(d)) for d in (saturating_26_16, doubled))
    assert other.lower == pytest.approx(4 * one.lower, rel=1e-11)
    assert other.upper == pytest.approx(4 * one.upper, rel=1e-11)


@pytest.mark.parametrize(
    "gaps",
    [(fm.Gap(0.5e-3),), pytest.param((fm.Gap(0.3e-3, "all"),), marks=pytest.mark.slow), ()],
)
def test_mirrored_half_and_whole_section_agree(
    saturating_26_16: fm.Design, gaps: tuple[fm.Gap, ...]
) -> None:
    design = replace(saturating_26_16, gaps=gaps)
    half, whole = solved(design, 1e-4), solved(design, 1e-4, whole=True)
    assert (half.sides.mesh.section.copies, whole.sides.mesh.section.copies) == (2, 1)
    assert overlap(half.coenergy, whole.coenergy)
    assert whole.coenergy.value == pytest.approx(half.coenergy.value, rel=1e-4)


def test_two_halves_in_series_are_one_winding(saturating_26_16: fm.Design) -> None:
    lower = fm.Winding(25, fm.Block(6.4e-3, 10e-3, -4.8e-3, 0.0), "lower")
    upper = fm.Winding(25, fm.Block(6.4e-3, 10e-3, 0.0, 4.8e-3), "upper")
    split = replace(saturating_26_16, windings=(lower, upper), driven=("lower", "upper"))
    one, two = solved(saturating_26_16, 1e-4), solved(split, 1e-4)
    assert overlap(one.coenergy, two.coenergy)
    assert two.coenergy.value == pytest.approx(one.coenergy.value, rel=1e-4)


def test_reversed_current_reverses_the_field(saturating_26_16: fm.Design) -> None:
    one = solved(saturating_26_16)
    other = solved(replace(saturating_26_16, current=-saturating_26_16.current))
    np.testing.assert_allclose(other.flux.field, -one.flux.field, rtol=1e-9, atol=1e-12)
    scale = np.abs(one.potential.field).max()
    np.testing.assert_allclose(other.potential.field, -one.potential.field, atol=1e-9 * scale)
    assert other.coenergy.lower == pytest.approx(one.coenergy.lower, rel=1e-12)
    assert other.coenergy.upper == pytest.approx(one.coenergy.upper, rel=1e-12)


def test_linear_flux_linkages_are_those_of_the_energies(pot_26_16: fm.Design) -> None:
    solution = solved(replace(pot_26_16, current=3.0))
    from_flux, from_potential = solution.flux_linkage_of_sides
    assert 3.0 * from_flux / 2 == pytest.approx(solution.coenergy.lower, rel=1e-11)
    assert 3.0 * from_potential / 2 == pytest.approx(solution.coenergy.upper, rel=1e-11)


def test_coenergy_grows_with_the_gap_closed_and_the_material_better(
    pot_26_16: fm.Design,
) -> None:
    def lower(**change: object) -> float:
        return solved(replace(pot_26_16, **change)).coenergy.lower

    def upper(**change: object) -> float:
        return solved(replace(pot_26_16, **change)).coenergy.upper

    assert upper(gaps=(fm.Gap(0.6e-3),)) < lower()
    assert upper(material=fm.LinearCurve(1000)) < lower()
    assert upper(material=fm.FroehlichCurve(2000, 0.3, 2.0), current=4.0) < lower(current=4.0)


def test_bounds_print_the_digits_that_they_know() -> None:
    assert str(Bounds(650.142e-6, 650.224e-6, "H")) == "650.183 uH (650.142 .. 650.224)"
    assert str(Bounds(6.4e-4, 6.6e-4, "H")) == "650 uH (640 .. 660)"
    assert str(Bounds(1.0, 1.0, "J")) == "1.00000000 J (1.00000000 .. 1.00000000)"
