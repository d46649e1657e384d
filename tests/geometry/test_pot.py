from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.design import meshed_section, whole_section
from femag.geometry import is_mirror_symmetric, region_areas, singular_corners, upper_half


def test_areas_of_the_named_parts_follow_from_the_drawing(pot_26_16: fm.Design) -> None:
    areas = {name: 1e6 * area for name, area in region_areas(whole_section(pot_26_16)).items()}
    half_window, gap = 5.5, 0.25
    assert areas["upper post"] == pytest.approx((5.75 - 2.75) * (half_window - gap))
    assert areas["post gap"] == pytest.approx((5.75 - 2.75) * 2 * gap)
    assert areas["ring"] == pytest.approx((12.75 - 10.6) * 11.0)
    assert areas["upper plate"] == pytest.approx((12.75 - 2.75) * 2.55)
    assert areas["winding main"] == pytest.approx(3.6 * 9.6)
    assert areas["window"] == pytest.approx((10.6 - 5.75) * 11.0 - 3.6 * 9.6)


def test_a_spacer_adds_to_the_height_and_opens_every_leg(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, gaps=(fm.Gap(0.4e-3, "all"), fm.Gap(0.5e-3)))
    areas = region_areas(whole_section(design))
    assert areas["post gap"] == pytest.approx(3.0e-3 * 0.9e-3)
    assert areas["ring gap"] == pytest.approx(2.15e-3 * 0.4e-3)
    assert 2 * areas["upper post"] == pytest.approx(3.0e-3 * (11.0 - 0.5) * 1e-3)
    assert 2 * areas["upper ring"] == pytest.approx(2.15e-3 * 11.0e-3)


def test_half_section_has_half_the_area_of_every_part(pot_26_16: fm.Design) -> None:
    section = whole_section(pot_26_16)
    assert is_mirror_symmetric(section)
    half = upper_half(section)
    assert half.copies == 2
    whole_areas, half_areas = region_areas(section), region_areas(half)
    for name in ("winding main", "window", "post gap", "ring", "surroundings"):
        assert half_areas[name] == pytest.approx(whole_areas[name] / 2)
    assert half_areas["upper plate"] == pytest.approx(whole_areas["upper plate"])
    assert "lower plate" not in half_areas


def test_a_winding_off_the_middle_needs_the_whole_section(pot_26_16: fm.Design) -> None:
    block = fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.0e-3)
    design = replace(pot_26_16, windings=(fm.Winding(50, block),))
    assert meshed_section(design).copies == 1


def test_unequal_windings_in_mirror_places_need_the_whole_section(pot_26_16: fm.Design) -> None:
    upper, lower = (
        fm.Block(6.4e-3, 10e-3, 0.5e-3, 4.8e-3),
        fm.Block(6.4e-3, 10e-3, -4.8e-3, -0.5e-3),
    )
    windings = (fm.Winding(50, upper, "one"), fm.Winding(50, lower, "two"))
    assert meshed_section(replace(pot_26_16, windings=windings)).copies == 1


def test_a_winding_without_a_block_fills_the_window(pot_26_16: fm.Design) -> None:
    areas = region_areas(whole_section(replace(pot_26_16, windings=(fm.Winding(50),))))
    assert areas["winding main"] == pytest.approx(4.85e-3 * 11e-3)
    assert areas["window"] == pytest.approx(0.0, abs=1e-15)


def test_the_section_names_every_part_with_its_area(pot_26_16: fm.Design) -> None:
    text = repr(whole_section(pot_26_16))
    assert "winding main" in text
    assert "34.5600" in text


