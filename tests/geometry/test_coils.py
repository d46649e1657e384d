"""Windings over each other and in sections, against counts and sums by hand."""

import re
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from femag.errors import InputError
from femag.geometry import (
    Block,
    Coil,
    Conductor,
    Foil,
    Former,
    LitzWire,
    RoundWire,
    Winding,
    coil_regions,
    laid_coils,
    polygon_area,
)
from femag.geometry.coils import turns_of_sections
from femag.geometry.conductors import as_laid

MM = 1e-3
WINDOW = Block(5.0 * MM, 12.0 * MM, -6.0 * MM, 6.0 * MM)
FORMER = Former(wall=1.0 * MM, flange=1.0 * MM)
CONDUCTORS = (
    RoundWire(0.5 * MM),
    RoundWire(0.4 * MM, 0.03 * MM),
    LitzWire(40, 0.05 * MM, insulation=0.02 * MM),
    Foil(0.1 * MM),
    Foil(0.08 * MM, width=2.0 * MM, insulation=0.02 * MM),
)


def blocks(coil: Coil) -> list[tuple[float, ...]]:
    """Return inner radius, outer radius, bottom and top of each section in mm."""
    return [
        tuple(round(side / MM, 9) for side in vars(section.block).values())
        for section in coil.sections
    ]


def shown_missing(error: InputError) -> float:
    (length,) = re.findall(r"by ([\d.e-]+) mm", str(error))
    return float(length) * MM


def refusal(windings: tuple[Winding, ...], window: Block) -> InputError | None:
    try:
        laid_coils(windings, window)
    except InputError as error:
        return error
    return None


@pytest.mark.parametrize(
    ("turns", "sections", "shares"),
    [
        (12, 1, (12,)),
        (12, 3, (4, 4, 4)),
        (13, 3, (4, 5, 4)),
        (14, 3, (5, 4, 5)),
        (10, 4, (2, 3, 3, 2)),
        (23, 5, (4, 5, 5, 5, 4)),
        (7, 2, (4, 3)),
        (3, 3, (1, 1, 1)),
    ],
)
def test_turns_are_spread_as_by_hand(turns: int, sections: int, shares: tuple[int, ...]) -> None:
    assert turns_of_sections(turns, sections) == shares


def test_shares_are_even_and_symmetric_wherever_that_can_be() -> None:
    for turns in range(1, 40):
        for sections in range(1, turns + 1):
            shares = turns_of_sections(turns, sections)
            assert sum(shares) == turns
            assert len(shares) == sections
            assert max(shares) - min(shares) <= 1
            can_be_symmetric = sections % 2 == 1 or turns % 2 == 0
            assert (shares == shares[::-1]) == can_be_symmetric


def test_windings_lie_over_each_other_with_tape_in_between() -> None:
    wire = RoundWire(1.0 * MM)
    windings = (
        Winding(15, name="a", conductor=wire, former=FORMER),
        Winding(4, name="b", conductor=wire, former=replace(FORMER, tape=0.2 * MM)),
        Winding(3, name="c", conductor=Foil(0.1 * MM)),
    )
    # 10 mm high: two layers of 1 mm on the wall at 6 mm, the third taped at 8.2 mm, foil at 9.2.
    a, b, c = laid_coils(windings, WINDOW)
    assert blocks(a) == [(6.0, 8.0, -5.0, 5.0)]
    assert blocks(b) == [(8.2, 9.2, -2.0, 2.0)]
    assert blocks(c) == [(9.2, 9.5, -5.0, 5.0)]
    assert b.wire_length == pytest.approx(4 * 2 * np.pi * 8.7 * MM)


def test_a_winding_on_the_former_takes_no_account_of_blocks() -> None:
    wire = RoundWire(1.0 * MM)
    outside = Winding(5, Block(10 * MM, 12 * MM, -6 * MM, 6 * MM), "block")
    on_former = Winding(5, name="b", conductor=wire, former=FORMER)
    for windings in ((outside, on_former), (on_former, outside)):
        coils = {coil.winding.name: coil for coil in laid_coils(windings, WINDOW)}
        assert blocks(coils["b"]) == [(6.0, 7.0, -2.5, 2.5)]
    with pytest.raises(InputError, match="overlaps winding block") as caught:
        laid_coils((outside, replace(on_former, turns=50)), WINDOW)
    assert caught.value.key == "winding b"


