"""Designs whose windings are laid from a conductor."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design import design_hash, meshed_section, whole_section, wound_coils
from femag.design_file import design_from_toml
from femag.geometry import Layers

TEXT = """\
[core]
size = "P 26/16"
material = { permeability = 2000 }
[[gap]]
length = "0.5 mm"
[[winding]]
turns = 50
[winding.conductor]
round = "0.5 mm"
insulation = "0.03 mm"
temperature = "100 C"
[winding.former]
wall = "0.6 mm"
flange = "0.6 mm"
"""

CONDUCTORS = [
    fm.RoundWire(0.5e-3, 0.03e-3),
    fm.LitzWire(60, 0.05e-3),
    fm.LitzWire(60, 0.05e-3, outer_diameter=0.6e-3),
    fm.Foil(0.03e-3, insulation=0.02e-3),
    fm.Foil(0.03e-3, width=8e-3),
]


MORE = """\
[[winding]]
name = "sense"
turns = 8
conductor = { round = "0.3 mm" }
former = { tape = "0.1 mm" }
[[winding]]
name = "screen"
turns = 1
conductor = { foil = "0.05 mm" }
[solve]
detail = "turn"
"""


def wound(pot_26_16: fm.Design, conductor: object, turns: int = 50) -> fm.Design:
    former = fm.Former(wall=0.5e-3, flange=0.5e-3, gap_clearance=0.8e-3)
    winding = fm.Winding(turns, name="main", conductor=conductor, former=former, temperature=80)
    return replace(pot_26_16, windings=winding)


def layers_of(design: fm.Design) -> Layers:
    (layers,) = wound_coils(design)[0].layers
    return layers


def three_windings() -> fm.Design:
    own = 'turns = 25\nsections = 3\ndivider = "0.5 mm"'
    return design_from_toml(TEXT.replace("turns = 50", own) + MORE)


@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_layers_that_are_all_full_are_a_block(pot_26_16: fm.Design, conductor: object) -> None:
    first = layers_of(wound(pot_26_16, conductor)).turns_in_layers[0]
    design = wound(pot_26_16, conductor, turns=2 * first)
    block = layers_of(design).block
    explicit = replace(design, windings=fm.Winding(2 * first, block))
    assert fm.solve(design).inductance == fm.solve(explicit).inductance
    assert fm.solve(design).solution.sides.mesh.section.copies == 2


def test_a_last_layer_of_few_turns_is_no_full_layer(pot_26_16: fm.Design) -> None:
    """Full layers and the rest as two windings in series: the same rectangles, the same field."""
    design = wound(pot_26_16, fm.RoundWire(0.5e-3))
    layers = layers_of(design)
    assert layers.turns_in_layers == (20, 20, 10)
    b, step = layers.block, layers.block.inner_radius + 1e-3
    full = fm.Winding(40, fm.Block(b.inner_radius, step, b.bottom, b.top), "full")
    rest = fm.Winding(10, fm.Block(step, b.outer_radius, -2.5e-3, 2.5e-3), "rest")
    split = replace(design, windings=(full, rest), driven=("full", "rest"))
    one, other = (fm.solve(d, tolerance=1e-4).inductance for d in (design, split))
    assert max(one.lower, other.lower) < min(one.upper, other.upper)
    evenly = replace(design, windings=fm.Winding(50, b))
    assert fm.solve(evenly, tolerance=1e-4).inductance.lower > 1.005 * one.upper


@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_files_keep_the_conductor(pot_26_16: fm.Design, tmp_path: Path, conductor: object) -> None:
    design = wound(pot_26_16, conductor)
    assert design_from_toml(fm.design_toml(design)) == design
    result = fm.solve(design, tolerance=1e-2)
    fm.write_result(result, tmp_path / "result.json")
    assert fm.read_result(tmp_path / "result.json") == result


def test_resistance_is_that_of_the_wire(pot_26_16: fm.Design) -> None:
    """Length of all turns over section, copper of IEC 60028 (from memory) at 80 C."""
    (copper,) = fm.solve(wound(pot_26_16, CONDUCTORS[0]), tolerance=1e-2).copper
    radii = layers_of(wound(pot_26_16, CONDUCTORS[0])).positions[:, 0]
    length = 2 * np.pi * radii.sum()
    assert copper.wire_length == pytest.approx(length, rel=1e-12)
    resistivity = 1.7241e-8 * (1 + 0.00393 * 60)
    assert copper.resistance == pytest.approx(resistivity * length / (np.pi * 0.25e-3**2), rel=1e-9)


def test_a_block_is_the_room_that_a_conductor_is_laid_in(pot_26_16: fm.Design) -> None:
    block = pot_26_16.windings[0].block
    winding = fm.Winding(20, block, conductor=fm.RoundWire(0.5e-3))
    layers = layers_of(replace(pot_26_16, windings=winding))
    assert layers.room == block
    assert block.inner_radius <= layers.block.inner_radius < layers.block.outer_radius


@pytest.mark.parametrize(
    ("good", "bad", "line"),
    [
        ("turns = 50", "turns = 500", "winding.turns = 500: the turns do not fit: layers too"),
        ('"100 C"', '"100"', "winding.conductor.temperature = '100': not a temperature"),
        ('"100 C"', '"1000 C"', "winding.conductor.temperature = '1000 C': temperature out of"),
        ('round = "0.5 mm"', 'round = "1 mm"\nfoil = "1 mm"', "conductor: 2 kinds of conductor"),
        ('round = "0.5 mm"', 'width = "1 mm"', "winding.conductor: 0 kinds of conductor"),
        ('round = "0.5 mm"', 'round = "1 mm"\nwidth = "1 mm"', "only foil has a width"),
        ('round = "0.5 mm"', 'round = "0 mm"', "winding.conductor.round = '0 mm': size out of"),
        (
            'round = "0.5 mm"',
            'litz = { strands = 1, strand = "0.1 mm" }',
            "winding.conductor.litz.strands = 1: strands out of range",
        ),
        (
            'round = "0.5 mm"',
            'litz = { strands = 9, strand = "0 mm" }',
            "winding.conductor.litz.strand = '0 mm': size out of range",
        ),
        ("round =", "rund =", "winding.conductor.rund: unknown key; accepted: nearest known key"),
        ('temperature = "100 C"', 'metal = "gold"', "winding.conductor.metal = 'gold'"),
        ("turns = 50", "turns = 50\nsections = 51", "winding.sections = 51: more sections than"),
        ("turns = 50", 'turns = 50\ndivider = "1 mm"', "winding.divider = '1 mm': a divider needs"),
        ("turns = 50", "turns = 50\nsections = 2.0", "winding.sections = 2.0: not usable"),
        ('flange = "0.6 mm"', 'tape = "1 mm"', "winding.former.tape = '1 mm': no winding lies"),
        ("[[gap]]", '[solve]\ndetail = "wire"\n[[gap]]', "solve.detail = 'wire': not usable"),
        ('flange = "0.6 mm"', 'flange = "-1 mm"', "winding.former.flange = '-1 mm': out of range"),
        ('flange = "0.6 mm"', 'flange = "9 mm"', "the former leaves no room axially"),
        (
            TEXT[TEXT.index("[winding.conductor]") : TEXT.index("[winding.former]")],
            "",
            "winding.former: a former needs a conductor",
        ),
    ],
)
def test_bad_conductors_get_one_line(good: str, bad: str, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(TEXT.replace(good, bad, 1))
    assert line in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_second_winding_needs_no_block() -> None:
    design = three_windings()
    main, sense, screen = wound_coils(design)
    assert [section.turns for section in main.sections] == [8, 9, 8]
    assert sense.sections[0].block.inner_radius == pytest.approx(
        main.sections[1].block.outer_radius + 0.1e-3
    )
    # The flanges of the first are those of all: 11.2 mm of window less twice 0.6 mm.
    half = design.core.window_height / 2 - 0.6e-3
    assert screen.sections[0].block.top == pytest.approx(half)
    assert screen.sections[0].block.inner_radius == sense.sections[0].block.outer_radius


def test_files_keep_windings_sections_and_detail(tmp_path: Path) -> None:
    design = three_windings()
    again = design_from_toml(fm.design_toml(design))
    assert again == design
    assert design_hash(again) == design_hash(design)
    result = fm.solve(design, tolerance=1e-2)
    fm.write_result(result, tmp_path / "result.json")
    assert fm.read_result(tmp_path / "result.json") == result


def test_copper_counts_sections_from_the_lowest() -> None:
    """Three chambers of 2.9 mm hold five wires of 0.56 mm in a layer; resistances in series."""
    design = three_windings()
    main, sense, screen = fm.solve(design, tolerance=1e-2).copper
    assert main.turns_in_sections == (8, 9, 8)
    assert main.layers_in_sections == (2, 2, 2)
    assert (main.turns, main.layers) == (25, 2)
    assert (sense.turns_in_sections, screen.turns_in_sections) == ((8,), (1,))
    radii = np.concatenate([layers.positions[:, 0] for layers in wound_coils(design)[0].layers])
    resistivity = 1.7241e-8 * (1 + 0.00393 * 80)  # IEC 60028, from memory
    expected = resistivity * 2 * np.pi * radii.sum() / (np.pi * 0.25e-3**2)
    assert main.resistance == pytest.approx(expected, rel=1e-9)


def test_sections_without_dividers_are_the_block_that_they_divide(pot_26_16: fm.Design) -> None:
    whole = pot_26_16.windings[0]
    divided = replace(pot_26_16, windings=replace(whole, sections=5))
    names = [region.name for region in whole_section(divided).regions if region.winding]
    assert names == [f"winding main, section {number}" for number in range(1, 6)]
    one, other = (fm.solve(d, tolerance=1e-4).inductance for d in (pot_26_16, divided))
    assert max(one.lower, other.lower) < min(one.upper, other.upper)


def test_sections_of_equal_shape_and_unequal_turns_are_no_mirror_images(
    pot_26_16: fm.Design,
) -> None:
    block = pot_26_16.windings[0].block
    for turns, copies in ((50, 2), (51, 1)):
        winding = fm.Winding(turns, block, sections=2, divider=1e-3)
        assert meshed_section(replace(pot_26_16, windings=winding)).copies == copies


def test_the_hash_changes_with_what_can_move_a_result_and_not_otherwise(
    pot_26_16: fm.Design,
) -> None:
    first = fm.Winding(20, conductor=fm.RoundWire(0.5e-3), sections=2, divider=1e-3)
    taped = fm.Former(tape=1e-4)
    second = fm.Winding(5, name="over", conductor=fm.RoundWire(0.3e-3), former=taped)
    design = replace(pot_26_16, windings=(first, second))
    others = [
        replace(design, detail="turn"),
        replace(design, windings=(replace(first, sections=3), second)),
        replace(design, windings=(replace(first, divider=2e-3), second)),
        replace(design, windings=(first, replace(second, former=fm.Former(tape=2e-4)))),
    ]
    hashes = {design_hash(one) for one in (design, *others)}
    assert len(hashes) == 1 + len(others)
    assert design_hash(replace(design, title="other")) == design_hash(design)
    # Without a conductor there is nothing that the detail could change.
    assert design_hash(replace(pot_26_16, detail="turn")) == design_hash(pot_26_16)


def test_a_winding_named_like_a_part_of_another_is_refused(pot_26_16: fm.Design) -> None:
    main = fm.Winding(4, conductor=fm.RoundWire(0.5e-3), sections=2)
    other = fm.Winding(4, name="main, section 2", conductor=fm.RoundWire(0.5e-3))
    with pytest.raises(fm.InputError, match="a part of another winding is called") as caught:
        replace(pot_26_16, windings=(main, other))
    assert caught.value.key == "winding.name"


def test_the_winding_that_does_not_fit_is_named_by_its_number() -> None:
    second = '[[winding]]\nname = "second"\nturns = 9999\nconductor = { round = "1 mm" }\n'
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(TEXT + second)
    assert caught.value.key == "winding.1.turns"


def test_a_former_beside_a_block_is_refused_and_not_passed_over(pot_26_16: fm.Design) -> None:
    block = pot_26_16.windings[0].block
    with pytest.raises(fm.InputError, match="a former beside a block") as caught:
        fm.Winding(5, block, conductor=fm.RoundWire(0.5e-3), former=fm.Former(wall=1e-3))
    assert caught.value.key == "winding.former"