DIMENSIONS = {
    "outer_diameter": 25.5e-3,
    "window_diameter": 21.2e-3,
    "post_diameter": 11.5e-3,
    "hole_diameter": 5.5e-3,
    "height": 16.1e-3,
    "window_height": 11.0e-3,
}


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"post_diameter": 22e-3}, "core.dimensions.post_diameter"),
        ({"hole_diameter": 12e-3}, "core.dimensions.hole_diameter"),
        ({"hole_diameter": -1e-3}, "core.dimensions.hole_diameter"),
        ({"window_diameter": 26e-3}, "core.dimensions.window_diameter"),
        ({"window_height": 17e-3}, "core.dimensions.window_height"),
        ({"height": 0.0}, "core.dimensions.height"),
        ({"outer_diameter": np.nan}, "core.dimensions.outer_diameter"),
    ],
)
def test_impossible_dimensions_are_refused(change: dict[str, float], key: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        fm.PotCore(**(DIMENSIONS | change))
    assert caught.value.key == key


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"gaps": (fm.Gap(11e-3),)}, "gap.length"),
        ({"gaps": (fm.Gap(1e-3), fm.Gap(2e-3))}, "gap"),
        (
            {"windings": (fm.Winding(9, fm.Block(5e-3, 9e-3, 0, 1e-3)),)},
            "winding.block.inner_radius",
        ),
        (
            {"windings": (fm.Winding(9, fm.Block(7e-3, 11e-3, 0, 1e-3)),)},
            "winding.block.outer_radius",
        ),
        ({"windings": (fm.Winding(9, fm.Block(7e-3, 9e-3, 0, 6e-3)),)}, "winding.block.top"),
        ({"windings": (fm.Winding(9, fm.Block(7e-3, 9e-3, -6e-3, 0)),)}, "winding.block.bottom"),
        (
            {
                "windings": (
                    fm.Winding(9, fm.Block(7e-3, 9e-3, -2e-3, 1e-3), "one"),
                    fm.Winding(9, fm.Block(8e-3, 10e-3, 0, 2e-3), "two"),
                )
            },
            "winding two",
        ),
        ({"windings": (fm.Winding(9, name="a"), fm.Winding(9, name="a"))}, "winding.name"),
        ({"windings": ()}, "winding"),
        ({"driven": ("other",)}, "drive.winding"),
        ({"current": 0.0}, "drive.current"),
        ({"current": np.inf}, "drive.current"),
        ({"tolerance": 0.0}, "solve.tolerance"),
        ({"tolerance": 1.0}, "solve.tolerance"),
    ],
)
def test_parts_that_do_not_fit_are_refused(
    pot_26_16: fm.Design, change: dict[str, object], key: str
) -> None:
    with pytest.raises(fm.InputError) as caught:
        replace(pot_26_16, **change)
    assert caught.value.key == key
    assert caught.value.accepted


@pytest.mark.parametrize("turns", [0, -3, 2.5, np.nan])
def test_turns_that_cannot_be_wound_are_refused(turns: float) -> None:
    with pytest.raises(fm.InputError, match="turns out of range"):
        fm.Winding(turns)


def test_singular_corners_are_those_of_the_core_outline(pot_26_16: fm.Design) -> None:
    expected = {(2.75, 0.25), (5.75, 0.25), (2.75, 8.05), (12.75, 8.05), (5.75, 5.5), (10.6, 5.5)}
    half = singular_corners(meshed_section(pot_26_16))
    assert {tuple(np.round(1e3 * point, 6)) for point in half} == expected
    whole = singular_corners(whole_section(pot_26_16))
    assert {tuple(np.round(1e3 * np.abs(point), 6)) for point in whole} == expected
    assert len(whole) == 2 * len(expected)


def test_a_solid_post_has_no_corner_on_the_axis(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, core=replace(pot_26_16.core, hole_diameter=0.0))
    assert np.all(singular_corners(meshed_section(design))[:, 0] > 0.0)


@pytest.mark.parametrize(
    ("make", "key"),
    [
        (lambda: fm.Gap("1 mm"), "gap.length"),
        (lambda: fm.Winding("36"), "winding.turns"),
        (lambda: fm.Winding(True), "winding.turns"),
        (lambda: fm.Winding(5, (1, 2, 3, 4)), "winding.block"),
        (lambda: fm.Winding(5, name=None), "winding.name"),
        (lambda: fm.Block("1", 2, 0, 1), "winding.block.inner_radius"),
        (lambda: fm.LinearCurve("2000"), "permeability"),
        (lambda: fm.FroehlichCurve(2000, "0.4 T"), "saturation"),
        (lambda: fm.PotCore(**(DIMENSIONS | {"height": "16 mm"})), "core.dimensions.height"),
    ],
)
def test_texts_in_place_of_numbers_are_refused(make, key: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        make()
    assert caught.value.key == key


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"current": "1 A"}, "drive.current"),
        ({"tolerance": None}, "solve.tolerance"),
        ({"core": None}, "core"),
        ({"material": 2000}, "core.material"),
    ],
)
def test_a_design_of_the_wrong_things_is_refused(
    pot_26_16: fm.Design, change: dict[str, object], key: str
) -> None:
    with pytest.raises(fm.InputError) as caught:
        replace(pot_26_16, **change)
    assert caught.value.key == key


def test_one_gap_winding_or_name_may_stand_for_a_list_of_one(pot_26_16: fm.Design) -> None:
    single = replace(pot_26_16, gaps=fm.Gap(0.5e-3), windings=fm.Winding(50), driven="main")
    assert (single.gaps, single.driven) == ((fm.Gap(0.5e-3),), ("main",))
    assert single.windings == (fm.Winding(50),)
