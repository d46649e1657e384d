"""The ripple in design files."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design import design_hash
from femag.design_file import design_from_toml

HEAD = """\
[core]
size = "P 26/16"
material = { permeability = 2000 }
[[winding]]
turns = 50
[drive]
current = "3 A"
"""
PERIOD = "# scope\nt [us];note;I [mA]\n2;a;500\n6;b;1500\n12;c;500\n"


def ripple_of(lines: str) -> fm.Ripple | None:
    return design_from_toml(HEAD + lines).ripple


def test_keys_give_the_ripple() -> None:
    assert ripple_of("") is None
    assert ripple_of('ripple = "1 A"\nfrequency = "100 kHz"') == fm.Ripple(1.0, 1e5)
    found = ripple_of('ripple = "1 A"\nfrequency = "100 kHz"\nrise = 0.4\nshape = "triangle"')
    assert found == fm.Ripple(1.0, 1e5, rise=0.4)
    found = ripple_of('ripple = "8 A"\nfrequency = "50 Hz"\nshape = "sine"')
    assert found == fm.Ripple(8.0, 50.0, "sine")
    found = ripple_of('waveform = [[0, "1 A"], [0.4, "2 A"], [1, "1 A"]]\nfrequency = "1 kHz"')
    assert found == fm.Ripple.of_samples([[0, 1], [0.4, 2], [1, 1]], 1e3)


def test_a_file_of_one_period_gives_shape_and_frequency(tmp_path: Path) -> None:
    (tmp_path / "period.csv").write_text(PERIOD)
    design = tmp_path / "design.toml"
    design.write_text(HEAD + 'waveform = "period.csv"\n')
    ripple = fm.read_design(design).ripple
    assert ripple is not None
    assert ripple.frequency == pytest.approx(1e5)
    assert ripple.peak_to_peak == pytest.approx(1.0)
    phase = np.linspace(0.0, 1.0, 11)
    triangle = fm.Ripple(1.0, 1e5, rise=0.4)
    np.testing.assert_allclose(ripple.current(phase), triangle.current(phase), atol=1e-12)
    design.write_text(HEAD + 'waveform = "period.csv"\nfrequency = "20 kHz"\n')
    slower = fm.read_design(design).ripple
    assert slower is not None
    assert slower.frequency == 20e3


def test_a_period_that_nearly_closes_takes_the_mean_of_its_ends(tmp_path: Path) -> None:
    file = tmp_path / "period.csv"
    file.write_text("time (s)\tcurrent (A)\n0\t1,0\n1\t2,0\n2\t1,008\n")
    assert fm.read_ripple(file).samples == ((0.0, 1.004), (0.5, 2.0), (1.0, 1.004))


@pytest.mark.parametrize(
    "ripple",
    [
        fm.Ripple(1.0 / 3.0, 1e5 / 7.0, rise=0.3),
        fm.Ripple(2.0, 1e5, "sine"),
        fm.Ripple.of_samples([[0, 1 / 3], [1 / 7, 2.1], [0.6, -1.3], [1, 1 / 3]], 333.3),
    ],
)
def test_toml_out_and_in_keeps_the_ripple(pot_26_16: fm.Design, ripple: fm.Ripple) -> None:
    design = replace(pot_26_16, ripple=ripple)
    again = design_from_toml(fm.design_toml(design))
    assert again == design
    assert design_hash(again) == design_hash(design) != design_hash(pot_26_16)


def test_a_design_without_ripple_keeps_its_hash(pot_26_16: fm.Design) -> None:
    """Result files written before there was a ripple stay readable: the hash of then."""
    assert design_hash(pot_26_16) == OLD_HASH


OLD_HASH = "d8a5ea6ad25c8fa8179b55e91aa3bf28fcebbd48842d9ac3a42fd331b663fda0"

BAD = [
    ('ripple = "1 A"', "drive.frequency: missing; accepted: a frequency with its unit"),
    ('ripple = 1\nfrequency = "1 kHz"', "drive.ripple = 1: the unit is missing"),
    ('ripple = "0 A"\nfrequency = "1 kHz"', "drive.ripple = '0 A': out of range; accepted: 1e-12"),
    ('ripple = "1 A"\nfrequency = "0 Hz"', "drive.frequency = '0 Hz': out of range"),
    ('ripple = "1 A"\nfrequency = "1 kHz"\nrise = 1', "drive.rise = 1: out of range; accepted"),
    ('ripple = "1 A"\nfrequency = "1 kHz"\nshape = "saw"', "drive.shape = 'saw': not usable"),
    ('frequency = "1 kHz"', "drive.frequency = '1 kHz': needs a ripple; accepted: drive.ripple"),
    ("rise = 0.3", "drive.rise = 0.3: needs a ripple"),
    ('ripple = "1 A"\nwaveform = "x.csv"', "drive.ripple = '1 A': stands beside drive.waveform"),
    ('ripple = "1 A"\nfrequency = "1 Hz"\nshape = "sine"\nrise = 0.3', "a sine has no rise"),
    ("waveform = 3", "drive.waveform = 3: neither a path nor a list of pairs; accepted: the path"),
    ("waveform = [[0, 1]]", "drive.waveform = [[0, 1]]: the unit is missing"),
    ('waveform = [[0, "1 A"], 2]', "drive.waveform = [[0, '1 A'], 2]: not pairs"),
    ('waveform = [["0 s", "1 A"]]', "a share of the period is no number"),
    ('waveform = [[0, "1 A"], [1, "1 A"]]\nfrequency = "1 Hz"', "drive.waveform: not usable"),
]


@pytest.mark.parametrize(("lines", "message"), BAD)
def test_bad_keys_get_one_line(lines: str, message: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        ripple_of(lines)
    assert message in str(caught.value)
    assert "\n" not in str(caught.value)


BAD_FILES = [
    ("", "no rows; accepted: a header line such as 't [us],I [A]'"),
    ("0 1\n1 2\n", "header = '0 1': one column"),
    ("t,I\n0,1\n1,2\n2,1\n", "header = 't': the unit is missing"),
    ("t [A],I [A]\n0,1\n", "header = 't [A]': 'A' is not a unit of this quantity"),
    ("t [s],U [V]\n0,1\n", "no column of current"),
    ("t [s],I [A],I [mA]\n0,1,1\n", "2 columns of current"),
    ("t [s],I [A]\n0,1\n1,x\n", "line 3 = 'x': not a number"),
    ("t [s],I [A]\n0,1\n1,2\n", "no period"),
    ("t [s],I [A]\n0,1\n2,2\n1,1\n", "no period"),
    ("t [s],I [A]\n0,1\n1,2\n2,1.2\n", "first and last current differ by 20 % of the ripple"),
    ("t [s],I [A]\n0,1\n1,1\n2,1\n", "drive.ripple = 0.0: out of range"),
]


@pytest.mark.parametrize(("text", "message"), BAD_FILES)
def test_a_bad_file_gets_one_line(tmp_path: Path, text: str, message: str) -> None:
    file = tmp_path / "period.csv"
    file.write_text(text)
    with pytest.raises(fm.InputError) as caught:
        fm.read_ripple(file)
    assert str(caught.value).startswith(f"{file}: ")
    assert message in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_file_that_cannot_be_read_is_named(tmp_path: Path) -> None:
    with pytest.raises(fm.InputError, match=r"none\.csv: cannot be read"):
        fm.read_ripple(tmp_path / "none.csv")
