import re
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from scipy.spatial.distance import pdist

import femag as fm
from femag.design import meshed_section
from femag.errors import InputError
from femag.geometry import (
    ALUMINIUM,
    COPPER,
    Block,
    Conductor,
    Foil,
    Former,
    Gap,
    LitzWire,
    Metal,
    RoundWire,
    dc_resistance,
    laid_turns,
    missing_room,
    polygon_area,
    resistivity,
    winding_room,
)
from femag.geometry.conductors import as_laid, current_outline

MM = 1e-3
ROOM = Block(6.4 * MM, 10 * MM, -4.8 * MM, 4.8 * MM)
CONDUCTORS = (
    RoundWire(0.5 * MM, 0.03 * MM),
    LitzWire(60, 0.1 * MM, insulation=0.03 * MM),
    LitzWire(60, 0.1 * MM, outer_diameter=1.1 * MM),
    Foil(0.1 * MM, insulation=0.05 * MM),
    Foil(0.1 * MM, width=8 * MM),
)


def scaled(value: Conductor | Block, factor: float) -> Conductor | Block:
    lengths = {
        name: None if length is None or name in ("strands", "packing") else factor * length
        for name, length in vars(value).items()
    }
    kept = {name: vars(value)[name] for name in ("strands", "packing") if name in lengths}
    return replace(value, **{**lengths, **kept})


def most_turns(conductor: Conductor, room: Block) -> int:
    with pytest.raises(InputError) as caught:
        laid_turns(100_000, conductor, room)
    (count,) = re.findall(r"at most (\d+) in this room", str(caught.value))
    return int(count)


def extent(room: Block) -> tuple[float, float]:
    return room.outer_radius - room.inner_radius, room.top - room.bottom


def shown_missing(error: InputError, cause: str) -> float:
    (length,) = re.findall(rf"{cause} by ([\d.e-]+) mm", str(error))
    return float(length) * MM


def test_conductor_sizes_follow_from_closed_forms() -> None:
    wire = RoundWire(0.5 * MM, 0.03 * MM)
    assert wire.copper_area == pytest.approx(np.pi * (0.25 * MM) ** 2)
    assert wire.radial_size == wire.axial_size == pytest.approx(0.56 * MM)
    foil = Foil(0.1 * MM, 8 * MM, 0.05 * MM)
    assert foil.copper_area == pytest.approx(0.8e-6)
    assert (foil.radial_size, foil.axial_size) == pytest.approx((0.15 * MM, 8 * MM))


def test_seven_strands_in_the_densest_bundle_are_three_strands_wide() -> None:
    # One strand in the middle and six round it: packing 7/9.
    litz = LitzWire(7, 0.2 * MM, packing=7 / 9, insulation=0.05 * MM)
    assert litz.radial_size == litz.axial_size == pytest.approx(0.7 * MM)
    assert litz.copper_area == pytest.approx(7 * np.pi * (0.1 * MM) ** 2)


def test_the_default_packing_agrees_with_the_trades_rule_for_the_bundle() -> None:
    # 1.28 sqrt(n) enamelled strands wide, 0.8 of each being metal; common practice, no source.
    enamelled = 0.1 * MM / np.sqrt(0.8)
    expected = 1.28 * np.sqrt(200) * enamelled
    assert LitzWire(200, 0.1 * MM).radial_size == pytest.approx(expected, rel=0.03)


def test_a_known_outer_diameter_replaces_the_packing() -> None:
    litz = LitzWire(60, 0.1 * MM, outer_diameter=1.1 * MM)
    assert litz.radial_size == litz.axial_size == 1.1 * MM
    assert litz.copper_area == LitzWire(60, 0.1 * MM).copper_area


def test_packing_without_insulation_is_the_fill_of_the_bundles_circle() -> None:
    litz = LitzWire(60, 0.1 * MM, packing=0.55)
    assert litz.copper_area / (np.pi / 4 * litz.radial_size**2) == pytest.approx(0.55)


def test_a_foil_without_a_width_gets_the_rooms() -> None:
    layers = laid_turns(10, Foil(0.1 * MM), ROOM)
    assert layers.conductor == Foil(0.1 * MM, width=9.6 * MM)
    with pytest.raises(InputError, match=r"conductor\.width: the width follows from the room"):
        _ = Foil(0.1 * MM).copper_area


