"""Normal curves from the tips of loops, and the material files that come of them."""

import tomllib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.bench import Loop, loop_of, material_toml, middle_curve, normal_curve
from femag.bench.synthetic import InventedMaterial, Recording, invented_capture

CORE = fm.CoreUnderTest(drive_turns=10, sense_turns=8, area=97e-6, path_length=37.6e-3)
PEAKS = (15.0, 30.0, 60.0, 120.0, 240.0)
BAD = Recording(periods=20.4, samples=500.37, noise=0.005, offset=0.05, drift=0.001)


def loop(peak: float, **changes: float) -> Loop:
    capture = invented_capture(InventedMaterial().loop(peak), CORE, replace(BAD, **changes))
    return loop_of(replace(capture, name=f"folder/{peak:g}.csv"), CORE)


@pytest.fixture(scope="module")
def loops() -> list[Loop]:
    return [loop(peak) for peak in PEAKS]


def test_tips_lie_on_the_exact_normal_curve_in_whatever_order(loops: list[Loop]) -> None:
    curve = normal_curve(loops[::-1])
    exact = [(peak, InventedMaterial().loop(peak).peak_flux_density) for peak in PEAKS]
    assert np.array(curve.points) == pytest.approx(np.array(exact), rel=0.01)
    assert curve.points == normal_curve(loops).points


def test_captures_at_nearly_equal_drive_are_averaged_and_that_is_said(loops: list[Loop]) -> None:
    curve = normal_curve([*loops, loop(60.2, seed=7)])
    assert len(curve.points) == len(PEAKS)
    assert curve.points[2][0] == pytest.approx(60.1, rel=2e-3)
    assert curve.notes == ("2 captures at nearly equal drive were averaged",)


def test_too_few_drives_biases_and_falling_curves_are_refused(loops: list[Loop]) -> None:
    with pytest.raises(fm.InputError, match="2 different drives make no normal curve"):
        normal_curve(loops[:2])
    other = loop_of(
        invented_capture(InventedMaterial().loop(120.0), CORE, BAD), replace(CORE, area=200e-6)
    )
    with pytest.raises(fm.InputError, match="the normal curve falls"):
        normal_curve([*loops[:3], other])
    capture = invented_capture(InventedMaterial().loop(60.0), CORE, BAD)
    biased = loop_of(replace(capture, current=capture.current + 1.0), CORE)
    for refused in (lambda: normal_curve([*loops, biased]), lambda: middle_curve(biased)):
        with pytest.raises(fm.InputError, match="a loop with a bias"):
            refused()


def test_the_middle_of_an_ellipse_is_a_straight_line() -> None:
    """H at equal B is Hm cos delta b -+ Hm sin delta sqrt(1 - b^2) with b = B/Bm, so that the mean
    of the branches is Hm cos delta B/Bm."""
    t = 2.0 * np.pi * np.arange(5200) / 1000
    current = 30.0 * np.cos(t) * CORE.path_length / CORE.drive_turns
    voltage = -0.08 * 2e4 * np.pi * np.sin(t - 0.3) * CORE.sense_turns * CORE.area
    curve = middle_curve(loop_of(fm.Capture("ellipse", 1e-7, current, voltage), CORE))
    h, b = np.array(curve.points).T
    assert h == pytest.approx(30.0 * np.cos(0.3) * b / 0.08, rel=5e-3)


def test_a_material_file_reads_back_to_the_tips(loops: list[Loop], tmp_path: Path) -> None:
    """The reader of material files is another part of the package."""
    curve = normal_curve(loops)
    text = material_toml(curve, 'ring "7"', temperature=60.0)
    (tmp_path / "ring.toml").write_text(text)
    document = tomllib.loads(text)
    assert document["name"] == 'ring "7"'
    assert "folder" not in document["source"]
    assert "120.csv" in document["source"]
    assert "10.00 kHz" in document["source"]
    material = fm.read_material(tmp_path / "ring.toml").at(60.0)
    h, b = np.array(curve.points).T
    assert material.flux_density(h) == pytest.approx(b, rel=2e-5)


@pytest.mark.parametrize("name", ["two\nlines", "tab\t", "back\\slash", "Ring aus Ü", "\x7f\x01"])
def test_any_name_gives_a_valid_file(loops: list[Loop], name: str) -> None:
    assert (
        tomllib.loads(material_toml(normal_curve(loops), name))["curve"][0]["temperature"] == "25 C"
    )
