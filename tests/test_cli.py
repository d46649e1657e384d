import json
import os
import pty
import shutil
import signal
import subprocess
import sys
from dataclasses import replace
from importlib.resources import files
from pathlib import Path

import pytest

import femag as fm
from femag import cli
from femag.field import adapt

SOURCES = Path(fm.__file__).parents[1]
DEMO = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")


@pytest.fixture
def design(tmp_path: Path) -> Path:
    file = tmp_path / "design.toml"
    file.write_text(DEMO)
    return file


def run(capsys: pytest.CaptureFixture[str], *arguments: object) -> tuple[int, str, str]:
    code = cli.main([str(argument) for argument in arguments])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def test_solve_prints_the_answer_in_80_columns(
    design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, err = run(capsys, "solve", design)
    assert (code, err) == (0, "")
    assert max(len(line) for line in out.splitlines()) <= 80
    assert "\x1b" not in out
    result = fm.solve(fm.read_design(design))
    lower, upper = str(result.inductance).split("(")[1].rstrip(")").split(" .. ")
    assert f"between {lower} and {upper}" in out
    for text in ("apparent", "incremental", "fringing factor", "refinements", "Caution"):
        assert text in out
    for row in result.hand:
        (line,) = [line for line in out.splitlines() if line.startswith(row.estimate.name + " ")]
        assert f"{row.error:+.1%}" in line
        assert (" yes " if row.estimate.in_range else " no ") in line
    for mean in result.section_means:
        assert f"{mean.flux_density:.4f}" in out


def test_json_on_standard_output_is_nothing_but_json(
    design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, _ = run(capsys, "solve", design, "--json", "-", "--current", "500 mA")
    document = json.loads(out)
    assert code == 0
    assert document["current"] == 0.5
    assert document["inductance"]["lower"] < document["inductance"]["upper"]


def test_out_writes_json_and_two_figures(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "deep" / "answer"
    code, out, _ = run(capsys, "solve", design, "--out", folder, "--json", tmp_path / "r.json")
    assert code == 0
    assert sorted(file.name for file in folder.iterdir()) == [
        "gap.png",
        "result.json",
        "section.png",
    ]
    assert str(folder) in out
    one, two = fm.read_result(folder / "result.json"), fm.read_result(tmp_path / "r.json")
    assert one == two


@pytest.fixture(scope="module")
def demo_folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("left") / "demo"
    assert cli.main(["demo", "--out", str(folder)]) == 0
    return folder


def test_demo_leaves_a_design_to_start_from(demo_folder: Path) -> None:
    design = fm.read_design(demo_folder / "design.toml")
    assert fm.read_result(demo_folder / "result.json").design == design


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        (["solve", "none.toml"], "none.toml: cannot be read (No such file or directory)"),
        (["solve", "{design}", "--current", "3"], "--current = '3': the unit is missing"),
        (["solve", "{design}", "--current", "3 mm"], "'mm' is not a unit of this quantity"),
        (["solve", "{design}", "--json", "{folder}/no/r.json"], "cannot be written"),
        (["solve", "{design}", "--out", "{design}"], "is no folder"),
        (["solve", "{design}", "--json", ""], "--json = '': cannot be written"),
        (["solve", "{design}", "--json", "{folder}"], "cannot be written"),
        (["solve", "{design}", "--json", "{design}"], "is the design itself"),
        (["solve"], "Missing argument"),
        (["sovle", "{design}"], "sovle"),
        (["solve", "{design}", "--jason", "-"], "--jason"),
    ],
)
def test_bad_calls_get_one_line_and_exit_code_2(
    design: Path, capsys: pytest.CaptureFixture[str], arguments: list[str], text: str
) -> None:
    filled = [part.format(design=design, folder=design.parent) for part in arguments]
    code, out, err = run(capsys, *filled)
    assert (code, out) == (2, "")
    assert err.count("\n") == 1
    assert err.startswith("gapfield: ")
    assert text in err
    assert list(design.parent.iterdir()) == [design]


def test_a_bad_design_leaves_nothing_behind(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    design.write_text(DEMO.replace('length = "0.6 mm"', 'length = "60 mm"'))
    code, out, err = run(
        capsys, "solve", design, "--json", tmp_path / "r.json", "--out", tmp_path / "o"
    )
    assert (code, out) == (2, "")
    assert err == (
        f"gapfield: {design}: gap.length = '60 mm': the gap is longer than the post; "
        "accepted: less than the window height, 13.2 mm\n"
    )
    assert list(tmp_path.iterdir()) == [design]


def test_a_tolerance_out_of_reach_exits_with_3_and_its_bracket(
    design: Path,
    tmp_path: Path,
    capsys: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(adapt, "MAXIMUM_UNKNOWNS", 4_000)
    design.write_text(DEMO.replace("tolerance = 1e-3", "tolerance = 1e-6"))
    code, out, err = run(capsys, "solve", design, "--json", tmp_path / "r.json")
    assert (code, out) == (3, "")
    assert err.count("\n") == 1
    assert "tolerance 1e-06 not reached" in err
    assert "uH (" in err
    assert list(tmp_path.iterdir()) == [design]


def test_nothing_is_left_when_one_of_the_files_cannot_be_written(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    os.mkfifo(tmp_path / "pipe")
    code, out, err = run(
        capsys, "solve", design, "--out", tmp_path / "o", "--json", tmp_path / "pipe"
    )
    assert (code, out) == (2, "")
    assert "pipe: is no regular file" in err
    assert sorted(file.name for file in tmp_path.iterdir()) == ["design.toml", "pipe"]


def test_a_link_is_written_through(
    design: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "target.json").write_text("old")
    (tmp_path / "link.json").symlink_to(tmp_path / "target.json")
    assert run(capsys, "solve", design, "--json", tmp_path / "link.json")[0] == 0
    assert (tmp_path / "link.json").is_symlink()
    assert fm.read_result(tmp_path / "target.json").current == 4.0


def test_demo_runs_again_and_keeps_a_design_that_was_changed(
    demo_folder: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "demo"
    shutil.copytree(demo_folder, folder)
    code, out, _ = run(capsys, "demo", "--out", folder)
    assert code == 0
    assert "(invented)" in out
    own = DEMO.replace("turns = 36", "turns = 40")
    (folder / "design.toml").write_text(own)
    code, out, err = run(capsys, "demo", "--out", folder)
    assert (code, out) == (2, "")
    assert "holds a design of your own" in err
    assert (folder / "design.toml").read_text() == own


def test_saturated_cores_come_with_a_word_about_the_hand_formulas(
    design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    _, calm, _ = run(capsys, "solve", design)
    _, saturated, _ = run(capsys, "solve", design, "--current", "100 A")
    assert "the core saturates" not in calm
    assert "the core saturates" in saturated


@pytest.mark.parametrize(
    ("shell", "code"),
    [
        ("{run} solve {design} > /dev/full", 2),
        ("{run} solve {design} >&-", 0),
        ("{run} solve {design} --json - 2>&-", 0),
        ("COLUMNS=0 {run} solve {design}", 0),
        ("PYTHONIOENCODING=ascii {run} solve {design}", 0),
    ],
)
def test_odd_terminals_get_no_traceback(design: Path, shell: str, code: int) -> None:
    design.write_text(DEMO.replace("(invented)", "für Öl Ω"), encoding="utf-8")
    program = f"{sys.executable} -m femag.cli"
    done = subprocess.run(
        shell.format(run=program, design=design), shell=True, capture_output=True, text=True
    )
    assert done.returncode == code
    assert "Traceback" not in done.stderr
    assert done.stderr.count("\n") <= 1
    if "json" in shell or "COLUMNS" in shell or "ascii" in shell:
        assert "inductance" in done.stdout


def test_help_and_version_leave_with_0(capsys: pytest.CaptureFixture[str]) -> None:
    for arguments in ([], ["--help"], ["solve", "--help"], ["demo", "--help"], ["--version"]):
        code, out, err = run(capsys, *arguments)
        assert (code, err) == (0, "")
        assert out.strip()


def test_help_imports_no_library_behind_the_numbers() -> None:
    code = (
        "import sys; from femag.cli import main; main(['--help']); "
        "print(sorted({'numpy', 'gmsh', 'skfem', 'matplotlib', 'pint', 'pydantic', 'scipy'} "
        "& set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-1] == "[]"


HELD_AT_FIRST_REFINEMENT = """
import sys, time
from femag import cli, result
solved = result.adapted_solution
def held(solution):
    print("solved once", flush=True)
    time.sleep(600)
def adapted(problem, current, tolerance, progress, mesh):
    return solved(problem, current, tolerance, held, mesh)
result.adapted_solution = adapted
sys.exit(cli.main(sys.argv[1:]))
"""


def test_interrupt_ends_cleanly(design: Path) -> None:
    process = subprocess.Popen(
        [sys.executable, "-c", HELD_AT_FIRST_REFINEMENT, "solve", str(design), "--json", "r.json"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        cwd=design.parent,
    )
    assert process.stdout is not None
    assert process.stdout.readline() == "solved once\n"
    process.send_signal(signal.SIGINT)
    out, err = process.communicate()
    assert (process.returncode, out, err) == (130, "", "gapfield: stopped\n")
    assert list(design.parent.iterdir()) == [design]


def test_progress_shows_on_a_terminal(design: Path) -> None:
    try:
        terminal, ours = pty.openpty()
    except OSError as error:
        pytest.skip(f"no pseudo-terminal here: {error}")
    design.write_text(DEMO.replace("tolerance = 1e-3", "tolerance = 1e-6"))
    process = subprocess.Popen(
        [sys.executable, "-m", "femag.cli", "solve", str(design), "--json", "r.json"],
        stdout=subprocess.PIPE,
        stderr=ours,
        text=True,
        cwd=design.parent,
        env=os.environ | {"TERM": "xterm", "COLUMNS": "80"},
    )
    os.close(ours)
    shown = b""
    while b"unknowns" not in shown:
        try:
            shown += os.read(terminal, 4096)
        except OSError:
            break
    process.kill()
    process.communicate()
    assert b"uH (" in shown


def test_cores_lists_filters_and_shows_one(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, out, err = run(capsys, "cores")
    assert (code, err) == (0, "")
    assert max(len(line) for line in out.splitlines()) <= 80
    assert "P 22/13" in out
    assert "memory" in out
    _, some, _ = run(capsys, "cores", "P 2")
    assert "P 26/16" in some
    assert "P 36/22" not in some
    code, one, _ = run(capsys, "cores", "p36/22", "--out", tmp_path / "core.png")
    assert code == 0
    for text in ("IEC 63093-2", "35.000", "36.200", "35.600", "memory", "data sheet", "0.26"):
        assert text in one
    assert (tmp_path / "core.png").stat().st_size > 10_000


def test_drawing_several_cores_into_one_file_is_refused(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, _, err = run(capsys, "cores", "P 2", "--out", tmp_path / "core.png")
    assert code == 2
    assert "2 cores are meant" in err
    assert not list(tmp_path.iterdir())


def test_missing_system_libraries_of_gmsh_are_one_line(design: Path, tmp_path: Path) -> None:
    """A stand-in for gmsh that fails as the wheel does without libGLU."""
    stand_in = tmp_path / "path"
    stand_in.mkdir()
    (stand_in / "gmsh.py").write_text("raise OSError('libGLU.so.1: cannot open shared object')\n")
    done = subprocess.run(
        [sys.executable, "-m", "femag.cli", "solve", str(design), "--json", "r.json"],
        capture_output=True,
        text=True,
        cwd=tmp_path,
        env=os.environ | {"PYTHONPATH": os.pathsep.join((str(stand_in), str(SOURCES)))},
    )
    assert (done.returncode, done.stdout) == (3, "")
    assert done.stderr.count("\n") == 1
    assert "on Debian or Ubuntu install libgl1 libglu1-mesa" in done.stderr
    assert not (tmp_path / "r.json").exists()


def test_the_caution_names_the_energy_that_is_stored(
    design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    _, out, _ = run(capsys, "solve", design)
    assert "Caution: about 3.1 mJ is stored at 4 A" in out


def test_materials_are_listed_with_their_sources(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["materials"]) == 0
    printed = capsys.readouterr().out
    for material in fm.material_library():
        assert f"{material.name}: " in " ".join(printed.split())
        assert material.source.split()[0] in printed
    assert all(len(line) <= 80 for line in printed.splitlines())


def test_a_closed_pipe_costs_the_demo_no_file(tmp_path: Path) -> None:
    folder = tmp_path / "demo"
    command = [sys.executable, "-m", "femag.cli", "demo", "--out", str(folder)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        assert process.stdout is not None
        process.stdout.close()
        assert process.wait(60) in (0, -signal.SIGPIPE)
    assert {file.name for file in folder.iterdir()} == {"design.toml", *cli.FOLDER_FILES}


def test_samples_of_tolerances_stand_beside_the_budget(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file, answer = tmp_path / "d.toml", tmp_path / "r.json"
    parts = fm.PartTolerances(gap=1e-5, permeability=0.25)
    design = replace(pot_26_16, part_tolerances=parts, tolerance=4e-3)
    file.write_text(fm.design_toml(design))
    assert cli.main(["solve", str(file), "--sample", "6", "--json", str(answer)]) == 0
    assert "6 samples" in capsys.readouterr().out
    document = json.loads(answer.read_text())
    sampled = document["sampled"]
    assert sampled["samples"] == 6
    assert sampled["lowest"] < document["inductance"]["value"] < sampled["highest"]
    assert sampled["standard_deviation"] == pytest.approx(
        sampled["linear_standard_deviation"], rel=0.05
    )
    assert fm.read_result(answer).inductance.lower == document["inductance"]["lower"]
    file.write_text(fm.design_toml(pot_26_16))
    assert cli.main(["solve", str(file), "--sample", "6"]) == 2
    assert "--sample = 6: the design has no tolerances" in capsys.readouterr().err
