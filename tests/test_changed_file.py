"""``gapfield gap --write``: the owner's file with another gap."""

from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag.design_file import changed_design_file

OWN = """\
# coupled to board 7, invented
title = "mine"   # for print

[core]
size = "P 26/16"        # of the catalogue
material = { file = "ferrite.csv" }

[[gap]]
leg = "post"
length = "19.7 mil"  # ground

# primary
[[winding]]
  turns = 50
[drive]
current = "0.5 A"
waveform = "parts/period.csv"
[tolerance]
gap = "0.02 mm"
"""
FERRITE = "H [A/m],B [T]\n25,0.09\n100,0.28\n500,0.43\n"
PERIOD = "t [us];I [mA]\n2;-100\n6;100\n12;-100\n"


@pytest.fixture
def own(tmp_path: Path) -> Path:
    folder = tmp_path / "mine"
    (folder / "parts").mkdir(parents=True)
    (folder / "ferrite.csv").write_text(FERRITE)
    (folder / "parts" / "period.csv").write_text(PERIOD)
    (folder / "design.toml").write_text(OWN)
    return folder / "design.toml"


def changed(file: Path, target: Path, **parts: object) -> tuple[str, fm.Design]:
    before = fm.read_design(file)
    after = replace(before, **parts)  # type: ignore[arg-type]
    text = changed_design_file(file, before, after, target)
    target.write_text(text)
    return text, after


def test_only_what_changed_is_written_anew(own: Path) -> None:
    before = own.read_text()
    windings = (replace(fm.read_design(own).windings[0], turns=48),)
    text, after = changed(
        own, own.with_name("b.toml"), gaps=fm.Gap(0.5678e-3), windings=windings, current=3.0
    )
    expected = (
        before.replace('"19.7 mil"', '"0.5678 mm"')
        .replace("turns = 50", "turns = 48")
        .replace('"0.5 A"', '"3 A"')
    )
    assert text == expected
    assert fm.read_design(own.with_name("b.toml")) == after


def test_paths_mean_the_same_in_another_folder(own: Path, tmp_path: Path) -> None:
    (tmp_path / "other").mkdir()
    text, after = changed(own, tmp_path / "other" / "b.toml", current=3.0)
    assert 'material = { file = "../mine/ferrite.csv" }' in text
    assert 'waveform = "../mine/parts/period.csv"' in text
    assert fm.read_design(tmp_path / "other" / "b.toml") == after


@pytest.mark.parametrize(
    ("start", "end", "kept"),
    [
        ("", "# primary\n[[winding]]\nturns = 50\n", True),
        ("gap = []\n", "[[winding]]\nturns = 50\n", False),
        ("winding = [{ turns = 50 }]\n", "", False),
        ('title = """\\\n[[winding]]"""\n', "[[winding]]\nturns = 50", False),
    ],
    ids=["before the windings", "empty list", "windings in a line", "text like a table"],
)
@pytest.mark.parametrize("line_end", ["\n", "\r\n"])
def test_a_first_gap_gets_a_place(
    tmp_path: Path, start: str, end: str, kept: bool, line_end: str
) -> None:
    core = '[core]\nsize = "P 26/16"\nmaterial = { permeability = 2000 }\n\n'
    file = tmp_path / "design.toml"
    file.write_bytes(f"{start}{core}{end}".replace("\n", line_end).encode())
    text, after = changed(file, tmp_path / "b.toml", gaps=fm.Gap(0.5e-3))
    assert fm.read_design(tmp_path / "b.toml") == after
    assert text.count("\n") == text.count(line_end)
    if kept:
        gap = '[[gap]]\nleg = "post"\nlength = "0.5 mm"\n\n'
        assert text == f"{core}{gap}{end}".replace("\n", line_end)


def test_a_file_that_was_changed_meanwhile_is_refused(own: Path) -> None:
    before = fm.read_design(own)
    own.write_text(own.read_text().replace("50", "51"))
    with pytest.raises(fm.InputError, match=r"design\.toml: has changed while"):
        changed_design_file(own, before, replace(before, current=2.0), own.with_name("b.toml"))
