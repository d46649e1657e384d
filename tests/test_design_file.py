from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag.design import design_hash
from femag.design_file import design_from_document, design_from_toml

TEXT = """\
title = "two posts"
[core]
family = "pot"
material = { permeability = 2000 }
[core.dimensions]
outer_diameter = "25.5 mm"
window_diameter = "21.2 mm"
post_diameter = "11.5 mm"
hole_diameter = "5.5 mm"
height = "16.1 mm"
window_height = "11.0 mm"
[[gap]]
leg = "post"
length = "0.5 mm"
[[winding]]
name = "main"
turns = 50
[winding.block]
inner_radius = "6.4 mm"
outer_radius = "10.0 mm"
bottom = "-4.8 mm"
top = "4.8 mm"
[drive]
current = "1 A"
[solve]
tolerance = 1e-3
"""


def test_a_file_gives_the_design_that_its_keys_say(pot_26_16: fm.Design) -> None:
    assert design_from_toml(TEXT) == replace(pot_26_16, title="two posts")


def test_a_written_file_has_a_point_on_a_line_and_reads_back(pot_26_16: fm.Design) -> None:
    samples = tuple((step / 8, 1.0 + min(step, 8 - step) / 4) for step in range(9))
    ripple = fm.Ripple(1.0, 1e5, "samples", samples=samples)
    points = tuple((100.0 * step, 0.05 * step) for step in range(6))
    material = fm.TabulatedCurve(points, 'a "[" b = [', "[", ("[[x]]",))
    design = replace(pot_26_16, material=material, title="x = [", ripple=ripple, current=2.0)
    text = fm.design_toml(design)
    assert design_from_toml(text) == design
    lines = [line.strip() for line in text.splitlines()]
    assert '["100 A/m", "0.05 T"],' in lines
    assert '[0.5, "2 A"],' in lines
    assert sum(line.endswith("[") for line in lines) == 2
    assert max(map(len, lines)) <= 80


def test_units_may_be_of_any_kind(pot_26_16: fm.Design) -> None:
    design = design_from_toml(TEXT.replace('"0.5 mm"', '"500 um"').replace('"1 A"', '"1000 mA"'))
    assert design == replace(pot_26_16, title="two posts")


def test_what_is_left_out_takes_its_default() -> None:
    text = TEXT[: TEXT.index("[[gap]]")] + "[[winding]]\nturns = 50\n"
    design = design_from_toml(text.replace('hole_diameter = "5.5 mm"\n', ""))
    assert (design.gaps, design.current, design.tolerance) == ((), 1.0, 1e-3)
    assert design.core.hole_diameter == 0.0
    assert design.windings == (fm.Winding(50, None, "main"),)


def test_toml_out_and_in_is_the_same_design(saturating_26_16: fm.Design) -> None:
    halves = (
        fm.Winding(20, fm.Block(6.4e-3, 8e-3, -4.8e-3, 4.8e-3), "inner"),
        fm.Winding(30, fm.Block(8e-3, 1e-2, -1 / 300, 4.8e-3), "outer"),
    )
    design = replace(
        saturating_26_16,
        windings=halves,
        driven=("outer", "inner"),
        gaps=(fm.Gap(0.1e-3 / 3, "all"), fm.Gap(0.5e-3)),
        title='quotes " and \\ and <tags>',
    )
    again = design_from_toml(fm.design_toml(design))
    assert again == design
    assert design_hash(again) == design_hash(design)


def test_the_hash_sees_what_moves_a_result_and_nothing_else(pot_26_16: fm.Design) -> None:
    own = design_hash(pot_26_16)
    assert design_hash(replace(pot_26_16, title="other")) == own
    assert design_hash(replace(pot_26_16, material=fm.LinearCurve(2000))) == own
    for change in (
        {"gaps": (fm.Gap(0.5001e-3),)},
        {"gaps": (fm.Gap(0.5e-3, "all"),)},
        {"current": 2.0},
        {"tolerance": 1e-4},
        {"material": fm.FroehlichCurve(2000, 0.45)},
        {"windings": (fm.Winding(51, pot_26_16.windings[0].block),)},
    ):
        assert design_hash(replace(pot_26_16, **change)) != own


