"""``gapfield curve`` from the outside."""

import json
import os
import pty
import re
import subprocess
import sys
from importlib.resources import files
from io import StringIO
from pathlib import Path

import pytest
from rich.console import Console

import femag as fm
from femag import cli
from femag.current_curve import CurvePoint
from femag.curve_answer import print_curve
from femag.curve_command import currents_of

DEMO = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")
COARSE = ["--tolerance", "0.01"]


@pytest.fixture
def design(tmp_path: Path) -> Path:
    file = tmp_path / "design.toml"
    file.write_text(DEMO)
    return file


def run(capsys: pytest.CaptureFixture[str], *arguments: object) -> tuple[int, str, str]:
    code = cli.main(["curve", *map(str, arguments)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def test_the_table_says_what_was_solved_in_80_columns(
    design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, err = run(capsys, design, "--currents", "2 A, 4500 mA, 8 A", *COARSE)
    assert (code, err) == (0, "")
    assert max(len(line) for line in out.splitlines()) <= 80
    assert "\x1b" not in out
    assert "36 turns, 2 A to 8 A" in out
    curve = fm.inductance_curve(fm.read_design(design), [2.0, 4.5, 8.0], 0.01)
    rows = [line.split() for line in out.splitlines() if re.match(r" +[\d.]+ A ", line)]
    assert [row[0] for row in rows] == ["2", "4.5", "8"]
    factors = {"mWb": 1e-3, "uWb": 1e-6, "uH": 1e-6, "mJ": 1e-3, "uJ": 1e-6, "%": 1e-2}
    for row, point in zip(rows, curve.points, strict=True):
        shown = [float(row[k]) * factors[row[k + 1]] for k in range(2, 12, 2)]
        exact = [point.flux_linkage, point.apparent_inductance, point.incremental_inductance]
        assert shown[:4] == pytest.approx([*exact, point.coenergy.value], rel=1e-3)
        assert shown[4] == pytest.approx(point.coenergy.relative_half_width, rel=0.06)
    for entry in curve.saturation:
        assert entry.current is not None
        (line,) = re.findall(rf"{100 * entry.drop:g} % less .*uH +([\d.]+) A", out)
        assert float(line) == pytest.approx(entry.current, rel=1e-3)
    for text in ("Bounded: the co-energy", "Estimates without", "3 currents on one mesh"):
        assert text in out
    last = curve.points[-1]
    stored = 1e3 * (last.flux_linkage * last.current - last.coenergy.value)
    assert f"about {stored:.2g} mJ is stored at 8 A" in out


def test_json_on_standard_output_is_nothing_but_json(
    design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """dW'/dI = lambda: Simpson's rule over the linear range gives the co-energy's growth."""
    code, out, err = run(capsys, design, "--currents", "1 A:2 A:3", *COARSE, "--json", "-")
    assert (code, err) == (0, "")
    document = json.loads(out)
    assert document["tolerance"] == 0.01
    points = document["points"]
    assert [point["current"] for point in points] == [1.0, 1.5, 2.0]
    linked = [point["flux_linkage"] for point in points]
    growth = points[2]["coenergy"]["value"] - points[0]["coenergy"]["value"]
    assert growth == pytest.approx((linked[0] + 4 * linked[1] + linked[2]) / 6, rel=1e-3)
    assert document["saturation"] == [{"drop": d, "current": None} for d in (0.1, 0.2, 0.3)]


def test_an_air_core_never_saturates(design: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Common practice, no source."""
    material = 'material = { permeability = 2200, saturation = "0.46 T", exponent = 2 }'
    design.write_text(DEMO.replace(material, "material = { permeability = 1 }"))
    _, out, _ = run(capsys, design, "--currents", "-1 A, -1000 A", *COARSE)
    assert out.count("beyond -1000 A") == 3
    assert "The bounds of the co-energy are rigorous" in " ".join(out.split())


def test_out_writes_the_curve_and_two_figures(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "deep" / "curve"
    code, out, _ = run(
        capsys, design, "--currents", "1 A:8 A:4", *COARSE, "--out", folder,
        "--json", tmp_path / "c.json",
    )  # fmt: skip
    assert code == 0
    assert sorted(file.name for file in folder.iterdir()) == [
        "curve.json", "inductance.png", "shearing.png",
    ]  # fmt: skip
    assert f"Written to {folder}: curve.json, inductance.png, shearing.png" in " ".join(out.split())
    assert fm.read_curve(folder / "curve.json") == fm.read_curve(tmp_path / "c.json")
    assert (folder / "shearing.png").stat().st_size > 20_000


def test_a_winding_that_needs_the_spacer_leaves_the_comparison_out_and_says_so(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The window is 13.2 mm high without the spacer."""
    taller = DEMO.replace('leg = "post"', 'leg = "all"').replace('"5.6 mm"', '"6.8 mm"')
    design.write_text(taller.replace('"-5.6 mm"', '"-6.8 mm"'))
    code, out, err = run(
        capsys, design, "--currents", "1 A, 2 A", *COARSE, "--out", tmp_path / "o"
    )  # fmt: skip
    assert (code, err) == (0, "")
    assert "Without gaps there is nothing to compare with: winding" in out
    assert (tmp_path / "o" / "shearing.png").exists()


@pytest.fixture
def measured(design: Path, tmp_path: Path) -> Path:
    """One per cent above what the field says, invented."""
    curve = fm.inductance_curve(fm.read_design(design), [2.0, 4.0, 6.0], 0.01)
    file = tmp_path / "measured.csv"
    rows = [f"{p.current};{1.01e6 * p.apparent_inductance:.9f}" for p in curve.points]
    file.write_text("\n".join(["I [A];L_app [uH]", *rows]) + "\n")
    return file


def test_measured_points_stand_beside_it_with_residuals(
    design: Path, measured: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, err = run(
        capsys, design, "--currents", "1 A, 8 A", *COARSE, "--measured", measured,
        "--json", tmp_path / "c.json", "--out", tmp_path / "o",
    )  # fmt: skip
    assert (code, err) == (0, "")
    assert (tmp_path / "o" / "inductance.png").exists()
    assert max(len(line) for line in out.split("Written to")[0].splitlines()) <= 80
    assert out.count("-0.99%") == 3
    beside = json.loads((tmp_path / "c.json").read_text())["measured"]
    residuals = [point["residual"] for point in beside["points"]]
    assert residuals == pytest.approx([1 / 1.01 - 1] * 3, abs=1e-6)
    assert beside["kind"] == "apparent"
    assert beside["fit"] is None
    assert [p.current for p in fm.read_curve(tmp_path / "c.json").points] == [1.0, 8.0]


def test_a_fit_finds_the_gap_that_was_measured(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Measured on the same core with 0.54 mm instead of 0.6 mm, invented."""
    ground = tmp_path / "ground.toml"
    ground.write_text(DEMO.replace("0.6 mm", "0.54 mm"))
    curve = fm.inductance_curve(fm.read_design(ground), [1.0, 4.0], 0.01)
    rows = [f"{p.current};{1e6 * p.apparent_inductance:.9f}" for p in curve.points]
    table = tmp_path / "measured.csv"
    table.write_text("\n".join(["I [A];L [uH]", *rows]) + "\n")
    code, out, err = run(
        capsys, design, "--currents", "1 A, 8 A", *COARSE, "--measured", table, "--fit",
        "--kind", "apparent", "--json", tmp_path / "c.json",
    )  # fmt: skip
    assert (code, err) == (0, "")
    assert max(len(line) for line in out.splitlines()) <= 80
    beside = json.loads((tmp_path / "c.json").read_text())["measured"]
    before = max(abs(point["residual"]) for point in beside["points"])
    assert max(map(abs, beside["fit"]["residuals"])) < 0.1 * before
    assert beside["fit"]["gap"] == pytest.approx(0.54e-3, rel=0.01)
    assert f"{1e3 * beside['fit']['gap']:.4g} mm" in out
    assert "Standard errors are those of the fit only" in out


@pytest.mark.parametrize(
    ("text", "currents"),
    [
        ("0.5 A:8 A:16", [0.5 * k for k in range(1, 17)]),
        ("8 A : 500 mA : 2", [8.0, 0.5]),
        ("-1 A:-3 A:3", [-1.0, -2.0, -3.0]),
        ("1 A, 2 A,5 A", [1.0, 2.0, 5.0]),
        ("0.1 A:0.7 A:7", [0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7]),
    ],
)
def test_currents_are_read(text: str, currents: list[float]) -> None:
    found = currents_of(text)
    assert found == pytest.approx(currents, rel=1e-15)
    assert (found[0], found[-1]) == (currents[0], currents[-1])


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("1 A", "one current makes no curve"),
        ("", "a current is missing"),
        ("1 A,", "a current is missing"),
        ("1 A, 1000 mA", "1 A is asked for twice"),
        ("0 A, 1 A", "one current makes no curve"),
        ("-1 A, 1 A", "currents of both signs"),
        ("1, 2 A", "'1': the unit is missing"),
        ("0.5:8 A:16", "'0.5': the unit is missing"),
        ("0.5 A:8:16", "'8': the unit is missing"),
        ("0.5 A:8 mm:16", "'mm' is not a unit"),
        ("0,5 A:8 A:16", "a decimal comma"),
        ("1 A:8 A", "2 parts between colons instead of 3"),
        ("1 A:8 A:4:4", "4 parts between colons"),
        ("1 A:8 A:4, 9 A", "'4, 9 A' is no number of currents"),
        ("1 A:8 A:1", "1 currents instead of 2 to 10000"),
        ("1 A:8 A:0", "0 currents instead of 2"),
        ("1 A:8 A:2.5", "'2.5' is no number of currents"),
        ("1 A:8 A:-3", "'-3' is no number of currents"),
        ("1 A:8 A:", "'' is no number of currents"),
        ("1 A:8 A:99999999999", "currents instead of 2 to 10000"),
        ("2 A:2 A:4", "first and last current are the same"),
        ("-2 A:2 A:4", "currents of both signs"),
        ("0 A:8 A:2", "one current makes no curve"),
        ("0 A, 0 A, 1 A, 2 A", "0 A is asked for twice"),
        ("1 A, 1e12 A", "1e+12 A is out of range, 1e-12 A to 1e+09 A"),
        ("many", "not a number with a unit"),
    ],
)
def test_currents_that_make_no_curve_get_one_line(
    design: Path, capsys: pytest.CaptureFixture[str], text: str, said: str
) -> None:
    code, out, err = run(capsys, design, "--currents", text)
    assert (code, out) == (2, "")
    assert err.count("\n") == 1
    assert said in err
    assert "--currents" in err


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ([], "--currents"),
        (["--tolerance", "2"], "--tolerance = 2.0: tolerance out of range"),
        (["--tolerance", "few"], "--tolerance"),
        (["--json", "{design}"], "is the design itself"),
        (["--json", "{folder}/no/c.json"], "cannot be written"),
        (["--out", "{design}"], "is no folder"),
        (["--fit"], "--fit: there is nothing measured"),
        (["--kind", "apparent"], "--kind: there is nothing measured"),
        (["--measured", "{folder}/none.csv"], "none.csv: cannot be read"),
        (["--measured", "{design}", "--kind", "mean"], "--kind = 'mean': unknown kind"),
        (["--measured", "{folder}/m.csv", "--json", "{folder}/m.csv"], "measured points itself"),
    ],
)
def test_bad_calls_get_one_line_and_exit_code_2(
    design: Path, capsys: pytest.CaptureFixture[str], arguments: list[str], said: str
) -> None:
    table = design.parent / "m.csv"
    table.write_text("I [A];L [uH]\n1;400\n2;390\n")
    filled = [part.format(design=design, folder=design.parent) for part in arguments]
    currents = ["--currents", "1 A, 2 A"] if arguments else []
    code, out, err = run(capsys, design, *currents, *filled)
    assert (code, out) == (2, "")
    assert err.count("\n") == 1
    assert err.startswith("gapfield: ")
    assert said in err
    assert sorted(design.parent.iterdir()) == [design, table]


def test_the_energy_that_a_linear_core_with_a_magnet_stores_is_that_of_the_current() -> None:
    """Closed form: the current adds L I^2/2, whatever the magnet."""
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11e-3, 5.5e-3)
    gap = fm.Gap(0.5e-3, magnet=fm.Magnet(0.1))
    design = fm.Design(core, fm.Winding(50), fm.LinearCurve(2000), gap)
    points = tuple(
        CurvePoint(i, fm.Bounds(-1e-3, -0.9e-3, "J"), (2e-3 + 1e-3 * i,) * 2, (1e-3,) * 2, 2e-3)
        for i in (1.0, 3.0, 5.0)
    )
    curve = fm.InductanceCurve(design, points, 1e-3, (), 0, 0, 0.0, {}, "")
    text = StringIO()
    print_curve(curve, Console(file=text, width=80))
    assert "about 12 mJ is stored at 5 A" in text.getvalue()
    assert "of what the current adds to it" in " ".join(text.getvalue().split())
    assert "largest on the curve" in text.getvalue()


def test_the_function_is_not_hidden_by_the_module_of_the_same_name() -> None:
    code = (
        "import femag.plot, femag.current_curve, femag as fm; print(callable(fm.inductance_curve))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "True\n"


@pytest.mark.slow
def test_progress_shows_on_a_terminal(design: Path) -> None:
    try:
        terminal, ours = pty.openpty()
    except OSError as error:
        pytest.skip(f"no pseudo-terminal here: {error}")
    process = subprocess.Popen(
        [sys.executable, "-m", "femag.cli", "curve", str(design), "--currents", "0.1 A:8 A:60"],
        stdout=subprocess.PIPE,
        stderr=ours,
        env=os.environ | {"TERM": "xterm", "COLUMNS": "80"},
    )
    os.close(ours)
    shown = b""
    while b"of 60 currents" not in shown:
        try:
            shown += os.read(terminal, 4096)
        except OSError:
            break
    process.kill()
    process.communicate()
    assert b"of 60 currents" in shown
