from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.quantities import (
    field_map,
    flux_through_discs,
    gap_factor,
    incremental_inductance_of_sides,
    section_means,
    typical_peak,
)
from femag.units import MU_0


def solved(design: fm.Design, tolerance: float = 1e-4) -> FieldSolution:
    return adapted_solution(field_problem(design), design.current, tolerance)[0]


@pytest.mark.parametrize(
    "current",
    [pytest.param(0.5, marks=pytest.mark.slow), 6.0, pytest.param(20.0, marks=pytest.mark.slow)],
)
def test_incremental_inductance_is_the_slope_of_the_flux_linkage(
    saturating_26_16: fm.Design, current: float
) -> None:
    """Against central differences of full solutions: both sides stay within the bracket's scale."""
    design = replace(saturating_26_16, current=current)
    step = 1e-3 * current
    low, high = (solved(replace(design, current=current + d)) for d in (-step, step))
    slope = np.subtract(high.flux_linkage_of_sides, low.flux_linkage_of_sides) / (2 * step)
    found = incremental_inductance_of_sides(solved(design))
    np.testing.assert_allclose(found, slope, rtol=2e-3)


def test_incremental_inductances_of_a_linear_core_are_the_bounds(pot_26_16: fm.Design) -> None:
    solution = solved(pot_26_16)
    from_flux, from_potential = incremental_inductance_of_sides(solution)
    assert from_flux == pytest.approx(2 * solution.coenergy.lower, rel=1e-10)
    assert from_potential == pytest.approx(2 * solution.coenergy.upper, rel=1e-10)


def test_flux_goes_round_an_ungapped_core(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, gaps=(), material=fm.LinearCurve(1e5))
    solution = solved(design)
    flux = [mean.area * mean.flux_density for mean in section_means(design, solution)]
    linkage = sum(solution.flux_linkage_of_sides) / 2
    np.testing.assert_allclose(flux, linkage / design.turns, rtol=1e-3)


def test_means_follow_from_the_whole_section_too(pot_26_16: fm.Design) -> None:
    """The same core with the winding moved by a hair: its upper and lower half nearly agree."""
    block = fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3 + 1e-9)
    moved = replace(pot_26_16, windings=(fm.Winding(50, block),))
    one, other = solved(pot_26_16), solved(moved)
    assert (one.sides.mesh.section.copies, other.sides.mesh.section.copies) == (2, 1)
    for mean, twin in zip(section_means(pot_26_16, one), section_means(moved, other), strict=True):
        assert twin.flux_density == pytest.approx(mean.flux_density, rel=3e-3)


def test_mean_flux_density_of_the_post_is_the_flux_over_its_area(pot_26_16: fm.Design) -> None:
    solution = solved(pot_26_16)
    faces = flux_through_discs(solution, np.array([[2.75e-3, 5.75e-3], [0.25e-3, 0.25e-3]]))
    first = section_means(pot_26_16, solution)[0]
    area = np.pi * (5.75e-3**2 - 2.75e-3**2)
    assert first.area == pytest.approx(area)
    assert first.flux_density == pytest.approx(abs(faces[1] - faces[0]) / area, rel=1e-12)


def test_gap_factor_tends_to_one_with_the_gap(pot_26_16: fm.Design) -> None:
    factors = []
    for gap in (0.4e-3, 0.1e-3, 0.02e-3):
        design = replace(pot_26_16, gaps=(fm.Gap(gap),))
        factors.append(gap_factor(design, solved(design, 1e-3)))
    assert factors == sorted(factors, reverse=True)
    assert 1.0 < factors[-1] < 1.04


def test_gap_factor_is_that_of_total_less_core_reluctance(pot_26_16: fm.Design) -> None:
    """For a linear core: N^2/L less the core's share of the stored energy."""
    solution = solved(pot_26_16)
    total = 50**2 / (2 * solution.coenergy.value)
    mesh, b, h = solution.sides.mesh, solution.flux.field, solution.potential.field
    core = [mesh.names.index(part.name) for part in mesh.section.regions if part.role == "core"]
    inside, mu = np.isin(mesh.region, core), 2000 * MU_0
    weight = solution.sides.discretisation.weight[inside]
    stored = np.array([np.sum(weight * np.sum(b[inside] ** 2, axis=1)) / mu,
                       np.sum(weight * np.sum(h[inside] ** 2, axis=1)) * mu]) / 2  # fmt: skip
    outside = total * (1 - stored.mean() / solution.coenergy.value)
    plain = 0.5e-3 / (MU_0 * np.pi * (5.75e-3**2 - 2.75e-3**2))
    assert gap_factor(pot_26_16, solution) == pytest.approx(plain / outside, rel=1e-6)


def test_an_ungapped_core_has_no_gap_factor(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, gaps=())
    assert gap_factor(design, solved(design, 1e-3)) is None


def test_field_map_covers_the_whole_section_and_its_flux_peaks_in_the_window(
    pot_26_16: fm.Design,
) -> None:
    solution = solved(pot_26_16, 1e-3)
    fields = field_map(solution)
    corners = np.stack([fields.r, fields.z])[:, fields.triangles]
    (r1, z1), (r2, z2) = corners[..., 1] - corners[..., 0], corners[..., 2] - corners[..., 0]
    areas = np.abs(r1 * z2 - r2 * z1) / 2
    core = (12.75 - 2.75) * 16.1 - (10.6 - 5.75) * 11.0 - 3.0 * 0.5
    assert areas[fields.role == "core"].sum() == pytest.approx(core * 1e-6, rel=1e-9)
    assert areas[fields.role == "winding"].sum() == pytest.approx(3.6e-3 * 9.6e-3, rel=1e-9)
    peak = np.argmax(np.abs(fields.flux))
    assert 5.75e-3 < fields.r[peak] < 10.6e-3
    linkage = sum(solution.flux_linkage_of_sides) / 2
    assert np.abs(fields.flux).max() == pytest.approx(linkage / 50, rel=0.05)


def test_typical_peak_is_a_percentile_and_not_a_corner_value(pot_26_16: fm.Design) -> None:
    coarse, fine = solved(pot_26_16, 1e-3), solved(pot_26_16, 1e-5)
    maps = [field_map(solution) for solution in (coarse, fine)]
    typical = [typical_peak(fields) for fields in maps]
    assert typical[1] == pytest.approx(typical[0], rel=0.02)
    core = [fields.flux_density[fields.triangles[fields.role == "core"]].max() for fields in maps]
    assert core[1] > 1.5 * typical[1]


@pytest.mark.parametrize(
    ("size", "least"), [("P 22/13", 58.1e-6), ("P 30/19", 117e-6), ("P 36/22", 173e-6)]
)
def test_a_solid_post_saturates_first_where_the_plate_leaves_it(size: str, least: float) -> None:
    """Least sections as published in data sheets of cores without hole: the ring 2 pi r t."""
    core = replace(fm.catalogue_core(size).core(), hole_diameter=0.0)
    design = fm.Design(
        core=core,
        gaps=fm.Gap(core.post_diameter / 50),
        windings=fm.Winding(20),
        material=fm.LinearCurve(2200),
    )
    means = {mean.name: mean for mean in section_means(design, solved(design, 1e-3))}
    ring = means.pop("plate, at the post")
    assert ring.area == pytest.approx(least, rel=0.005)
    assert ring.flux_density > max(mean.flux_density for mean in means.values())
