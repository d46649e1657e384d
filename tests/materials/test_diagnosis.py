import numpy as np
import pytest

import femag as fm
from femag.materials import TabulatedCurve, curve_through
from femag.materials.diagnosis import TOLERANCE
from femag.units import MU_0

H = np.array([10.0, 25.0, 50.0, 100.0, 250.0, 500.0, 1200.0])
B = np.array([0.031, 0.09, 0.18, 0.28, 0.38, 0.43, 0.49])
SHEET = TabulatedCurve(tuple(zip(H, B, strict=True)))


def branch(h: np.ndarray, coercive: float) -> np.ndarray:
    """One branch of an invented loop: a saturating curve shifted by the coercive field."""
    shifted = h + coercive
    return MU_0 * h + 0.45 * shifted / np.hypot(shifted, 80.0)


def refusal(h, b) -> str:
    with pytest.raises(fm.InputError) as caught:
        curve_through(h, b)
    assert caught.value.key == "points"
    assert caught.value.accepted
    assert "\n" not in str(caught.value)
    return str(caught.value)


def test_clean_points_are_taken_as_they_are() -> None:
    assert curve_through(H, B) == SHEET
    assert curve_through(np.append(0.0, H), np.append(0.0, B)) == SHEET


@pytest.mark.parametrize("seed", range(5))
def test_the_order_of_the_rows_does_not_matter(seed: int) -> None:
    order = np.random.default_rng(seed).permutation(len(H))
    assert curve_through(H[order], B[order]) == SHEET


def test_a_treated_curve_read_again_stays_as_it_is() -> None:
    noisy = B + np.array([0.0, 0.0, 0.0, 0.0, 0.0, 0.061, 0.0])
    once = curve_through(H, noisy)
    h, b = np.array(once.points).T
    assert once.notes
    assert curve_through(h, b, notes=once.notes) == once


def test_points_of_the_third_quadrant_are_mirrored_and_said() -> None:
    curve = curve_through(-H, -B)
    assert curve.points == SHEET.points
    assert curve.notes == ("points of the third quadrant mirrored into the first: 7",)
    both = curve_through(np.append(H, -H), np.append(B, -B))
    assert both.points == SHEET.points
    assert "values of H that occur more than once, B averaged: 7" in both.notes
    assert "mirrored" in both.label


def test_quadrants_that_differ_are_refused() -> None:
    message = refusal(np.append(H, -H), np.append(B + 0.02, -B + 0.02))
    assert "first and third quadrant alike: take off the offsets" in message


def test_close_duplicates_are_averaged_and_said() -> None:
    curve = curve_through(np.append(H, 100.0), np.append(B, 0.282))
    assert dict(curve.points)[100.0] == pytest.approx(0.281)
    assert curve.notes == ("values of H that occur more than once, B averaged: 1",)


def test_duplicates_that_differ_are_refused() -> None:
    message = refusal(np.append(H, 100.0), np.append(B, 0.30))
    assert "B differs at H = 100 A/m by more than 0.5 % of the largest B" in message


@pytest.mark.parametrize("dip", [0.0005, 0.002])
def test_a_small_dip_is_levelled_with_the_nearest_rising_points(dip: float) -> None:
    """Two neighbours out of order take their mean polarisation, the least-squares answer."""
    b = B.copy()
    b[5] = b[4] - dip
    curve = curve_through(H, b)
    j = np.array([b for _, b in curve.points[1:]]) - MU_0 * H
    mean = (b[4] + b[5] - MU_0 * (H[4] + H[5])) / 2.0
    assert j[4] == pytest.approx(mean)
    assert j[5] == pytest.approx(mean)
    np.testing.assert_allclose(np.delete(j, (4, 5)), np.delete(b - MU_0 * H, (4, 5)), rtol=1e-12)
    (note,) = curve.notes
    assert note.startswith("points moved so that B - mu0 H does not fall: 2, by at most 0.00")
    assert abs(b[4] - MU_0 * H[4] - mean) < TOLERANCE * 0.49


def test_a_large_dip_is_refused() -> None:
    b = B.copy()
    b[5] = 0.33
    assert "B falls near H = " in refusal(H, b)


def test_a_slope_under_that_of_air_is_levelled_or_refused() -> None:
    h = np.append(H, [2000.0, 3000.0])
    little = np.append(B, [0.4905, 0.4915])
    curve = curve_through(h, little)
    assert np.all(
        np.diff(np.array(curve.points)[:, 1])
        >= MU_0 * np.diff(np.array(curve.points)[:, 0]) * (1 - 1e-9)
    )
    assert "so that B - mu0 H does not fall" in curve.notes[0]
    far = np.append(H, [20_000.0, 30_000.0])
    assert "B rises more slowly than mu0 H near" in refusal(far, np.append(B, [0.495, 0.50]))


def test_a_whole_loop_is_refused_with_what_to_do() -> None:
    up, down = np.linspace(-500.0, 500.0, 81), np.linspace(500.0, -500.0, 81)
    h = np.concatenate([up, down])
    b = np.concatenate([branch(up, -20.0), branch(down, 20.0)])
    message = refusal(h, b)
    assert "loop with remanence" in message
    assert "normal curve" in message
    assert "'gapfield bench'" in message
    off_zero = h != 0.0
    assert "opposite sign, as on a loop" in refusal(h[off_zero], b[off_zero])


def test_a_loop_of_the_first_quadrant_is_told_by_its_rows() -> None:
    up, down = np.linspace(5.0, 500.0, 40), np.linspace(500.0, 5.0, 41)
    h = np.concatenate([up, down])
    b = np.concatenate([branch(up, -4.0), branch(down, 20.0)])
    assert "H rises and falls, and B" in refusal(h, b)
    order = np.random.default_rng(3).permutation(len(h))
    message = refusal(h[order], b[order])
    assert "whole loop" not in message


def test_an_offset_at_zero_field_is_dropped_and_said() -> None:
    curve = curve_through(np.append(0.0, H), np.append(0.001, B))
    assert curve.points == SHEET.points
    assert curve.notes == ("B of 0.001 T at H = 0 taken as 0",)


@pytest.mark.parametrize(
    ("h", "b", "words"),
    [
        (H[:2], B[:2], "too few points: 2"),
        ([0.0, 0.0, 10.0, 20.0], [0.0, 0.0, 0.1, 0.2], "too few points: 2"),
        (H, 1e4 * B, "B reaches 4.9e+03 T, which no material does; accepted: the units that the "),
        (H / 1e4, B, "the relative permeability reaches 2.9e+07, which no material has"),
        (H, 1e-4 * B, "B is below mu0 H throughout (relative permeability 0.29 at most)"),
        (H, np.where(H == 50.0, np.nan, B), "a point is not finite"),
    ],
)
def test_what_cannot_be_is_refused(h, b, words: str) -> None:
    assert words in refusal(h, b)
