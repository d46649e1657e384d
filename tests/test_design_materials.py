"""The key core.material of design files."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design import design_hash
from femag.design_file import design_document, design_from_document, design_from_toml
from femag.export.result_file import read_result, write_result

TEXT = """\
[core]
size = "P 26/16"
material = "mnzn-power-25C"
[[gap]]
length = "0.5 mm"
[[winding]]
turns = 50
"""
NAMED = 'material = "mnzn-power-25C"'
CSV = "H [A/m],B [T]\n25,0.09\n50,0.18\n100,0.28\n250,0.38\n250,0.381\n"


def with_material(value: str) -> str:
    return TEXT.replace(NAMED, f"material = {value}")


@pytest.mark.parametrize(
    ("value", "name", "temperature"),
    [
        ('"mnzn-power-25C"', "mnzn-power", 25.0),
        ('"mnzn-power-60C"', "mnzn-power", 60.0),
        ('{ name = "mnzn-power", temperature = "60 C" }', "mnzn-power", 60.0),
        ('"silicon-steel"', "silicon-steel", None),
        ('{ name = "powder-60" }', "powder-60", None),
    ],
)
def test_a_library_material_by_name(value: str, name: str, temperature: float | None) -> None:
    assert design_from_toml(with_material(value)).material == fm.material(name, temperature)


def test_the_path_of_a_material_is_against_the_design_file(tmp_path: Path) -> None:
    (tmp_path / "data").mkdir()
    (tmp_path / "data/sheet.csv").write_text(CSV)
    (tmp_path / "design.toml").write_text(with_material('"data/sheet.csv"'))
    (tmp_path / "other.toml").write_text(with_material('{ file = "data/sheet.csv" }'))
    design = fm.read_design(tmp_path / "design.toml")
    assert design.material == fm.material(str(tmp_path / "data/sheet.csv"))
    assert design.material.notes
    assert fm.read_design(tmp_path / "other.toml") == design


def test_a_material_file_has_temperatures(tmp_path: Path) -> None:
    points = "points = [[25, 0.1], [50, 0.2], [100, 0.3]]\n"
    head = 'name = "x"\nsource = "y"\nunits = { field_strength = "A/m", flux_density = "T" }\n'
    curves = "".join(f'[[curve]]\ntemperature = "{t} C"\n{points}' for t in (25, 100))
    (tmp_path / "my.toml").write_text(head + curves)
    value = '{ file = "my.toml", temperature = "60 C" }'
    (tmp_path / "design.toml").write_text(with_material(value))
    assert fm.read_design(tmp_path / "design.toml").material.name == "x at 60 C"
    (tmp_path / "design.toml").write_text(with_material('"my.toml"'))
    with pytest.raises(fm.InputError) as caught:
        fm.read_design(tmp_path / "design.toml")
    assert caught.value.key == "core.material.temperature"


@pytest.mark.parametrize(
    "curve",
    [
        fm.material("mnzn-power-25C"),
        fm.material("mnzn-power-60C"),
        fm.material("powder-60"),
        fm.TabulatedCurve(((1.0, 1 / 300), (2.0, 2 / 300), (1e5 / 3, 0.5)), notes=("a", "b")),
    ],
    ids=["library", "between", "powder", "own"],
)
def test_out_and_in_is_the_same_design(curve: fm.TabulatedCurve, tmp_path: Path) -> None:
    design = replace(design_from_toml(TEXT), material=curve)
    again = design_from_toml(fm.design_toml(design))
    assert again == design
    assert again.material.notes == curve.notes
    assert design_hash(again) == design_hash(design)
    assert design_from_document(design_document(design)) == design


def test_a_result_file_holds_its_material(tmp_path: Path) -> None:
    result = fm.solve(design_from_toml(TEXT), tolerance=0.01)
    write_result(result, tmp_path / "result.json")
    assert read_result(tmp_path / "result.json").design == result.design


def test_the_hash_sees_points_and_no_text() -> None:
    design = design_from_toml(TEXT)
    own = design_hash(design)
    renamed = fm.TabulatedCurve(design.material.points, "other", "elsewhere", ("note",))
    assert design_hash(replace(design, material=renamed)) == own
    h, b = design.material.points[-1]
    moved = fm.TabulatedCurve((*design.material.points[:-1], (h, np.nextafter(b, 1.0))))
    assert design_hash(replace(design, material=moved)) != own


BAD = [
    ('"mnzn-pwer"', "core.material = 'mnzn-pwer': no material of this name; accepted: mnzn-power"),
    ('"mnzn-power"', "core.material.temperature: mnzn-power has curves at several temperatures"),
    ('"mnzn-power-120C"', "core.material.temperature = '120 C': out of the range of mnzn-power"),
    (
        '{ name = "mnzn-power", temperature = "60 K" }',
        "core.material.temperature = '60 K': not a temperature",
    ),
    (
        '{ name = "nizn", saturation = "1 T" }',
        "core.material.saturation = '1 T': does not go with name",
    ),
    (
        '{ permeability = 20, temperature = "25 C" }',
        "does not go with permeability; accepted: beside",
    ),
    ('{ saturation = "1 T" }', "core.material: nothing says what the material is"),
    ("{}", "core.material: nothing says what the material is"),
    ("5", "core.material = 5: not usable; accepted: a name such as 'mnzn-power-25C'"),
    ('{ points = [["1 A/m", "0.1 T"]] }', "core.material.points: too few points: 1"),
    ("{ points = [[1, 0.1]] }", "core.material.points = [1, 0.1]: the unit is missing"),
    ('{ points = [["1 A/m"]] }', "core.material.points = ['1 A/m']: not a pair of H and B"),
    (
        '{ points = [["1 A/m", "0.1 T"], ["2 A/m", "0.3 T"], ["3 A/m", "0.2 T"]] }',
        "core.material.points: B falls near H = 3 A/m",
    ),
    ('{ file = "x.csv", source = "y" }', "core.material.source = 'y': does not go with file"),
]


@pytest.mark.parametrize(("value", "line"), BAD, ids=[value for value, _ in BAD])
def test_a_bad_material_gets_one_line(value: str, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(with_material(value), "design.toml")
    assert str(caught.value).startswith("design.toml: ")
    assert line in str(caught.value)
    assert "\n" not in str(caught.value)


def test_what_is_wrong_in_a_material_file_names_that_file(tmp_path: Path) -> None:
    (tmp_path / "sheet.csv").write_text("H,B\n1,2\n")
    (tmp_path / "design.toml").write_text(with_material('"sheet.csv"'))
    with pytest.raises(fm.InputError) as caught:
        fm.read_design(tmp_path / "design.toml")
    assert str(caught.value).startswith(f"{tmp_path / 'sheet.csv'}: header = 'H': the unit is")