@pytest.mark.parametrize(
    ("make", "key"),
    [
        (lambda: RoundWire(0.0), "conductor.round"),
        (lambda: RoundWire("0.3 mm"), "conductor.round"),
        (lambda: RoundWire(float("nan")), "conductor.round"),
        (lambda: RoundWire(3.0), "conductor.round"),
        (lambda: RoundWire(0.3 * MM, -1e-6), "conductor.insulation"),
        (lambda: LitzWire(1, 0.1 * MM), "conductor.litz.strands"),
        (lambda: LitzWire(2.5, 0.1 * MM), "conductor.litz.strands"),
        (lambda: LitzWire(float("inf"), 0.1 * MM), "conductor.litz.strands"),
        (lambda: LitzWire(60, -0.1 * MM), "conductor.litz.strand"),
        (lambda: LitzWire(60, 0.1 * MM, packing=0.95), "conductor.litz.packing"),
        (lambda: LitzWire(60, 0.1 * MM, packing=0.0), "conductor.litz.packing"),
        (lambda: LitzWire(60, 0.1 * MM, outer_diameter=0.8 * MM), "conductor.litz.outer_diameter"),
        (lambda: LitzWire(60, 0.1 * MM, 0.5, 0.0, 1.1 * MM), "conductor.litz.outer_diameter"),
        (lambda: Foil(0.0), "conductor.foil"),
        (lambda: Foil(0.1 * MM, 0.0), "conductor.width"),
        (lambda: Foil(0.1 * MM, insulation=True), "conductor.insulation"),
        (lambda: Metal("none", 0.0, 0.004), "conductor.metal.resistivity"),
        (lambda: Metal("odd", 1e-8, 0.01), "conductor.metal.temperature_coefficient"),
        (lambda: resistivity(COPPER, 400.0), "conductor.temperature"),
        (lambda: resistivity(COPPER, "hot"), "conductor.temperature"),
        (lambda: resistivity("copper", 20.0), "conductor.metal"),
        (lambda: Former(wall=-1e-3), "former.wall"),
        (lambda: Former(gap_clearance=float("inf")), "former.gap_clearance"),
        (lambda: laid_turns(0, RoundWire(0.5 * MM), ROOM), "winding.turns"),
        (lambda: laid_turns(2.5, RoundWire(0.5 * MM), ROOM), "winding.turns"),
        (lambda: laid_turns(5, 0.5 * MM, ROOM), "conductor"),
        (lambda: laid_turns(5, RoundWire(0.5 * MM), (6e-3, 1e-2)), "room"),
        (lambda: laid_turns(5, RoundWire(0.5 * MM), replace(ROOM, inner_radius=-1.0)), "room"),
        (lambda: laid_turns(5, RoundWire(0.5 * MM), replace(ROOM, top=float("inf"))), "room"),
    ],
)
def test_bad_input_is_one_line_with_its_key(make: Callable[[], object], key: str) -> None:
    with pytest.raises(InputError) as caught:
        make()
    assert caught.value.key == key
    assert caught.value.accepted
    assert "\n" not in str(caught.value)


def test_a_metre_of_a_square_millimetre_of_copper_has_17_241_milliohm() -> None:
    # IEC 60028, from memory.
    assert resistivity(COPPER, 20.0) / 1e-6 == pytest.approx(17.241e-3, rel=1e-12)


@pytest.mark.parametrize("metal", [COPPER, ALUMINIUM], ids=lambda metal: metal.name)
def test_resistivity_is_linear_and_doubles_after_one_over_its_coefficient(metal: Metal) -> None:
    at_20 = resistivity(metal, 20.0)
    assert resistivity(metal, 20.0 + 1 / metal.temperature_coefficient) == pytest.approx(2 * at_20)
    steeper = replace(metal, temperature_coefficient=1.5 * metal.temperature_coefficient)
    rise, steeper_rise = (resistivity(m, 100.0) - at_20 for m in (metal, steeper))
    assert steeper_rise == pytest.approx(1.5 * rise)


def test_hard_drawn_aluminium_has_61_percent_of_the_conductivity_of_copper() -> None:
    # 61 % of the international annealed copper standard; common knowledge of the trade, memory.
    assert resistivity(COPPER, 20.0) / resistivity(ALUMINIUM, 20.0) == pytest.approx(0.61, rel=1e-4)


