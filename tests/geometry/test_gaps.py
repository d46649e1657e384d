from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.design import meshed_section, whole_section
from femag.design_file import design_from_toml
from femag.geometry import core_cuts, gap_length, gap_permeabilities, region_areas
from femag.geometry.gaps import post_pieces

HALF = 5.5e-3
"""Half the window height of the pot core 26/16, m."""


def with_gaps(design: fm.Design, *gaps: fm.Gap) -> fm.Design:
    return replace(design, gaps=gaps)


def post_parts(design: fm.Design) -> dict[str, tuple[float, float]]:
    """Bottom and top in mm of every region of the post, from below."""
    parts = {
        region.name: tuple(np.round([1e3 * region.polygon[i][1] for i in (0, 2)], 9))
        for region in whole_section(design).regions
        if "post" in region.name
    }
    return dict(sorted(parts.items(), key=lambda part: part[1]))


def test_pieces_lie_in_the_middle_of_equal_shares_of_the_post(pot_26_16: fm.Design) -> None:
    parts = post_parts(with_gaps(pot_26_16, fm.Gap(0.4e-3, pieces=2)))
    assert parts == {
        "post 1": (-5.5, -2.85),
        "post gap 1": (-2.85, -2.65),
        "post 2": (-2.65, 2.65),
        "post gap 2": (2.65, 2.85),
        "post 3": (2.85, 5.5),
    }


@pytest.mark.parametrize("pieces", [1, 2, 3, 8, 100])
@pytest.mark.parametrize("offset", [0.0, 1e-5])
def test_the_length_is_the_total_whatever_the_pieces(
    pot_26_16: fm.Design, pieces: int, offset: float
) -> None:
    design = with_gaps(pot_26_16, fm.Gap(0.5e-3, pieces=pieces, offset=offset))
    areas = region_areas(whole_section(design))
    gaps = [area for name, area in areas.items() if name.startswith("post gap")]
    parts = [area for name, area in areas.items() if "post" in name and "gap" not in name]
    assert (len(gaps), len(parts)) == (pieces, pieces + 1)
    np.testing.assert_allclose(gaps, 3e-3 * 0.5e-3 / pieces, rtol=1e-9)
    assert sum(parts) == pytest.approx(3e-3 * 10.5e-3)
    assert gap_length(design.gaps, "post") == 0.5e-3


def test_pitch_and_offset_place_the_pieces(pot_26_16: fm.Design) -> None:
    gap = fm.Gap(0.6e-3, pieces=3, pitch=1e-3, offset=2e-3)
    parts = post_parts(with_gaps(pot_26_16, gap))
    assert [parts[f"post gap {place}"] for place in (1, 2, 3)] == [
        (0.9, 1.1),
        (1.9, 2.1),
        (2.9, 3.1),
    ]


def test_one_gap_keeps_its_names_wherever_it_lies(pot_26_16: fm.Design) -> None:
    for offset in (0.0, 1e-3, -3e-3):
        parts = post_parts(with_gaps(pot_26_16, fm.Gap(0.5e-3, offset=offset)))
        assert list(parts) == ["lower post", "post gap", "upper post"]


def test_a_gap_at_a_plate_leaves_no_core_there(pot_26_16: fm.Design) -> None:
    above = with_gaps(pot_26_16, fm.Gap(0.5e-3, offset=5.25e-3))
    assert post_parts(above) == {"lower post": (-5.5, 5.0), "post gap": (5.0, 5.5)}
    both = with_gaps(pot_26_16, fm.Gap(0.5e-3, pieces=2, pitch=10.75e-3))
    assert post_parts(both) == {
        "post gap 1": (-5.5, -5.25),
        "post 1": (-5.25, 5.25),
        "post gap 2": (5.25, 5.5),
    }


@pytest.mark.parametrize("length", [0.1e-3, 0.3e-3, 0.7e-3, 1e-3 / 3])
def test_a_gap_reaches_the_plate_exactly_in_spite_of_rounding(
    pot_26_16: fm.Design, length: float
) -> None:
    (piece,) = post_pieces((fm.Gap(length, offset=HALF - length / 2),), 2 * HALF)
    assert piece.top == HALF
    (piece,) = post_pieces((fm.Gap(length, offset=length / 2 - HALF),), 2 * HALF)
    assert piece.bottom == -HALF


@pytest.mark.parametrize("pieces", [1, 2, 3, 4, 7, 100])
def test_a_centred_stack_is_solved_on_its_upper_half(pot_26_16: fm.Design, pieces: int) -> None:
    stack = fm.Gap(0.5e-3, pieces=pieces)
    assert meshed_section(with_gaps(pot_26_16, stack)).copies == 2
    moved = replace(stack, offset=1e-5)
    assert meshed_section(with_gaps(pot_26_16, moved)).copies == 1


