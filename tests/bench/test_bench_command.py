"""``gapfield bench`` from the outside."""

import inspect
import json
import re
import shlex
from pathlib import Path

import pytest

import femag as fm
from femag import cli
from femag.bench.synthetic import DEMO_PEAKS, InventedMaterial, demo_files
from femag.bench_command import bench_command

CORE = ["--drive-turns", "12", "--sense-turns", "12", "--area", "60 mm2", "--path", "60 mm"]
SCALE = ["--current-scale", "10 A/V"]


def run(capsys: pytest.CaptureFixture[str], *arguments: object) -> tuple[int, str, str]:
    code = cli.main(["bench", *map(str, arguments)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


@pytest.fixture
def captures(tmp_path: Path) -> list[Path]:
    for name, text in demo_files().items():
        (tmp_path / name).write_text(text)
    return sorted(tmp_path.iterdir())


def test_one_capture_is_answered_in_80_columns(
    captures: list[Path], capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, err = run(capsys, captures[3], *CORE, *SCALE)
    assert (code, err) == (0, "")
    assert max(map(len, out.splitlines())) <= 80
    exact = InventedMaterial().loop(DEMO_PEAKS[3])
    shown = re.search(r"coercive field H_c +([\d.]+) A/m", out)
    assert shown is not None
    assert float(shown.group(1)) == pytest.approx(exact.coercive_field, rel=0.01)
    for text in ("8 periods of 500 samples", "remanence B_r", "loss per cycle", "loss density",
                 "amplitude permeability", "slope after the tip", "closes within",
                 "Caution"):  # fmt: skip
        assert text in out


def test_json_holds_what_is_printed_and_the_loop(
    captures: list[Path], capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, _ = run(capsys, captures[2], *CORE, *SCALE, "--json", "-", "--frequency", "5 kHz")
    document = json.loads(out)
    (loop,) = document["captures"]
    exact = InventedMaterial().loop(DEMO_PEAKS[2])
    assert code == 0
    assert document["curve"] is None
    assert loop["readings"]["loss_per_cycle"] == pytest.approx(exact.loss_per_cycle, rel=0.01)
    assert loop["loss_density"] == pytest.approx(5e3 * exact.loss_per_cycle, rel=0.01)
    assert len(loop["field_strength"]) == len(loop["flux_density"]) == loop["samples_in_period"]
    assert max(loop["flux_density"]) == pytest.approx(exact.peak_flux_density, rel=0.01)


def test_several_captures_give_a_material_file_and_figures(
    captures: list[Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file, out_folder = tmp_path / "mine.toml", tmp_path / "deep" / "out"
    code, out, err = run(
        capsys, *captures, *CORE, *SCALE, "--material", file, "--temperature", "60 C",
        "--out", out_folder, "--json", tmp_path / "b.json",
    )  # fmt: skip
    assert (code, err) == (0, "")
    assert "normal curve" in out
    assert sorted(path.name for path in out_folder.iterdir()) == [
        "bench.json", "loop.png", "waveforms.png",
    ]  # fmt: skip
    assert (tmp_path / "b.json").read_text() == (out_folder / "bench.json").read_text()
    material = fm.read_material(file)
    assert material.name == "mine"
    assert 'temperature = "60 C"' in file.read_text()


def test_one_capture_gives_the_middle_of_its_loop_and_says_so(
    captures: list[Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, _ = run(capsys, captures[3], *CORE, *SCALE, "--material", tmp_path / "m.toml")
    assert code == 0
    assert "no normal curve" in out
    assert "no normal curve" in (tmp_path / "m.toml").read_text()


def test_a_core_of_the_catalogue_stands_for_section_and_path(
    captures: list[Path], capsys: pytest.CaptureFixture[str]
) -> None:
    turns = ["--drive-turns", "12", "--sense-turns", "12"]
    _, out, _ = run(capsys, captures[3], *turns, *SCALE, "--core", "P 22/13", "--json", "-")
    core = json.loads(out)["captures"][0]["core"]
    assert core["area"] == pytest.approx(63.4e-6)  # as published, references of the catalogue
    assert core["path_length"] == pytest.approx(31.5e-3)


def test_the_demo_is_called_invented_and_its_command_works(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "demo"
    code, out, err = run(capsys, "--demo", folder)
    assert (code, err) == (0, "")
    assert "The captures are invented" in out
    assert "invented" in (folder / "invented-material.toml").read_text()
    assert "Invented capture" in (folder / "invented-1.csv").read_text()
    command = shlex.split(out.split("gapfield bench ")[1])
    files = sorted(folder.glob("invented-*.csv"))
    again = tmp_path / "again.toml"
    code, second, _ = run(capsys, *files, *command[1:-1], again)
    assert code == 0
    assert second.split("Caution")[0] == out.split("Caution")[0]
    points = (folder / "invented-material.toml").read_text().split("[[curve]]")[1]
    assert again.read_text().split("[[curve]]")[1] == points
    assert run(capsys, "--demo", folder)[0] == 0
    (folder / "invented-1.csv").write_text("mine")
    code, _, err = run(capsys, "--demo", folder)
    assert code == 2
    assert "holds a capture of your own" in err
    assert (folder / "invented-1.csv").read_text() == "mine"


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        ([], "CAPTURE.csv: missing"),
        (["none.csv", *CORE], "none.csv: cannot be read"),
        (["{file}", *CORE], "is in V; accepted: a scale such as '10 A/V'"),
        (["{file}", *CORE[2:], *SCALE], "--drive-turns: missing"),
        (["{file}", *CORE[:2], *CORE[4:], *SCALE], "--sense-turns: missing"),
        (["{file}", *CORE[:4], *SCALE], "--area: missing; accepted: --area and --path, or --core"),
        (["{file}", *CORE[:6], *SCALE], "--path: missing"),
        (["{file}", *CORE, "--core", "P 22/13"], "--area: says the same as --core"),
        (["{file}", *CORE[:4], "--core", "P 99/99"], "--core = 'P 99/99': no core of this size"),
        (["{file}", "--drive-turns", "0", *CORE[2:]], "no number of turns"),
        (["{file}", *CORE[:5], "60 mm", *CORE[6:]], "--area = '60 mm': 'mm' is not a unit"),
        (["{file}", *CORE, *SCALE, "--frequency", "5"], "--frequency = '5': the unit is missing"),
        (["{file}", *CORE, *SCALE, "--frequency", "0 Hz"], "not above zero"),
        (["{file}", *CORE, *SCALE, "--frequency", "7 kHz"], "nothing repeats at 7000 Hz"),
        (["{file}", *CORE, *SCALE, "--temperature", "warm"], "not a temperature"),
        (["{file}", *CORE, *SCALE, "--out", "{file}"], "cannot be made a folder"),
        (["{file}", *CORE, *SCALE, "--json", "{folder}/no/b.json"], "cannot be written"),
        (["{file}", *CORE, "--current-scale", "1 A/V", "--current-column", "Sense voltage",
          "--voltage-column", "2"], "look swapped"),
        (["{file}", *CORE, *SCALE, "--material", "{file}"], "is a capture"),
        (["{file}", *CORE, *SCALE, "--json", "{file}"], "is a capture"),
        (["{file}", "--demo", "{folder}/d"], "stands beside captures of your own"),
    ],
)  # fmt: skip
def test_bad_calls_get_one_line_and_exit_code_2(
    captures: list[Path], capsys: pytest.CaptureFixture[str], arguments: list[str], text: str
) -> None:
    names = {"file": captures[3], "folder": captures[3].parent}
    code, out, err = run(capsys, *(part.format(**names) for part in arguments))
    assert (code, out) == (2, "")
    assert err.count("\n") == 1
    assert text in err
    assert sorted(captures[3].parent.iterdir()) == captures


def test_every_option_is_in_the_document_and_back() -> None:
    text = (Path(__file__).parents[2] / "docs" / "bench.md").read_text(encoding="utf-8")
    parameters = inspect.signature(bench_command).parameters
    options = {"--" + name.replace("_", "-") for name in parameters if name != "captures"}
    assert options == set(re.findall(r"`?(--[a-z][a-z-]*)", text))