def test_the_order_in_the_file_is_the_order_outwards() -> None:
    thin, thick = (
        Winding(10, name=name, conductor=RoundWire(size * MM), former=FORMER)
        for name, size in (("thin", 0.5), ("thick", 1.0))
    )
    for windings in ((thin, thick), (thick, thin)):
        inner, outer = laid_coils(windings, WINDOW)
        assert inner.winding == windings[0]
        assert inner.sections[0].block.outer_radius == outer.sections[0].block.inner_radius


@pytest.mark.parametrize("seed", range(12))
def test_windings_fit_once_the_missing_depth_is_added_and_not_before(seed: int) -> None:
    random = np.random.default_rng(seed)
    windings = tuple(
        Winding(
            int(random.integers(200, 600)),
            name=f"{index}",
            conductor=RoundWire(random.uniform(0.2, 0.6) * MM, random.uniform(0, 0.03) * MM),
            former=Former(0.5 * MM, 0.5 * MM, tape=0.0 if index == 0 else 0.05 * MM),
            sections=int(random.integers(1, 5)),
        )
        for index in range(3)
    )
    window, short = WINDOW, []
    while (error := refusal(windings, window)) is not None:
        short.append(error.key)
        missing = shown_missing(error)
        less = replace(window, outer_radius=window.outer_radius + 0.999 * missing - 2e-7)
        still = refusal(windings, less)
        assert still is not None
        assert still.key == error.key
        window = replace(window, outer_radius=window.outer_radius + missing)
    assert [part.winding for part in laid_coils(windings, window)] == list(windings)
    places = ["winding.turns", "winding.1.turns", "winding.2.turns"]
    assert short == places[places.index(short[0]) :]


