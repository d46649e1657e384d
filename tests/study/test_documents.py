"""What the documents say of studies: their examples, and the worked one with its errors."""

import re
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm

ROOT = Path(__file__).parents[2]
STUDY = ROOT / "docs/fringing-study/study.toml"
BANDS = (0.01, 0.03, 0.1, 0.2, 0.4)
"""Upper ends of gap over post diameter of the columns in the document."""


def test_the_documented_study_has_the_cases_that_are_said() -> None:
    study = fm.read_study(STUDY)
    assert len(study) == 540
    study.plan.check()
    assert "540 cases" in (ROOT / "docs/fringing-study.md").read_text(encoding="utf-8")


def test_only_ratios_matter_for_a_linear_core() -> None:
    design = replace(fm.read_design(STUDY.with_name("post.toml")), tolerance=0.02)
    sizes = {name: 2 * length for name, length in design.core.sizes.items()}
    larger = replace(design, core=fm.PotCore(**sizes), gaps=(fm.Gap(2 * design.gaps[0].length),))
    one, other = fm.solve(design), fm.solve(larger)
    assert other.fringing_factor == pytest.approx(one.fringing_factor, rel=1e-9)
    assert other.inductance.value == pytest.approx(2 * one.inductance.value, rel=1e-9)


def blocks(kind: str) -> list[str]:
    text = (ROOT / "docs/studies.md").read_text(encoding="utf-8")
    return re.findall(rf"```{kind}\n(.*?)```", text, re.DOTALL)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    base = STUDY.with_name("post.toml").read_text(encoding="utf-8")
    (tmp_path / "design.toml").write_text(base + "\n[solve]\ntolerance = 0.1\n")
    return tmp_path


@pytest.mark.parametrize(("place", "cases"), [(0, 3 * 20 * 2), (1, 256)])
def test_study_files_in_the_document_are_studies(folder: Path, place: int, cases: int) -> None:
    (folder / "study.toml").write_text(blocks("toml")[place])
    assert len(fm.read_study(folder / "study.toml")) == cases


@pytest.mark.slow
def test_python_in_the_document_runs(folder: Path) -> None:
    pytest.importorskip("pandas")
    pytest.importorskip("xarray")
    (folder / "script.py").write_text(blocks("python")[0])
    command = [sys.executable, "script.py"]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=True)
    assert "inductance.value" in done.stdout
    assert "gap.length" in done.stdout


@pytest.mark.slow
def test_a_script_without_a_guard_is_told_so(folder: Path) -> None:
    (folder / "script.py").write_text(
        'import femag as fm\nfm.Study("design.toml", {"gap.length": [1e-3, 2e-3]}).run(workers=1)\n'
    )
    command = [sys.executable, "script.py"]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False)
    assert done.returncode != 0
    assert "worker processes do not start; a script that runs a study needs" in done.stderr


def documented() -> list[dict[str, list[tuple[float, float]]]]:
    """Return lowest and highest error of each formula in each column of both tables, per cent."""
    text = (ROOT / "docs/fringing-study.md").read_text(encoding="utf-8")
    tables: list[dict[str, list[tuple[float, float]]]] = []
    for line in text.splitlines():
        if line.startswith("| formula"):
            tables.append({})
        cells = [cell.strip() for cell in line.split("|")[1:-1]]
        spans = [re.fullmatch(r"([+-][\d.]+) to ([+-][\d.]+)", cell) for cell in cells[1:]]
        if spans and all(spans):
            tables[-1][cells[0]] = [(float(s[1]), float(s[2])) for s in spans if s]
    return tables


@pytest.mark.slow
def test_the_documented_errors_are_those_of_the_study() -> None:
    columns = fm.read_study(STUDY).run().columns
    assert set(columns["state"]) == {"done"}
    gap, height, post, hole = (
        np.array(columns[name])
        for name in ("shape.gap", "shape.window_height", "shape.post_diameter",
                     "core.dimensions.hole_diameter")
    )  # fmt: skip
    high = height / post > 0.99
    band = np.searchsorted(1.001 * np.array(BANDS), gap / post)
    for table, chosen in zip(
        documented(), (high & (hole == 0.0), high & (hole > 0.0)), strict=True
    ):
        assert len(table) == 8
        for formula, spans in table.items():
            error = 100 * np.array(columns[f"hand.error.{formula}"])
            for column, (lowest, highest) in enumerate(spans):
                inside = error[chosen & (band == column)]
                assert inside.min() == pytest.approx(lowest, abs=0.051)
                assert inside.max() == pytest.approx(highest, abs=0.051)