BAD = [
    ('"0.5 mm"', '"12 mm"', "gap.length = '12 mm': the gap is longer than the post"),
    ('"0.5 mm"', "0.5", "gap.length = 0.5: the unit is missing; accepted: a length with its unit"),
    ('"0.5 mm"', '"0,5 mm"', "gap.length = '0,5 mm': a decimal comma"),
    ('"0.5 mm"', '"0.5 A"', "gap.length = '0.5 A': 'A' is not a unit of this quantity"),
    ('"0.5 mm"', '"-0.5 mm"', "gap.length = '-0.5 mm': the gap must be positive"),
    ("turns = 50", "turns = 0", "winding.turns = 0: turns out of range"),
    ("turns = 50", "turns = 5.5", "winding.turns = 5.5: not usable; accepted: a whole number"),
    ('"10.0 mm"', '"11 mm"', "winding.block.outer_radius = '11 mm': the winding reaches into the"),
    (
        '"6.4 mm"',
        '"5 mm"',
        "winding.block.inner_radius = '5 mm': the winding reaches into the post",
    ),
    ("leg =", "lag =", "gap.lag: unknown key; accepted: nearest known key: 'leg'"),
    ("tolerance =", "tolerence =", "solve.tolerence: unknown key; accepted: nearest known key"),
    ("[[winding]]", "[[windng]]", "windng: unknown key; accepted: nearest known key: 'winding'"),
    ('leg = "post"', 'leg = "side"', "gap.leg = 'side': not usable; accepted: 'post' or 'all'"),
    ("[[gap]]", "[gap]", "accepted: tables headed [[gap]]"),
    ("= 1e-3", "= 2", "solve.tolerance = 2: tolerance out of range"),
    ("= 2000", "= 0.5", "core.material.permeability = 0.5: relative permeability out of range"),
    (
        "= 2000",
        "= 2000, exponent = 2",
        "core.material.exponent = 2: an exponent needs a saturation",
    ),
    ("= 2000", '= 2000, saturation = "1 A"', "core.material.saturation = '1 A': 'A' is not a unit"),
    ("material = {", "materiel = {", "core.materiel: unknown key; accepted: nearest known key"),
    ("{ permeability = 2000 }", '"x"', "core.material = 'x': no material of this name; accepted"),
    ("height =", "hight =", "core.dimensions.hight: unknown key; accepted: nearest known key"),
    ('height = "16.1 mm"\n', "", "core.dimensions.height: missing; accepted: a length"),
    ('"11.5 mm"', '"31.5 mm"', "core.dimensions.post_diameter = '31.5 mm': must be smaller than"),
    ('"1 A"', '"0 A"', "drive.current = '0 A': a drive current is needed"),
    ('"pot"', '"cup"', "core.family = 'cup': unknown family; accepted: 'pot', 'rm'"),
    ("[drive]", '[drive]\nwinding = ["x"]', "drive.winding = 'x': no winding has this name"),
    ('"two posts"', "two posts", "not valid TOML"),
    ('"two posts"', '"two\\nlines"', "title = 'two\\nlines': not printable"),
    ("[drive]", "[drive]\nwinding = [3]", "drive.winding = 3: not usable; accepted: a list of"),
    ("[drive]", '[drive]\nwinding = ["main", "main"]', "a winding is named twice"),
    ("turns = 50", f"turns = {10**25}", "turns out of range"),
    ("turns = 50", f"turns = {'9' * 5001}", "not valid TOML"),
    ("= 2000", '= 2000, saturation = "1 T", exponent = 0', "core.material.exponent = 0"),
    ("= 2000", "= 1e7", "core.material.permeability = 10000000.0: relative permeability out of"),
    ('"1 A"', '"1e200 A"', "drive.current = '1e200 A': a drive current is needed"),
    ('"1 A"', '"1e-170 A"', "drive.current = '1e-170 A': a drive current is needed"),
    ('"0.5 mm"', '"1e9999999999999999999 mm"', "the number is out of range"),
    ('"5.5 mm"', '"-1 mm"', "accepted: a length of 0 or more"),
    ('name = "main"', 'name = ""', "winding.name = '': not a name"),
]


@pytest.mark.parametrize(("good", "bad", "line"), BAD, ids=[bad for _, bad, _ in BAD])
def test_bad_input_gets_one_line(tmp_path: Path, good: str, bad: str, line: str) -> None:
    file = tmp_path / "design.toml"
    file.write_text(TEXT.replace(good, bad, 1))
    with pytest.raises(fm.InputError) as caught:
        fm.read_design(file)
    message = str(caught.value)
    assert message.startswith(f"{file}: ")
    assert line in message
    assert "\n" not in message


def test_a_later_entry_of_a_list_is_named_by_its_number() -> None:
    extra = '[[gap]]\nleg = "all"\nlength = "-1 mm"\n'
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(TEXT + extra)
    assert (caught.value.key, caught.value.value) == ("gap.1.length", "-1 mm")


def test_a_file_that_cannot_be_read_is_named(tmp_path: Path) -> None:
    with pytest.raises(fm.InputError, match="No such file"):
        fm.read_design(tmp_path / "none.toml")
    with pytest.raises(fm.InputError, match="directory"):
        fm.read_design(tmp_path)
    (tmp_path / "binary.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(fm.InputError, match="not UTF-8 text"):
        fm.read_design(tmp_path / "binary.toml")


def test_deep_nesting_is_one_line_too(tmp_path: Path) -> None:
    with pytest.raises(fm.InputError, match="not valid TOML"):
        design_from_toml("title = " + "[" * 5000 + "]" * 5000)


def test_a_byte_order_mark_is_read_over(tmp_path: Path, pot_26_16: fm.Design) -> None:
    (tmp_path / "bom.toml").write_text("\ufeff" + TEXT, encoding="utf-8")
    assert fm.read_design(tmp_path / "bom.toml") == replace(pot_26_16, title="two posts")


def test_nothing_in_a_file_is_executed() -> None:
    with pytest.raises(fm.InputError):
        design_from_document({"core": "__import__('os').abort()"})