@pytest.mark.parametrize("sections", [1, 2, 3])
def test_chambers_that_are_too_low_say_by_how_much(sections: int) -> None:
    window = replace(WINDOW, top=WINDOW.bottom + 2.0 * MM)
    winding = Winding(
        6, conductor=RoundWire(3.0 * MM), sections=sections,
        divider=0.1 * MM if sections > 1 else 0.0,
    )  # fmt: skip
    window = replace(window, outer_radius=WINDOW.inner_radius + 20 * MM)
    with pytest.raises(InputError, match="too wide for the height") as caught:
        laid_coils((winding,), window)
    missing = sections * shown_missing(caught.value)
    (coil,) = laid_coils((winding,), replace(window, top=window.top + missing))
    assert all(layers.turns_in_layers == (1,) * (6 // sections) for layers in coil.layers)
    with pytest.raises(InputError, match="too wide for the height"):
        laid_coils((winding,), replace(window, top=window.top + missing - 1e-6))


def test_sections_lie_between_dividers() -> None:
    winding = Winding(13, conductor=RoundWire(1 * MM), former=FORMER, sections=3, divider=0.5 * MM)
    # (10 - 2 x 0.5)/3 = 3 mm of height each: three turns in a layer, and 4, 5, 4 turns.
    (coil,) = laid_coils((winding,), WINDOW)
    assert [layers.turns_in_layers for layers in coil.layers] == [(3, 1), (3, 2), (3, 1)]
    assert blocks(coil) == [(6, 8, -5, -2), (6, 8, -1.5, 1.5), (6, 8, 2, 5)]
    assert coil.fill_of_room == pytest.approx(13 * np.pi / 4 / (3 * 3 * 6))
    # Layers at 6.5 and 7.5 mm.
    assert coil.wire_length == pytest.approx(2 * np.pi * (9 * 6.5 + 4 * 7.5) * MM)


def test_a_bare_block_is_divided_as_well() -> None:
    winding = Winding(10, Block(6 * MM, 8 * MM, -1 * MM, 4 * MM), sections=2, divider=1 * MM)
    (coil,) = laid_coils((winding,), WINDOW)
    assert blocks(coil) == [(6, 8, -1, 1), (6, 8, 2, 4)]
    assert [section.turns for section in coil.sections] == [5, 5]
    assert coil.layers == ()
    (whole,) = laid_coils((Winding(4, sections=4),), WINDOW)
    assert blocks(whole) == [(5, 12, low, low + 3) for low in (-6, -3, 0, 3)]


@pytest.mark.parametrize("sections", [1, 2, 5])
@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_regions_hold_all_turns_and_all_of_their_area(conductor: Conductor, sections: int) -> None:
    former = replace(FORMER, flange=0.5 * MM)
    winding = Winding(23, conductor=conductor, former=former, sections=sections)
    (coil,) = laid_coils((winding,), WINDOW)
    by_turn, by_block = coil_regions(coil, "turn"), coil_regions(coil, "block")
    assert len(by_turn) == 23
    assert len({region.name for region in by_turn}) == 23
    assert len(by_block) == sections
    for regions in (by_turn, by_block):
        assert sum(region.turns for region in regions) == 23
        assert {region.winding for region in regions} == {"main"}
    laid = as_laid(conductor, coil.layers[0].conductor.axial_size)
    metal = laid.copper_area
    if isinstance(laid, LitzWire):
        metal = np.pi / 4 * (laid.radial_size - 0.04 * MM) ** 2
    areas = np.array([polygon_area(region.polygon) for region in by_turn])
    assert areas == pytest.approx(metal, rel=1e-9)
    room = 23 * laid.radial_size * laid.axial_size
    assert sum(polygon_area(region.polygon) for region in by_block) == pytest.approx(room)
    for region in by_turn:
        centre = np.mean(region.polygon, axis=0)
        inside = [
            s.block.inner_radius < centre[0] < s.block.outer_radius
            and s.block.bottom < centre[1] < s.block.top
            for s in coil.sections
        ]
        assert sum(inside) == 1


def test_names_of_parts_count_from_the_lowest_upwards() -> None:
    winding = Winding(4, name="one", conductor=RoundWire(1 * MM), sections=2)
    (coil,) = laid_coils((winding,), WINDOW)
    names = [f"winding one, turn {number}" for number in (1, 2, 3, 4)]
    regions = coil_regions(coil, "turn")
    assert [region.name for region in regions] == names
    heights = [np.mean(region.polygon, axis=0)[1] for region in regions]
    assert heights == sorted(heights)
    sections = [region.name for region in coil_regions(coil, "block")]
    assert sections == ["winding one, section 1", "winding one, section 2"]
    (single,) = laid_coils((replace(winding, sections=1),), WINDOW)
    assert [region.name for region in coil_regions(single, "block")] == ["winding one"]


@pytest.mark.parametrize(
    ("make", "key", "problem"),
    [
        (lambda: Winding(5, sections=0), "winding.sections", "sections out of range"),
        (lambda: Winding(5, sections=1.5), "winding.sections", "sections out of range"),
        (lambda: Winding(500, sections=101), "winding.sections", "sections out of range"),
        (lambda: Winding(5, sections="2"), "winding.sections", "not a number"),
        (lambda: Winding(5, sections=6), "winding.sections", "more sections than turns"),
        (lambda: Winding(5, sections=2, divider=-1e-3), "winding.divider", "out of range"),
        (lambda: Winding(5, sections=2, divider=float("nan")), "winding.divider", "out of range"),
        (lambda: Winding(5, divider=1e-3), "winding.divider", "a divider needs sections"),
        (
            lambda: laid_coils((Winding(5, sections=3, divider=6.1 * MM),), WINDOW),
            "winding.divider",
            "the dividers leave no room axially: more than 0.2 mm missing",
        ),
        (
            lambda: laid_coils(
                (Winding(5, conductor=RoundWire(1e-3), former=Former(tape=1e-3)),), WINDOW
            ),
            "winding.former.tape",
            "no winding lies below this one",
        ),
        (
            lambda: laid_coils(
                (
                    Winding(5, conductor=RoundWire(1e-3)),
                    Winding(5, name="b", conductor=RoundWire(1e-3), former=Former(flange=7e-3)),
                ),
                WINDOW,
            ),
            "winding.1.former",
            "the former leaves no room axially: more than 2 mm missing",
        ),
        (
            lambda: laid_coils(
                (Winding(5, Block(4 * MM, 9 * MM, 0.0, MM), conductor=RoundWire(1e-3)),), WINDOW
            ),
            "winding.block.inner_radius",
            "the winding reaches into the post",
        ),
    ],
)
def test_bad_windings_are_one_line_with_a_key(
    make: Callable[[], object], key: str, problem: str
) -> None:
    with pytest.raises(InputError) as caught:
        make()
    assert caught.value.key == key
    assert problem in str(caught.value)
    assert caught.value.accepted
    assert "\n" not in str(caught.value)
