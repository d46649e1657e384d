"""Designs whose windings are laid from a conductor."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design import laid_windings, whole_section
from femag.design_file import design_from_toml
from femag.geometry import region_areas

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


def wound(pot_26_16: fm.Design, conductor: object) -> fm.Design:
    former = fm.Former(wall=0.5e-3, flange=0.5e-3, gap_clearance=0.8e-3)
    winding = fm.Winding(50, name="main", conductor=conductor, former=former, temperature=80)
    return replace(pot_26_16, windings=winding)


@pytest.mark.parametrize("conductor", CONDUCTORS, ids=repr)
def test_the_laid_block_carries_the_current(pot_26_16: fm.Design, conductor: object) -> None:
    design = wound(pot_26_16, conductor)
    layers = laid_windings(design)["main"]
    assert region_areas(whole_section(design))["winding main"] == pytest.approx(layers.block.area)
    explicit = replace(design, windings=fm.Winding(50, layers.block))
    assert fm.solve(design).inductance == fm.solve(explicit).inductance
    assert fm.solve(design).solution.sides.mesh.section.copies == 2


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
    radii = laid_windings(wound(pot_26_16, CONDUCTORS[0]))["main"].positions[:, 0]
    length = 2 * np.pi * radii.sum()
    assert copper.wire_length == pytest.approx(length, rel=1e-12)
    resistivity = 1.7241e-8 * (1 + 0.00393 * 60)
    assert copper.resistance == pytest.approx(resistivity * length / (np.pi * 0.25e-3**2), rel=1e-9)


def test_a_block_is_the_room_that_a_conductor_is_laid_in(pot_26_16: fm.Design) -> None:
    block = pot_26_16.windings[0].block
    winding = fm.Winding(20, block, conductor=fm.RoundWire(0.5e-3))
    layers = laid_windings(replace(pot_26_16, windings=winding))["main"]
    assert layers.room == block
    assert block.inner_radius <= layers.block.inner_radius < layers.block.outer_radius


def test_turn_by_turn_and_block_give_the_same_inductance(pot_26_16: fm.Design) -> None:
    """Ten turns as ten squares of their copper's area, against their common block: within 0.3 %."""
    conductor = fm.RoundWire(0.9e-3)
    design = replace(pot_26_16, windings=fm.Winding(10, conductor=conductor))
    layers = laid_windings(design)["main"]
    half = 0.5 * np.sqrt(np.pi) * 0.45e-3
    turns = tuple(
        fm.Winding(1, fm.Block(r - half, r + half, z - half, z + half), name=f"{index}")
        for index, (r, z) in enumerate(layers.positions)
    )
    single = replace(pot_26_16, windings=turns, driven=tuple(winding.name for winding in turns))
    one, other = fm.solve(design), fm.solve(single)
    assert other.inductance.value == pytest.approx(one.inductance.value, rel=3e-3)


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
