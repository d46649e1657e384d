"""Loss parameters from captures whose loss is known, and the loss of a core that comes of them."""

import json
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag import cli
from femag.bench import Loop, loop_of, measured_loss, normal_curve
from femag.bench.synthetic import InventedMaterial, Recording, capture_csv, invented_capture
from femag.field.adapt import adapted_solution
from femag.field.design_problem import field_problem
from femag.quantities import core_loss
from femag.units import MU_0

CORE = fm.CoreUnderTest(drive_turns=10, sense_turns=8, area=97e-6, path_length=37.6e-3)
LAW = fm.Steinmetz(1.5, 1.45, 2.6, (25e3, 200e3), (0.05, 0.2))
"""Invented, of the order of a power ferrite."""
PLACES = [(f, b) for f in (25e3, 100e3) for b in (0.05, 0.1, 0.2)]


def elliptic(frequency: float, peak: float, noise: float = 0.0, seed: int = 1) -> fm.Capture:
    """Return a capture under a sine whose loop is an ellipse that loses what the law says.

    The area of H = H1 sin + H2 cos over B = Bm sin is pi H2 Bm.
    """
    step = 1.0 / (500.0 * frequency)
    turn = 2.0 * np.pi * frequency * step * np.arange(5200)
    lag = float(LAW.loss_density(frequency, peak)) / (np.pi * frequency * peak)
    field = peak / (2000 * MU_0) * np.sin(turn) + lag * np.cos(turn)
    voltage = CORE.sense_turns * CORE.area * peak * 2.0 * np.pi * frequency * np.cos(turn)
    current = field * CORE.path_length / CORE.drive_turns
    random = np.random.default_rng(seed)
    current, voltage = (
        channel + noise * channel.max() * random.standard_normal(channel.size)
        for channel in (current, voltage)
    )
    return fm.Capture(f"{frequency:g}-{peak:g}.csv", step, current, voltage)


def loops_at(places: Sequence[tuple[float, float]], noise: float = 0.0) -> list[Loop]:
    return [loop_of(elliptic(*place, noise, seed), CORE) for seed, place in enumerate(places)]


def test_the_law_of_the_captures_is_found() -> None:
    fit = measured_loss(loops_at(PLACES), 60.0).fit
    assert fit is not None
    assert (fit.alpha, fit.beta) == pytest.approx((LAW.alpha, LAW.beta), abs=1e-3)
    assert fit.loss_density(60e3, 0.13) == pytest.approx(LAW.loss_density(60e3, 0.13), rel=1e-3)
    assert fit.temperature == 60.0


def test_noise_of_a_thousandth_moves_the_loss_by_little() -> None:
    """The loss angle is some degrees, and the noise averages out over periods and samples."""
    fit = measured_loss(loops_at(PLACES, noise=1e-3)).fit
    assert fit is not None
    assert fit.loss_density(60e3, 0.13) == pytest.approx(LAW.loss_density(60e3, 0.13), rel=0.01)


def test_what_is_no_sine_is_left_out_and_said() -> None:
    wide = InventedMaterial().loop(30.0)
    square = invented_capture(wide, CORE, Recording(50e3, "square"))
    sine = elliptic(25e3, 0.1)
    biased = replace(sine, name="b.csv", current=sine.current + 10.0)
    loss = measured_loss([*loops_at(PLACES), loop_of(square, CORE), loop_of(biased, CORE)])
    assert loss.captures == tuple(f"{f:g}-{b:g}.csv" for f, b in PLACES)
    assert loss.notes == (
        "not in the loss: invented square voltage, its flux is no sine (12.1% of harmonics)",
        "not in the loss: b.csv, it has a bias",
    )
    assert loss.fit == measured_loss(loops_at(PLACES)).fit


@pytest.mark.parametrize(
    ("places", "reason"),
    [
        ([(50e3, b) for b in (0.05, 0.1, 0.2)], "too much alike"),
        ([(50e3, 0.1), (51e3, 0.1), (50e3, 0.2)], "too much alike"),
        ([(25e3, 0.05), (50e3, 0.1), (100e3, 0.2)], "too much alike"),
        ([(25e3, 0.1), (50e3, 0.2)], "2 captures with a sine"),
    ],
    ids=["one frequency", "nearly one", "together", "two"],
)
def test_captures_that_fix_no_parameters_give_none(
    places: list[tuple[float, float]], reason: str
) -> None:
    loss = measured_loss(loops_at(places))
    assert loss.fit is None
    assert len(loss.readings) == len(places)
    assert reason in loss.notes[-1]


def test_the_lowest_frequency_makes_the_normal_curve() -> None:
    """At 100 kHz the tips lie at lower B for equal H, so that all together would fall."""
    curve = normal_curve(loops_at([*PLACES, (200e3, 0.1)]))
    assert len(curve.points) == 3
    assert curve.frequencies == pytest.approx((25e3, 25e3))
    assert curve.notes == ("from the 3 captures at 25.00 kHz alone",)


def test_from_captures_to_the_loss_of_a_core(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    files = []
    for place in PLACES:
        capture = elliptic(*place)
        files.append(tmp_path / capture.name)
        files[-1].write_text(capture_csv(capture, volts_per_ampere=1.0))
    options = ["--drive-turns", "10", "--sense-turns", "8", "--area", "97 mm2", "--path",
               "37.6 mm", "--current-scale", "1 A/V", "--temperature", "80 C"]  # fmt: skip
    targets = ["--material", str(tmp_path / "m.toml"), "--json", str(tmp_path / "b.json")]
    assert cli.main(["bench", *map(str, files), *options, *targets]) == 0
    printed = capsys.readouterr().out
    assert "Loss density under a sine" in printed
    assert max(map(len, printed.splitlines()[:-1])) <= 80
    loss = json.loads((tmp_path / "b.json").read_text())["loss"]
    assert loss["fit"]["alpha"] == pytest.approx(LAW.alpha, abs=5e-3)
    design = tmp_path / "design.toml"
    design.write_text(
        '[core]\nsize = "P 26/16"\nmaterial = "m.toml"\n'
        '[[gap]]\nlength = "0.1 mm"\n[[winding]]\nturns = 10\n'
        '[drive]\ncurrent = "1 A"\nripple = "2 A"\nfrequency = "60 kHz"\nshape = "sine"\n'
    )
    own = fm.read_design(design)
    material = own.material
    assert isinstance(material, fm.TabulatedCurve)
    assert material.loss is not None
    assert material.loss.temperature == 80.0
    solution, _ = adapted_solution(field_problem(own), own.current, own.tolerance)
    assert own.ripple is not None
    found, known = (
        core_loss(solution, own.ripple, parameters).total for parameters in (material.loss, LAW)
    )
    assert found == pytest.approx(known, rel=5e-3)