def test_a_spacer_and_a_gap_in_the_middle_are_one_gap(pot_26_16: fm.Design) -> None:
    parts = post_parts(with_gaps(pot_26_16, fm.Gap(0.5e-3), fm.Gap(0.4e-3, "all")))
    assert parts["post gap"] == (-0.45, 0.45)


def test_a_spacer_and_a_gap_elsewhere_are_two(pot_26_16: fm.Design) -> None:
    design = with_gaps(pot_26_16, fm.Gap(0.4e-3, "all"), fm.Gap(0.5e-3, offset=-2e-3))
    parts = post_parts(design)
    assert parts["post gap 1"] == (-2.25, -1.75)
    assert parts["post gap 2"] == (-0.2, 0.2)
    assert parts["post 3"] == (0.2, 5.7)
    spread = post_parts(with_gaps(pot_26_16, fm.Gap(0.4e-3, "all"), fm.Gap(0.5e-3, pieces=2)))
    assert [spread[f"post gap {place}"] for place in (1, 2, 3)] == [
        (-2.975, -2.725),
        (-0.2, 0.2),
        (2.725, 2.975),
    ]


def test_permeability_goes_to_every_opening_of_its_gap(pot_26_16: fm.Design) -> None:
    def found(*gaps: fm.Gap) -> dict[str, float]:
        return dict(gap_permeabilities(pot_26_16.core, gaps))

    spacer = fm.Gap(0.4e-3, "all", permeability=3.0)
    assert found(spacer) == {"post gap": 3.0, "ring gap": 3.0}
    assert found(fm.Gap(0.5e-3, pieces=2)) == {"post gap 1": 1.0, "post gap 2": 1.0}
    assert found(spacer, fm.Gap(0.5e-3, offset=2e-3)) == {
        "post gap 1": 3.0,
        "post gap 2": 1.0,
        "ring gap": 3.0,
    }
    assert found(spacer, fm.Gap(0.5e-3, permeability=3.0)) == {"post gap": 3.0, "ring gap": 3.0}
    assert found() == {}


@pytest.mark.parametrize(
    ("gaps", "face"),
    [
        ((), 0.0),
        ((fm.Gap(0.5e-3),), 0.25),
        ((fm.Gap(0.5e-3, pieces=2),), 2.875),
        ((fm.Gap(0.5e-3, offset=2e-3),), 2.25),
        ((fm.Gap(0.5e-3, offset=-2e-3),), -2.25),
        ((fm.Gap(0.5e-3, offset=5.25e-3),), 5.0),
        ((fm.Gap(0.5e-3, offset=-5.25e-3),), -5.0),
        ((fm.Gap(0.5e-3, pieces=2, pitch=10.75e-3),), 5.25),
    ],
    ids=str,
)
def test_the_cut_at_the_gap_lies_at_its_outermost_face_inside_the_post(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...], face: float
) -> None:
    cut = core_cuts(pot_26_16.core, gaps)[0]
    assert cut.name == "post, at the gap"
    assert (1e3 * cut.start[1], 1e3 * cut.end[1]) == pytest.approx((face, face))
    mirror = 1.0 if gaps and gaps[0].offset else -1.0
    assert 1e3 * cut.mirrored().start[1] == pytest.approx(mirror * face)


