"""``gapfield report`` and ``gapfield check``."""

import ctypes
import os
import subprocess
import sys
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

import pytest

import validation.__main__
from femag import cli
from femag.environment import SYSTEM_LIBRARIES, environment
from validation.rows import Digits, plain_row


def lines_of(text: str) -> dict[str, str]:
    return dict(line.split(maxsplit=1) for line in text.splitlines())


def test_the_report_names_every_library_and_no_user(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["report"]) == 0
    printed = capsys.readouterr().out
    lines = lines_of(printed)
    for name in ("gapfield", "numpy", "scipy", "scikit-fem", "gmsh", "matplotlib", "pydantic"):
        assert lines[name] == version(name)
    assert lines["meshing"] == "works"
    assert sys.version.split()[0] in lines["python"]
    assert str(Path.home()) not in printed
    assert str(Path.cwd()) not in printed


def test_the_report_works_without_the_system_libraries_of_gmsh(tmp_path: Path) -> None:
    """A stand-in for gmsh that fails as the wheel does without libGLU."""
    (tmp_path / "gmsh.py").write_text("raise OSError('libGLU.so.1: cannot open shared object')\n")
    path = os.pathsep.join([str(tmp_path), os.environ.get("PYTHONPATH", "")])
    done = subprocess.run(
        [sys.executable, "-m", "femag.cli", "report"],
        capture_output=True,
        text=True,
        env=os.environ | {"PYTHONPATH": path},
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert "libGLU.so.1: cannot open shared object" in lines_of(done.stdout)["meshing"]
    assert "numpy" in lines_of(done.stdout)


@pytest.mark.skipif(sys.platform != "linux", reason="gmsh's libraries are listed on Linux only")
def test_what_is_missing_is_named_with_its_package(monkeypatch: pytest.MonkeyPatch) -> None:
    def absent(name: str) -> None:
        raise OSError(f"{name}: cannot open shared object file")

    def not_installed(name: str) -> str:
        if name == "gmsh":
            raise PackageNotFoundError(name)
        return "1"

    monkeypatch.setattr(ctypes, "CDLL", absent)
    monkeypatch.setattr("femag.environment.version", not_installed)
    found = environment()
    assert found.versions["gmsh"] == "missing"
    assert found.versions["numpy"] == "1"
    for name, package in SYSTEM_LIBRARIES.items():
        assert found.system_libraries[name].endswith(f"install {package}")


def test_check_prints_the_rows_of_a_folder(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["check", "uniform_field"]) == 0
    printed = capsys.readouterr().out
    assert "uniform_field" in printed
    assert "air_coils" not in printed
    assert "10 rows, 0 failed" in printed


def test_check_runs_all_folders_by_default_and_returns_1_when_a_row_fails(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    asked = []

    def one_bad_row(folder: str) -> tuple[object, ...]:
        asked.append(folder)
        return (plain_row("bad", "L", Digits(1.0, 0.0), 1.002, "H", 1e-3, "s"),)

    monkeypatch.setattr("validation.__main__.folder_rows", one_bad_row)
    assert cli.main(["check"]) == 1
    assert asked == list(validation.__main__.FOLDERS)
    assert "FAIL" in capsys.readouterr().out


def test_an_unknown_folder_is_refused_in_one_line(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["check", "nowhere"]) == 2
    error = capsys.readouterr().err
    assert error.startswith("gapfield: FOLDER = 'nowhere': ")
    assert "uniform_field, air_coils" in error
    assert error.count("\n") == 1
