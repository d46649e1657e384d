"""Circuit models: the broken line, its text, and a run in a simulator where there is one."""

import csv
import re
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

import femag as fm
from femag import cli
from femag.export.circuit_model import broken_line, circuit_text, subcircuit_name
from femag.field.bounds import Bounds

Array = NDArray[np.float64]
ENGINE = shutil.which("ngspice")
WITH_ENGINE = pytest.mark.skipif(
    ENGINE is None, reason="no SPICE engine on PATH: apt-get install ngspice"
)
CURRENTS = np.linspace(0.5, 5.0, 14)


@pytest.fixture(scope="module")
def curve() -> fm.InductanceCurve:
    """A 26/16 core driven far over its knee; a wire winding has a resistance."""
    design = fm.Design(
        core=fm.PotCore(
            outer_diameter=25.5e-3, window_diameter=21.2e-3, post_diameter=11.5e-3,
            hole_diameter=5.5e-3, height=16.1e-3, window_height=11.0e-3,
        ),
        gaps=(fm.Gap(0.5e-3),),
        windings=(fm.Winding(50, conductor=fm.RoundWire(0.4e-3)),),
        material=fm.FroehlichCurve(2000.0, 0.45, 2.0),
        title="choke: 5 A, 'test'",
        tolerance=5e-3,
    )  # fmt: skip
    return fm.inductance_curve(design, CURRENTS.tolist())


def without_resistance(curve: fm.InductanceCurve) -> fm.InductanceCurve:
    """The same points with windings that are blocks, whose wire is not known."""
    block = fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3)
    return replace(curve, design=replace(curve.design, windings=(fm.Winding(50, block),)))


def transient(folder: Path, text: str, voltage: float, end: float) -> tuple[Array, Array]:
    """Times and currents of a simulation from rest at a constant voltage."""
    (name,) = re.findall(r"^\.subckt (\S+) a b$", text, re.MULTILINE)
    (folder / "model.cir").write_text(text)
    (folder / "run.cir").write_text(
        f"* constant voltage\n.include {folder}/model.cir\nV1 1 0 DC {voltage}\n"
        f"X1 1 0 {name}\n.options reltol=1e-5\n.control\n"
        f"tran {end / 2000} {end} 0 {end / 2000} uic\n"
        f"wrdata {folder}/out.txt i(V1)\n.endc\n.end\n"
    )
    assert ENGINE is not None
    done = subprocess.run(
        [ENGINE, "-b", str(folder / "run.cir")], capture_output=True, text=True, timeout=60
    )
    assert (folder / "out.txt").exists(), done.stderr
    time, current = np.loadtxt(folder / "out.txt").T
    return time, -current


@WITH_ENGINE
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_a_simulation_follows_the_inductance_of_every_point(
    curve: fm.InductanceCurve, tmp_path: Path, sign: float
) -> None:
    """Without resistance the flux linkage is voltage times time."""
    last, voltage = curve.points[-1], 0.1 * sign
    text = circuit_text(without_resistance(curve))
    time, current = transient(tmp_path, text, voltage, 10 * last.flux_linkage)
    linkage = np.array([point.flux_linkage for point in curve.points])
    linked = np.interp(CURRENTS, sign * current, abs(voltage) * time)
    assert linked / CURRENTS == pytest.approx(linkage / CURRENTS, rel=1e-3)
    reached = np.interp(linkage / abs(voltage), time, sign * current)
    assert reached == pytest.approx(CURRENTS, rel=5e-3)


@WITH_ENGINE
def test_a_simulation_ends_at_the_current_of_the_resistance(
    curve: fm.InductanceCurve, tmp_path: Path
) -> None:
    (copper,) = fm.solve(curve.design, tolerance=0.05).copper
    time, current = transient(tmp_path, circuit_text(curve), 2.0 * copper.resistance, 0.1)
    assert current[-1] == pytest.approx(2.0, rel=1e-3)
    near = np.interp(1e-4, time, current)
    assert 2.0 * copper.resistance * 1e-4 / near == pytest.approx(curve.initial_inductance, rel=0.1)


def drawn_current(text: str, flux_linkage: Array) -> Array:
    """The current of the model's source, from its text alone."""
    full = float(re.findall(r"^Cflux x 0 (\S+)$", text, re.MULTILINE)[0])
    source = text.partition("I =\n")[2].partition(".ends")[0]
    lines = [line.removeprefix("+ ") for line in source.splitlines()]
    expression = " ".join(lines).replace("V(x)", "x")
    return np.asarray(eval(expression, {"abs": np.abs, "x": flux_linkage / full}))


