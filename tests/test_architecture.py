"""Imports run one way: each layer knows only those before it."""

import ast
from pathlib import Path

import pytest

import femag

ROOT = Path(femag.__file__).parent
LAYERS = (
    ("units", "errors", "line_search", "text_file", "csv_columns"),
    ("materials", "geometry", "ripple", "requirements"),
    ("bench",),
    ("part_tolerances",),
    ("hand", "design", "mesh"),
    ("design_file",),
    ("field",),
    ("quantities",),
    ("tolerance_budget",),
    ("result", "current_curve", "target_gap", "coupled_windings", "copper_distance", "environment"),
    ("design_slopes", "target_turns"),
    ("measured_inductance", "study", "requirement_checks"),
    ("review",),
    ("export",),
    ("plot",),
    ("answer_table", "tolerance_answer"),
    ("copper_answer", "loss_answer"),
    (
        "answer",
        "requirement_answer",
        "core_answer",
        "material_answer",
        "bench_answer",
        "curve_answer",
        "gap_answer",
        "winding_answer",
        "keep_out_answer",
        "study_answer",
    ),
    ("sheet",),
    ("command_output",),
    (
        "bench_command",
        "curve_command",
        "gap_command",
        "sheet_command",
        "winding_command",
        "keep_out_command",
        "machine_command",
        "study_command",
    ),
    ("cli",),
)
DEPTH = {name: depth for depth, layer in enumerate(LAYERS) for name in layer}
MODULES = sorted(path for path in ROOT.rglob("*.py") if path != ROOT / "__init__.py")


def subject(path: Path) -> str:
    return path.relative_to(ROOT).parts[0].removesuffix(".py")


def imported_subjects(path: Path) -> set[str]:
    found = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
        if isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import"
            names = [node.module or ""]
        found |= {name.split(".")[1] for name in names if name.startswith("femag.")}
    return found - {subject(path)}


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_no_import_runs_back(path: Path) -> None:
    own = DEPTH[subject(path)]
    same_layer = set(LAYERS[own])
    for other in imported_subjects(path):
        assert DEPTH[other] < own or other in same_layer, f"{path.name} imports {other}"


def test_one_module_touches_gmsh() -> None:
    users = [path.name for path in MODULES if "import gmsh" in path.read_text(encoding="utf-8")]
    assert users == ["mesh.py"]


def test_computing_never_plots() -> None:
    for path in MODULES:
        if "matplotlib" in path.read_text(encoding="utf-8"):
            assert subject(path) == "plot"