@pytest.mark.parametrize(
    ("turns", "conductor", "counts"),
    [
        # 9.6 mm high, 3.6 mm deep: 0.5 mm wires make 19 in a layer and 7 layers.
        (50, RoundWire(0.5 * MM), (19, 19, 12)),
        (19, RoundWire(0.5 * MM), (19,)),
        (20, RoundWire(0.5 * MM), (19, 1)),
        (3, RoundWire(0.5 * MM), (3,)),
        (133, RoundWire(0.5 * MM), (19,) * 7),
        # 0.4 mm and its coat of 0.1 mm all round are 0.6 mm: 16 and 6 exactly, rounding allowed.
        (96, RoundWire(0.4 * MM, 0.1 * MM), (16,) * 6),
        # 60 strands of 0.1 mm at 0.6 are 1 mm wide, 1.2 mm wrapped: 8 and 3 exactly.
        (24, LitzWire(60, 0.1 * MM, 0.6, 0.1 * MM), (8, 8, 8)),
        (12, LitzWire(60, 0.1 * MM, outer_diameter=1.1 * MM), (8, 4)),
        (24, Foil(0.1 * MM, insulation=0.05 * MM), (1,) * 24),
    ],
)
def test_turns_in_layers_agree_with_a_count_by_hand(
    turns: int, conductor: Conductor, counts: tuple[int, ...]
) -> None:
    layers = laid_turns(turns, conductor, ROOM)
    assert layers.turns_in_layers == counts
    assert layers.turns == turns


def test_layers_grow_outwards_and_each_is_centred() -> None:
    layers = laid_turns(5, RoundWire(3 * MM), Block(5 * MM, 12 * MM, 1 * MM, 11 * MM))
    expected = [(6.5, 3), (6.5, 6), (6.5, 9), (9.5, 4.5), (9.5, 7.5)]
    assert layers.positions / MM == pytest.approx(np.array(expected))
    block = layers.block
    sides = (block.inner_radius, block.outer_radius, block.bottom, block.top)
    assert np.array(sides) / MM == pytest.approx(np.array([5, 11, 1.5, 10.5]))


def test_wire_length_sums_the_rings_and_fill_the_areas() -> None:
    layers = laid_turns(3, RoundWire(2 * MM, 0.5 * MM), Block(5 * MM, 12 * MM, 0.0, 6.5 * MM))
    assert layers.wire_length == pytest.approx(2 * np.pi * (6.5 + 6.5 + 9.5) * MM)
    assert layers.mean_turn_length == pytest.approx(2 * np.pi * 7.5 * MM)
    assert layers.copper_area == pytest.approx(3 * np.pi * 1e-6)
    assert layers.fill_of_block == pytest.approx(3 * np.pi / 36)
    assert layers.fill_of_room == pytest.approx(3 * np.pi / (7 * 6.5))


def test_a_full_room_of_bare_touching_wire_is_filled_to_a_quarter_of_pi() -> None:
    layers = laid_turns(96, RoundWire(0.6 * MM), ROOM)
    assert layers.fill_of_block == pytest.approx(np.pi / 4)
    assert layers.fill_of_room == pytest.approx(np.pi / 4)


def test_foil_turns_are_layers_and_bare_foil_fills_its_room() -> None:
    layers = laid_turns(36, Foil(0.1 * MM), ROOM)
    assert layers.turns_in_layers == (1,) * 36
    assert layers.fill_of_room == pytest.approx(1.0)
    assert layers.mean_turn_length == pytest.approx(2 * np.pi * 8.2 * MM)
    assert np.all(layers.positions[:, 1] == 0.0)