def test_the_source_is_odd_monotone_and_goes_on_straight(curve: fm.InductanceCurve) -> None:
    text, last = circuit_text(curve), curve.points[-1]
    x = np.linspace(0.0, 1.5 * last.flux_linkage, 2001)
    current = drawn_current(text, x)
    assert current[0] == 0.0
    assert np.all(np.diff(current) > 0.0)
    assert drawn_current(text, -x) == pytest.approx(-current, rel=1e-9, abs=1e-12)
    beyond = x > 1.01 * last.flux_linkage
    slope = np.diff(x[beyond]) / np.diff(current[beyond])
    assert slope == pytest.approx(last.incremental_inductance, rel=1e-6)
    assert x[1] / current[1] == pytest.approx(curve.initial_inductance, rel=1e-3)
    points = drawn_current(text, np.array([point.flux_linkage for point in curve.points]))
    assert points == pytest.approx(CURRENTS, rel=2e-3)


def test_points_between_those_of_the_table_are_met(curve: fm.InductanceCurve) -> None:
    between = fm.inductance_curve(curve.design, [2.1, 3.6])
    linkage = np.array([point.flux_linkage for point in between.points])
    current = drawn_current(circuit_text(curve), linkage)
    assert linkage / current == pytest.approx(linkage / between.currents, rel=5e-3)


def test_a_linear_core_is_one_piece_and_negative_currents_make_the_same_model(
    pot_26_16: fm.Design,
) -> None:
    curves = [fm.inductance_curve(pot_26_16, [0.0, sign * 1.0, sign * 2.0]) for sign in (1, -1)]
    lines = [broken_line(curve) for curve in curves]
    assert len(lines[0].current) == 2
    assert lines[0].current == pytest.approx(lines[1].current)
    assert lines[0].flux_linkage == pytest.approx(lines[1].flux_linkage)


def test_a_curve_that_falls_is_refused(curve: fm.InductanceCurve) -> None:
    turned = replace(curve.points[5], flux_linkage_of_sides=(1e-6, 1e-6), coenergy=Bounds(0, 1))
    points = (*curve.points[:5], turned, *curve.points[6:])
    with pytest.raises(fm.NumericalError, match="does not rise"):
        circuit_text(replace(curve, points=points))


@pytest.mark.parametrize(
    ("title", "name"),
    [("choke: 5 A, 'test'", "inductor_choke_5_a_test"), ("", "inductor"), ("Ä?", "inductor"),
     ("x" * 90, "inductor_" + "x" * 40)],
)  # fmt: skip
def test_names_are_safe(curve: fm.InductanceCurve, title: str, name: str) -> None:
    design = replace(curve.design, title=title)
    assert subcircuit_name(design) == name
    text = circuit_text(replace(curve, design=design))
    assert text.isascii()
    assert text.count(name) >= 2
    assert max(len(line) for line in text.splitlines()) <= 100


def test_the_command_writes_circuit_and_table(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file, circuit, table = (tmp_path / name for name in ("d.toml", "l.cir", "l.csv"))
    file.write_text(fm.design_toml(pot_26_16))
    arguments = ["curve", str(file), "--currents", "0 A:2 A:3", "--tolerance", "0.01"]
    assert cli.main([*arguments, "--circuit", str(circuit), "--table", str(table)]) == 0
    capsys.readouterr()
    assert ".subckt inductor a b" in circuit.read_text()
    curve = fm.inductance_curve(pot_26_16, [0.0, 1.0, 2.0], 0.01)
    with table.open(newline="") as lines:
        rows = list(csv.DictReader(lines))
    for row, point in zip(rows, curve.points, strict=True):
        assert float(row["current (A)"]) == point.current
        assert float(row["flux linkage (Wb)"]) == point.flux_linkage
        assert float(row["coenergy upper (J)"]) == point.coenergy.upper


@pytest.mark.parametrize(
    ("option", "name", "line"),
    [
        ("--circuit", "l.txt", "a file that ends with .cir"),
        ("--table", "l.json", "a file that ends with .csv"),
        ("--circuit", "l.cir", "gap.magnet: a magnet makes the two directions of current differ"),
    ],
)
def test_bad_targets_get_one_line(
    tmp_path: Path,
    pot_26_16: fm.Design,
    capsys: pytest.CaptureFixture[str],
    option: str,
    name: str,
    line: str,
) -> None:
    file = tmp_path / "d.toml"
    magnet = fm.Gap(0.5e-3, magnet=fm.Magnet(0.3))
    file.write_text(fm.design_toml(replace(pot_26_16, gaps=(magnet,))))
    arguments = ["curve", str(file), "--currents", "1 A, 2 A", option, str(tmp_path / name)]
    assert cli.main(arguments) == 2
    error = capsys.readouterr().err
    assert line in error
    assert error.count("\n") == 1
    assert not (tmp_path / name).exists()
