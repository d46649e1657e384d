import numpy as np
import pytest

from femag.geometry.plane_permeance import plane_permeance


def circle(radius: float, centre: float = 0.0, points: int = 720) -> np.ndarray:
    angle = 2 * np.pi * np.arange(points) / points
    return np.column_stack([centre + radius * np.cos(angle), radius * np.sin(angle)])


@pytest.mark.parametrize("ratio", [1.3, 2.0, 5.0])
def test_a_ring_all_round_has_the_permeance_of_a_coaxial_pair(ratio: float) -> None:
    """2 pi / ln(b/a), closed form."""
    found = plane_permeance(4e-3, [circle(4e-3 * ratio)])
    assert found == pytest.approx(2 * np.pi / np.log(ratio), rel=4e-4)


@pytest.mark.parametrize("distance", [2.5, 4.0, 10.0])
def test_two_parallel_cylinders_have_their_closed_form(distance: float) -> None:
    """2 pi / arcosh((d^2 - a^2 - b^2) / (2 a b)), closed form."""
    a, b = 1.0, 0.8
    wanted = 2 * np.pi / np.arccosh((distance**2 - a**2 - b**2) / (2 * a * b))
    assert plane_permeance(a, [circle(b, distance)]) == pytest.approx(wanted, rel=3e-4)


def test_a_cylinder_between_two_plates_tends_to_the_slab_line() -> None:
    """Round bar midway between two wide plates, at a = 0.25 of the spacing b.

    Wholly between infinite plates the field is that of a periodic row; for a thin bar the permeance
    is 2 pi / ln(4 b / (pi d)) with d the bar's diameter (Frankel 1942, cited from memory, good to
    0.2 % up to d/b = 0.5).
    """
    spacing, half_width, thickness = 1.0, 6.0, 0.5
    radius = 0.1
    plates = [
        np.array([(-half_width, y), (half_width, y), (half_width, y + s), (-half_width, y + s)])
        for y, s in ((spacing / 2, thickness), (-spacing / 2 - thickness, thickness))
    ]
    wanted = 2 * np.pi / np.log(4 * spacing / (np.pi * 2 * radius))
    assert plane_permeance(radius, plates) == pytest.approx(wanted, rel=3e-3)


def test_scaling_leaves_it_and_panels_refine_it() -> None:
    bar = np.array([(2.0, -3.0), (3.0, -3.0), (3.0, 3.0), (2.0, 3.0)])
    legs = [bar, -bar]
    fine = plane_permeance(1.0, legs, 480)
    assert plane_permeance(1e-3, [1e-3 * leg for leg in legs], 480) == pytest.approx(fine, rel=1e-9)
    coarse = [abs(plane_permeance(1.0, legs, panels) - fine) for panels in (60, 120, 240)]
    assert coarse == sorted(coarse, reverse=True)
    assert coarse[2] < 5e-4 * fine


def test_two_facing_bars_are_less_than_the_ring_that_holds_them() -> None:
    """More conductor can only raise the permeance (Dirichlet's principle)."""
    bars = [np.array([(2.0, -1.0), (2.4, -1.0), (2.4, 1.0), (2.0, 1.0)])]
    bars.append(-bars[0])
    assert plane_permeance(1.0, bars) < plane_permeance(1.0, [circle(2.0)])
    assert plane_permeance(1.0, bars[:1]) < plane_permeance(1.0, bars)