@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_no_two_turns_overlap_and_all_lie_in_block_and_room(conductor: Conductor) -> None:
    for turns in {1, 2, most_turns(conductor, ROOM) // 2 + 1, most_turns(conductor, ROOM)}:
        layers = laid_turns(turns, conductor, ROOM)
        r, z = layers.positions.T
        radial, axial = layers.conductor.radial_size / 2, layers.conductor.axial_size / 2
        slack = 1e-9 * ROOM.outer_radius
        block = layers.block
        assert r.min() - radial == pytest.approx(block.inner_radius, abs=slack)
        assert r.max() + radial == pytest.approx(block.outer_radius, abs=slack)
        assert z.min() - axial == pytest.approx(block.bottom, abs=slack)
        assert z.max() + axial == pytest.approx(block.top, abs=slack)
        assert ROOM.inner_radius <= block.inner_radius < block.outer_radius <= ROOM.outer_radius
        assert ROOM.bottom <= block.bottom < block.top <= ROOM.top
        # In a square raster, turns are apart when they are so along r or along z.
        apart = pdist(layers.positions / (2 * radial, 2 * axial), "chebyshev")
        assert np.all(apart > 1 - 1e-9)


@pytest.mark.parametrize("factor", [0.1, 7.0])
@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_scaling_all_lengths_scales_the_winding(conductor: Conductor, factor: float) -> None:
    turns = most_turns(conductor, ROOM) - 1
    large_conductor, large_room = scaled(conductor, factor), scaled(ROOM, factor)
    small, large = (
        laid_turns(turns, conductor, ROOM),
        laid_turns(turns, large_conductor, large_room),
    )
    assert large.turns_in_layers == small.turns_in_layers
    assert large.positions == pytest.approx(factor * small.positions)
    assert large.fill_of_room == pytest.approx(small.fill_of_room)
    assert large.fill_of_block == pytest.approx(small.fill_of_block)
    resistance = dc_resistance(small, COPPER, 60.0)
    assert dc_resistance(large, COPPER, 60.0) == pytest.approx(resistance / factor)


def test_moving_the_room_along_the_axis_moves_the_turns() -> None:
    moved_room = replace(ROOM, bottom=ROOM.bottom + 2 * MM, top=ROOM.top + 2 * MM)
    layers, moved = (laid_turns(50, RoundWire(0.5 * MM), room) for room in (ROOM, moved_room))
    assert moved.positions == pytest.approx(layers.positions + np.array([0.0, 2 * MM]))


@pytest.mark.parametrize("seed", range(20))
def test_turns_that_fit_are_laid_and_one_more_is_refused(seed: int) -> None:
    random = np.random.default_rng(seed)
    inner, depth, height = random.uniform(1.0, 20.0, 3) * MM
    room = Block(inner, inner + depth, -0.3 * height, 0.7 * height)
    wire = RoundWire(random.uniform(0.05, 0.9) * MM, random.uniform(0.0, 0.05) * MM)
    count = most_turns(wire, room)
    assert count == int(depth / wire.radial_size) * int(height / wire.axial_size)
    assert laid_turns(count, wire, room).turns == count
    assert missing_room(count, wire, *extent(room)) == (0.0, 0.0)
    with pytest.raises(InputError, match="layers too thick by"):
        laid_turns(count + 1, wire, room)


@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_layers_fit_once_the_missing_depth_is_added_and_not_before(conductor: Conductor) -> None:
    turns = 3 * most_turns(conductor, ROOM)
    radial, axial = missing_room(turns, conductor, *extent(ROOM))
    assert radial > 0.0
    assert axial == 0.0
    laid_turns(turns, conductor, replace(ROOM, outer_radius=ROOM.outer_radius + radial))
    less = replace(ROOM, outer_radius=ROOM.outer_radius + (1 - 1e-6) * radial)
    with pytest.raises(InputError, match="layers too thick") as caught:
        laid_turns(turns, conductor, less)
    shown = shown_missing(caught.value, "layers too thick")
    laid_turns(turns, conductor, replace(less, outer_radius=less.outer_radius + shown))
    assert shown <= 1e-6 * radial + 1.01e-7


def test_the_missing_depth_agrees_with_a_sum_by_hand() -> None:
    # 150 turns are 8 layers of 19 at most: 4 mm in a room of 3.6 mm.
    with pytest.raises(InputError) as caught:
        laid_turns(150, RoundWire(0.5 * MM), ROOM)
    assert str(caught.value) == (
        "winding.turns = 150: the turns do not fit: layers too thick by 0.4 mm; "
        "accepted: at most 133 in this room"
    )


@pytest.mark.parametrize("conductor", [RoundWire(12 * MM), Foil(1 * MM, 12 * MM)], ids=repr)
def test_a_conductor_too_wide_for_the_height_says_so(conductor: Conductor) -> None:
    with pytest.raises(InputError, match="none in this room") as caught:
        laid_turns(5, conductor, ROOM)
    radial, axial = missing_room(5, conductor, *extent(ROOM))
    assert axial == pytest.approx(2.4 * MM)
    assert radial == pytest.approx(5 * conductor.radial_size - 3.6 * MM)
    assert shown_missing(caught.value, "too wide for the height") == pytest.approx(axial, abs=1e-7)
    assert shown_missing(caught.value, "layers too thick") == pytest.approx(radial, abs=1e-7)
    large = replace(ROOM, outer_radius=ROOM.outer_radius + radial, top=ROOM.top + axial)
    assert laid_turns(5, conductor, large).turns_in_layers == (1,) * 5


def test_former_and_clearances_bound_the_room() -> None:
    window = Block(5.75 * MM, 10.6 * MM, -5.5 * MM, 5.5 * MM)
    former = Former(0.5 * MM, 0.6 * MM, 0.15 * MM, 0.1 * MM, 0.3 * MM)
    room = winding_room(former, window)
    sides = (room.inner_radius, room.outer_radius, room.bottom, room.top)
    assert np.array(sides) / MM == pytest.approx(np.array([6.4, 10.3, -4.8, 4.8]))
    assert winding_room(Former(), window) == window


def test_the_clearance_to_the_gap_counts_from_legs_that_have_one() -> None:
    window = Block(5.75 * MM, 10.6 * MM, -5.5 * MM, 5.5 * MM)
    former = Former(wall=0.5 * MM, ring_clearance=0.2 * MM, gap_clearance=1.5 * MM)

    def radii(*gaps: Gap) -> tuple[float, float]:
        room = winding_room(former, window, gaps)
        return room.inner_radius / MM, room.outer_radius / MM

    assert radii() == pytest.approx((6.25, 10.4))
    assert radii(Gap(0.5 * MM)) == pytest.approx((7.25, 10.4))
    assert radii(Gap(0.5 * MM, "all")) == pytest.approx((7.25, 9.1))
    thick = replace(former, wall=2 * MM)
    assert winding_room(thick, window, (Gap(0.5 * MM),)).inner_radius == pytest.approx(7.75 * MM)


@pytest.mark.parametrize(
    ("former", "way", "missing"),
    [
        (Former(wall=4 * MM, ring_clearance=1.05 * MM), "radially", 0.2 * MM),
        (Former(flange=6 * MM), "axially", 1.0 * MM),
    ],
)
def test_a_former_that_takes_all_the_room_is_refused(
    former: Former, way: str, missing: float
) -> None:
    window = Block(5.75 * MM, 10.6 * MM, -5.5 * MM, 5.5 * MM)
    with pytest.raises(InputError, match=f"no room {way}: more than {missing / MM:g} mm missing"):
        winding_room(former, window)


def test_resistance_of_a_winding_is_that_of_its_straightened_wire() -> None:
    layers = laid_turns(50, RoundWire(0.5 * MM), ROOM)
    # Layers at 6.65, 7.15 and 7.65 mm: 19 x 6.65 + 19 x 7.15 + 12 x 7.65 = 354 mm.
    length, area = 2 * np.pi * 0.354, np.pi * (0.25 * MM) ** 2
    expected = 1.7241e-8 * (1 + 0.00393 * 80) * length / area
    assert dc_resistance(layers, COPPER, 100.0) == pytest.approx(expected)


def test_litz_has_the_resistance_of_its_strands_in_parallel() -> None:
    litz = LitzWire(60, 0.1 * MM, outer_diameter=1.1 * MM)
    strand = RoundWire(0.1 * MM, 0.5 * MM)
    one = dc_resistance(laid_turns(12, strand, ROOM), COPPER, 20.0)
    assert dc_resistance(laid_turns(12, litz, ROOM), COPPER, 20.0) == pytest.approx(one / 60)


@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_what_carries_the_current_has_its_area_and_stays_in_the_room_of_a_turn(
    conductor: Conductor,
) -> None:
    laid = as_laid(conductor, 9.6 * MM)
    corners = current_outline(laid)
    area = laid.copper_area
    if isinstance(laid, LitzWire):  # the bundle inside of its wrapping
        area = np.pi / 4 * (laid.radial_size - 2 * laid.insulation) ** 2
    assert polygon_area(tuple(map(tuple, corners))) == pytest.approx(area, rel=1e-12)
    room = np.array([laid.radial_size, laid.axial_size])
    assert np.all(np.abs(corners) <= room / 2 * (1 + 1e-12))
    assert corners.mean(axis=0) == pytest.approx(0.0, abs=1e-9 * MM)


@pytest.mark.parametrize("turns", [5, 19, 20, 50])
def test_the_outline_of_layers_has_one_room_for_each_turn(turns: int) -> None:
    layers = laid_turns(turns, RoundWire(0.5 * MM), ROOM)
    assert polygon_area(layers.outline) == pytest.approx(turns * (0.5 * MM) ** 2)
    corners = np.array(layers.outline)
    block = layers.block
    sides = (block.inner_radius, block.bottom, block.outer_radius, block.top)
    assert (*corners.min(axis=0), *corners.max(axis=0)) == pytest.approx(sides)


def test_the_block_of_a_winding_goes_into_a_symmetric_design(pot_26_16: fm.Design) -> None:
    core = pot_26_16.core
    window = Block(core.turned.post_radius, core.window_radius, -5.5 * MM, 5.5 * MM)
    former = Former(wall=0.65 * MM, flange=0.7 * MM, ring_clearance=0.6 * MM)
    layers = laid_turns(50, RoundWire(0.5 * MM, 0.03 * MM), winding_room(former, window))
    assert len(layers.turns_in_layers) == 3
    design = replace(pot_26_16, windings=(fm.Winding(layers.turns, layers.block),))
    assert meshed_section(design).copies == 2
