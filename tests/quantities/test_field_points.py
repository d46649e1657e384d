from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.quantities import PointFields, field_map, point_fields
from femag.units import MU_0


@pytest.fixture(scope="module")
def result() -> fm.Result:
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11.0e-3, 5.5e-3)
    design = fm.Design(
        core=core,
        gaps=fm.Gap(0.5e-3),
        windings=fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3)),
        material=fm.FroehlichCurve(2000.0, 0.45, 2.0),
        current=6.0,
        tolerance=2e-2,
    )
    return fm.solve(design)


def fields(result: fm.Result, *points: tuple[float, float]) -> PointFields:
    assert result.solution is not None
    return point_fields(result.solution, np.array(points).T)


def test_fields_at_points_are_those_of_the_map(result: fm.Result) -> None:
    assert result.solution is not None
    drawn = field_map(result.solution, 3)
    middles = np.arange(9, len(drawn.r), 97 * 10)[:60] // 10 * 10 + 5  # inside of an element
    found = point_fields(result.solution, np.stack([drawn.r[middles], drawn.z[middles]]))
    assert np.hypot(*found.flux_density) == pytest.approx(drawn.flux_density[middles], rel=1e-9)
    assert found.flux == pytest.approx(drawn.flux[middles], rel=1e-9, abs=1e-18)


def test_below_the_mirror_plane_the_radial_part_changes_its_sign(result: fm.Result) -> None:
    above, below = (fields(result, (7e-3, z), (4e-3, 3 * z)) for z in (1e-3, -1e-3))
    assert below.flux_density == pytest.approx(above.flux_density * [[-1.0], [1.0]])
    assert below.field_strength == pytest.approx(above.field_strength * [[-1.0], [1.0]])
    assert below.flux == pytest.approx(above.flux)
    assert above.region == ("winding main", "upper post")


def test_field_strength_is_that_of_the_material_along_b(result: fm.Result) -> None:
    found = fields(result, (4e-3, 3e-3), (4e-3, 0.1e-3))
    assert found.region == ("upper post", "post gap")
    iron, gap = np.hypot(*found.field_strength)
    b_iron, b_gap = np.hypot(*found.flux_density)
    assert result.design.material.flux_density(np.array([iron])) == pytest.approx(b_iron)
    assert gap == pytest.approx(b_gap / MU_0)
    (br, bz), (hr, hz) = found.flux_density, found.field_strength
    assert br * hz == pytest.approx(bz * hr)


def test_a_magnet_takes_its_remanence_off(pot_26_16: fm.Design) -> None:
    magnet = fm.Magnet(0.4, 1.05)
    gap = fm.Gap(0.5e-3, magnet=magnet)
    found = fields(fm.solve(replace(pot_26_16, gaps=gap), tolerance=5e-2), (4e-3, 0.1e-3))
    (h,), (b,) = found.field_strength[1:], found.flux_density[1:]
    assert b == pytest.approx(MU_0 * 1.05 * h + 0.4)


def test_many_points_are_looked_up_in_pieces(
    result: fm.Result, monkeypatch: pytest.MonkeyPatch
) -> None:
    points = [(4e-3 + 1e-5 * k, 2e-3) for k in range(50)]
    whole = fields(result, *points)
    monkeypatch.setattr("femag.quantities.field_points.AT_ONCE", 20_000)
    assert fields(result, *points).flux_density.tolist() == whole.flux_density.tolist()