@pytest.mark.parametrize(
    ("make", "key"),
    [
        (lambda: fm.Gap(1e-3, pieces=0), "gap.pieces"),
        (lambda: fm.Gap(1e-3, pieces=101), "gap.pieces"),
        (lambda: fm.Gap(1e-3, pieces=1.5), "gap.pieces"),
        (lambda: fm.Gap(1e-3, pieces=np.nan), "gap.pieces"),
        (lambda: fm.Gap(1e-3, pieces="2"), "gap.pieces"),
        (lambda: fm.Gap(1e-3, pieces=True), "gap.pieces"),
        (lambda: fm.Gap(1e-3, pieces=2, pitch=0.0), "gap.pitch"),
        (lambda: fm.Gap(1e-3, pieces=2, pitch=-1e-3), "gap.pitch"),
        (lambda: fm.Gap(1e-3, pieces=2, pitch="2 mm"), "gap.pitch"),
        (lambda: fm.Gap(1e-3, pitch=2e-3), "gap.pitch"),
        (lambda: fm.Gap(1e-3, offset=np.inf), "gap.offset"),
        (lambda: fm.Gap(1e-3, offset=None), "gap.offset"),
        (lambda: fm.Gap(1e-3, permeability=0.5), "gap.permeability"),
        (lambda: fm.Gap(1e-3, permeability=np.nan), "gap.permeability"),
        (lambda: fm.Gap(1e-3, permeability=2e6), "gap.permeability"),
        (lambda: fm.Gap(1e-3, permeability="air"), "gap.permeability"),
        (lambda: fm.Gap(1e-3, "all", pieces=2), "gap.pieces"),
        (lambda: fm.Gap(1e-3, "all", pieces=2, pitch=2e-3), "gap.pieces"),
        (lambda: fm.Gap(1e-3, "all", offset=1e-3), "gap.offset"),
    ],
)
def test_gaps_that_make_no_sense_are_refused(make: Callable[[], fm.Gap], key: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        make()
    assert caught.value.key == key
    assert caught.value.accepted


@pytest.mark.parametrize(
    ("gaps", "key", "problem"),
    [
        ((fm.Gap(12e-3, pieces=4),), "gap.length", "longer than the post"),
        ((fm.Gap(2e-3, pieces=2, pitch=0.9e-3),), "gap.pitch", "touch or overlap"),
        ((fm.Gap(2e-3, pieces=2, pitch=1e-3),), "gap.pitch", "touch or overlap"),
        ((fm.Gap(2e-3, pieces=2, pitch=10.1e-3),), "gap.pitch", "leave the post"),
        ((fm.Gap(2e-3, offset=4.6e-3),), "gap.offset", "leaves the post"),
        ((fm.Gap(2e-3, offset=-4.6e-3),), "gap.offset", "leaves the post"),
        ((fm.Gap(2e-3, pieces=2, offset=2.3e-3),), "gap.offset", "leaves the post"),
        ((fm.Gap(1e-3, "all"), fm.Gap(1e-3, offset=1e-3)), "gap.1.offset", "spacer"),
        ((fm.Gap(1e-3, "all"), fm.Gap(1e-3, offset=0.5e-3)), "gap.1.offset", "spacer"),
        ((fm.Gap(1e-3, pieces=3), fm.Gap(1e-3, "all")), "gap.pieces", "spacer"),
        ((fm.Gap(1e-3, permeability=2.0), fm.Gap(1e-3, "all")), "gap.permeability", "one gap"),
    ],
)
def test_gaps_that_do_not_fit_are_refused(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...], key: str, problem: str
) -> None:
    with pytest.raises(fm.InputError, match=problem) as caught:
        with_gaps(pot_26_16, *gaps)
    assert caught.value.key == key
    assert caught.value.accepted
    assert "\n" not in str(caught.value)


ALL_KEYS = """
[[gap]]
length = "0.6 mm"
pieces = 3
pitch = "1 mm"
offset = "-2 mm"
permeability = 5
"""


def file_with(design: fm.Design, tables: str) -> str:
    return fm.design_toml(with_gaps(design)).replace("gap = []\n", "") + tables


def test_every_key_of_a_gap_is_read_and_written(pot_26_16: fm.Design) -> None:
    gap = fm.Gap(0.6e-3, pieces=3, pitch=1e-3, offset=-2e-3, permeability=5.0)
    design = with_gaps(pot_26_16, gap)
    assert design_from_toml(file_with(pot_26_16, ALL_KEYS)) == design
    assert design_from_toml(fm.design_toml(design)) == design


def test_only_what_differs_from_the_default_is_written(pot_26_16: fm.Design) -> None:
    plain = fm.design_toml(with_gaps(pot_26_16, fm.Gap(0.5e-3, offset=-0.0)))
    for key in ("pieces", "pitch", "offset"):
        assert f"{key} =" not in plain
    assert plain.count("permeability") == 1


@pytest.mark.parametrize(
    ("good", "bad", "line"),
    [
        ("pieces = 3", "pieces = 0", "gap.pieces = 0: number of pieces out of range"),
        ("pieces = 3", "pieces = 2.5", "gap.pieces = 2.5: not usable; accepted: a whole number"),
        ('"1 mm"', '"0.1 mm"', "gap.pitch = '0.1 mm': the pieces of the gap touch or overlap"),
        ('"1 mm"', "1", "gap.pitch = 1: the unit is missing"),
        ('"-2 mm"', '"-6 mm"', "gap.offset = '-6 mm': the gap leaves the post"),
        ("= 5", "= 0", "gap.permeability = 0: relative permeability out of range"),
        ("= 5", "= '5'", "gap.permeability = '5': not usable; accepted: relative permeability"),
        ("pitch", "pich", "gap.pich: unknown key; accepted: nearest known key: 'pitch'"),
    ],
)
def test_bad_gap_keys_get_one_line(pot_26_16: fm.Design, good: str, bad: str, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(file_with(pot_26_16, ALL_KEYS.replace(good, bad, 1)))
    assert str(caught.value).startswith(line)
