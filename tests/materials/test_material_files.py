import re
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.materials import TabulatedCurve
from femag.units import MU_0

TOML = """\
name = "my ferrite"
source = "invented"
[units]
field_strength = "A/m"
flux_density = "T"
[[curve]]
temperature = "100 C"
points = [[25, 0.15], [50, 0.23], [100, 0.29], [250, 0.335], [500, 0.355], [1200, 0.39]]
[[curve]]
temperature = "25 C"
points = [[25, 0.09], [50, 0.18], [100, 0.28], [250, 0.38], [500, 0.43], [1200, 0.49]]
"""
CSV = "H [A/m],B [T]\n25,0.09\n50,0.18\n100,0.28\n250,0.38\n"
POINTS = ((25.0, 0.09), (50.0, 0.18), (100.0, 0.28), (250.0, 0.38))
OERSTED = 1000.0 / (4.0 * np.pi)
"""A/m; exact in the system of units where mu0 = 4e-7 pi."""


def curve_of(folder: Path, text: str, name: str = "sheet.csv") -> TabulatedCurve:
    (folder / name).write_text(text, encoding="utf-8")
    return fm.material(str(folder / name))


def assert_points(curve: TabulatedCurve, points=POINTS) -> None:
    np.testing.assert_allclose(curve.points[1:], points, rtol=1e-12)


def test_a_toml_file_gives_its_curves_in_order(tmp_path: Path) -> None:
    (tmp_path / "my.toml").write_text(TOML, encoding="utf-8")
    material = fm.read_material(tmp_path / "my.toml")
    assert (material.name, material.source) == ("my ferrite", "invented")
    assert material.temperatures == (25.0, 100.0)
    cold = fm.material(str(tmp_path / "my.toml"), 25.0)
    assert cold == material.curves[0][1]
    assert cold.points[-1] == (1200.0, 0.49)
    assert cold.label.startswith("my ferrite at 25 C (invented), initial permeability 2865")


@pytest.mark.parametrize(
    ("field", "density", "h_unit", "b_unit"),
    [
        ("Oe", "G", OERSTED, 1e-4),
        ("kA/m", "mT", 1e3, 1e-3),
        ("A/cm", "kG", 1e2, 0.1),
        ("Oe", "T", OERSTED, 1.0),
    ],
)
def test_units_do_not_matter(
    tmp_path: Path, field: str, density: str, h_unit: float, b_unit: float
) -> None:
    rows = [(h / h_unit, b / b_unit) for h, b in POINTS]
    toml = (
        TOML[: TOML.index("[[curve]]")]
        .replace('"A/m"', f'"{field}"')
        .replace('"T"', f'"{density}"')
        + f"[[curve]]\npoints = {[list(row) for row in rows]}\n"
    )
    csv = f"H ({field});B ({density})\n" + "\n".join(f"{h!r};{b!r}" for h, b in rows)
    h = np.geomspace(1.0, 1e5, 100)
    expected = TabulatedCurve(POINTS).flux_density(h)
    for name, text in (("my.toml", toml), ("my.csv", csv)):
        curve = curve_of(tmp_path, text, name)
        np.testing.assert_allclose(curve.flux_density(h), expected, rtol=1e-11)


@pytest.mark.parametrize(("kind", "fence"), [("toml", "toml"), ("csv", "text")])
def test_files_in_the_document_are_materials(tmp_path: Path, kind: str, fence: str) -> None:
    text = (Path(__file__).parents[2] / "docs/materials.md").read_text(encoding="utf-8")
    (block,) = re.findall(rf"```{fence}\n(.*?)```", text, re.DOTALL)
    curve = curve_of(tmp_path, block, f"my.{kind}")
    assert curve.source == "data sheet, page 3"
    assert curve.points[1] == pytest.approx((25.0, 0.09), rel=1e-3)


def test_points_may_carry_their_units(tmp_path: Path) -> None:
    texts = [[f"{h!r} A/m", f"{1e4 * b!r} G"] for h, b in POINTS]
    text = f'name = "x"\nsource = "y"\n[[curve]]\npoints = {texts}\n'
    assert_points(curve_of(tmp_path, text, "my.toml"))


def test_between_temperatures_b_is_the_mean_at_equal_h(tmp_path: Path) -> None:
    (tmp_path / "my.toml").write_text(TOML, encoding="utf-8")
    material = fm.read_material(tmp_path / "my.toml")
    middle = material.at(62.5)
    h = np.array([25.0, 50.0, 100.0, 250.0, 500.0, 1200.0])
    ends = [material.at(t).flux_density(h) for t in (25.0, 100.0)]
    np.testing.assert_allclose(middle.flux_density(h), np.mean(ends, axis=0), rtol=1e-12)
    assert middle.name == "my ferrite at 62.5 C"
    assert middle.notes == ("B interpolated between 25 C and 100 C at equal H",)
    saturations = [material.at(t).saturation for t in (25.0, 62.5, 100.0)]
    assert saturations[0] > saturations[1] > saturations[2]


@pytest.mark.parametrize("temperature", [25.0, 100.0])
def test_the_curve_changes_steadily_with_temperature(tmp_path: Path, temperature: float) -> None:
    (tmp_path / "my.toml").write_text(TOML, encoding="utf-8")
    material = fm.read_material(tmp_path / "my.toml")
    inside = temperature + np.sign(62.5 - temperature) * 1e-4
    h = np.geomspace(1.0, 1e4, 200)
    change = material.at(inside).flux_density(h) - material.at(temperature).flux_density(h)
    assert np.max(np.abs(change)) < 1e-6


@pytest.mark.parametrize("temperature", [24.9, 100.1, -40.0])
def test_outside_of_the_temperatures_is_refused(tmp_path: Path, temperature: float) -> None:
    (tmp_path / "my.toml").write_text(TOML, encoding="utf-8")
    with pytest.raises(
        fm.InputError, match="out of the range of my ferrite; accepted: 25 C to 100 C"
    ):
        fm.material(str(tmp_path / "my.toml"), temperature)
    with pytest.raises(fm.InputError, match="curves at several temperatures"):
        fm.material(str(tmp_path / "my.toml"))


def test_data_without_a_temperature_take_none(tmp_path: Path) -> None:
    (tmp_path / "sheet.csv").write_text(CSV, encoding="utf-8")
    with pytest.raises(fm.InputError, match="no temperature, since the data have none"):
        fm.material(str(tmp_path / "sheet.csv"), 25.0)


BAD_TOML = [
    ('name = "my ferrite"\n', "", "name: missing; accepted: one line of text in quotes"),
    ('source = "invented"', "source = 3", "source = 3: not a text"),
    ("name =", "nmae =", "nmae: unknown key; accepted: nearest known key: 'name'"),
    ("flux_density =", "flux =", "units.flux: unknown key; accepted: nearest known key"),
    ('flux_density = "T"\n', "", "curve.points: the unit of the flux density is missing"),
    ('"A/m"', '"A"', "units.field_strength = 'A': 'A' is not a unit of this quantity"),
    ('"T"', '"teslla"', "units.flux_density = 'teslla': unknown unit"),
    ("[25, 0.15]", '["25 A/m", 0.15]', "curve.points: some points have units and some have none"),
    ("[25, 0.15]", "[25]", "curve.points = [25]: not a pair"),
    ("[25, 0.15]", "[25, true]", "curve.points = True: not a number"),
    ("[25, 0.09]", "[25, 0.20]", "curve.1.points: B falls near H = 25 A/m"),
    ('"25 C"', '"298 K"', "curve.1.temperature = '298 K': not a temperature"),
    ('"25 C"', '"100 C"', "curve.temperature: several curves without a temperature each"),
    ('temperature = "25 C"\n', "", "curve.temperature: several curves without a temperature each"),
    ("temperature =", "temp =", "curve.temp: unknown key; accepted: nearest known key"),
    ("[[curve]]", "[[curves]]", "curves: unknown key; accepted: nearest known key: 'curve'"),
    ("[units]", "units", "not valid TOML"),
    ('"invented"', '"in\\nvented"', "source = 'in\\nvented': not a text"),
    ('"invented"', '"invented"\npowder = {}', "curve: stands beside a powder"),
]


@pytest.mark.parametrize(("good", "bad", "line"), BAD_TOML, ids=[line for *_, line in BAD_TOML])
def test_a_bad_toml_file_gets_one_line(tmp_path: Path, good: str, bad: str, line: str) -> None:
    file = tmp_path / "my.toml"
    file.write_text(TOML.replace(good, bad), encoding="utf-8")
    with pytest.raises(fm.InputError) as caught:
        fm.material(str(file), 60.0)
    assert f"{file}: {line}" in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    "text",
    [
        CSV,
        CSV.replace(",", ";"),
        CSV.replace(",", "\t"),
        CSV.replace(",", " , "),
        CSV.replace(",", ";").replace(".", ","),
        CSV.replace(",", "\t").replace(".", ","),
        "\ufeff" + CSV.replace("\n", "\r\n"),
        CSV.replace("H [A/m]", "Field strength (A/m)").replace("B [T]", "FLUX DENSITY in T"),
        CSV.replace("H [A/m]", "H / (A/m)").replace("B [T]", "B/T"),
        CSV.replace("H [A/m]", '"magnetic_field_strength [A/m]"'),
        "# measured by nobody\n\n" + CSV.replace("\n50", "\n# a comment\n50"),
        "B [T],H [A/m]\n0.09,25\n0.18,50\n.28,1e2\n0.38,+250.\n",
        "H [A/m];B [mT]\n25;90\n50;180\n100;280\n250;380\n",
    ],
)
def test_csv_variants_give_the_same_points(tmp_path: Path, text: str) -> None:
    curve = curve_of(tmp_path, text)
    assert_points(curve)
    assert (curve.name, curve.source, curve.notes) == ("sheet", "source not stated", ())


def test_comments_may_state_name_and_source(tmp_path: Path) -> None:
    curve = curve_of(tmp_path, "# Name: grade X\n# source: data sheet, page 3\n" + CSV)
    assert (curve.name, curve.source) == ("grade X", "data sheet, page 3")


def test_a_column_of_polarisation_is_turned_into_b_and_said(tmp_path: Path) -> None:
    rows = "\n".join(f"{h},{b - MU_0 * h!r}" for h, b in POINTS)
    curve = curve_of(tmp_path, f"H [A/m],J [T]\n{rows}\n")
    assert_points(curve)
    assert curve.notes == ("polarisation J turned into B = J + mu0 H",)


def test_columns_that_are_not_used_are_said(tmp_path: Path) -> None:
    text = CSV.replace("\n", ",7\n").replace("B [T],7", "B [T],mu_r")
    curve = curve_of(tmp_path, text)
    assert_points(curve)
    assert curve.notes == ("columns not used: mu_r",)


POWDER = (
    'name = "x"\nsource = "y"\n'
    'powder = { permeability = 60, half_field = "7500 A/m", exponent = 1.7 }\n'
)


def test_a_powder_by_its_coefficients_halves_its_permeability_where_it_says(
    tmp_path: Path,
) -> None:
    curve = curve_of(tmp_path, POWDER, "powder.toml")
    slopes = curve.differential_permeability(np.array([0.0, 7500.0])) / MU_0
    assert slopes - 1.0 == pytest.approx([59.0, 59.0 / 2.0], rel=1e-2)


@pytest.mark.parametrize(
    ("good", "bad", "line"),
    [
        ("60", "1", "powder.permeability = 1: out of range; accepted: a number above 1"),
        ("1.7", "0.9", "powder.exponent = 0.9: out of range; accepted: a number above 1"),
        ("1.7", '"2"', "powder.exponent = '2': not a number"),
        ("7500 A/m", "7500", "powder.half_field = '7500': the unit is missing"),
        (", exponent = 1.7", "", "powder.exponent: missing"),
        ("exponent", "exponents", "powder.exponents: unknown key; accepted: nearest known key"),
    ],
)
def test_a_bad_powder_gets_one_line(tmp_path: Path, good: str, bad: str, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        curve_of(tmp_path, POWDER.replace(good, bad), "powder.toml")
    assert f"powder.toml: {line}" in str(caught.value)


BAD_CSV = [
    ("", "points: no rows"),
    ("25,0.09\n50,0.18\n", "header = '25 0.09': numbers without a header, so without units"),
    ("H,B\n25,0.09\n", "header = 'H': the unit is missing"),
    ("H [A],B [T]\n", "header = 'H [A]': 'A' is not a unit of this quantity"),
    ("H [A/m] B [T]\n25 0.09\n", "header = 'H [A/m] B [T]': one column"),
    ("x [A/m],B [T]\n", "header = 'x [A/m] | B [T]': no column of H"),
    ("H [A/m],H [Oe],B [T]\n", "header = 'H [A/m] | H [Oe] | B [T]': 2 columns of H"),
    ("H [A/m],B [T],J [T]\n", "2 columns of B"),
    ("H [A/m],B [T]\n25,0,09\n", "line 2 = '25,0,09': 3 instead of 2 cells (decimal commas"),
    ("H [A/m];B [T]\n25;0.09\n50\n", "line 3 = '50': 1 instead of 2 cells; accepted"),
    ("H [A/m];B [T]\n25;1.000,5\n", "line 2 = '1.000,5': not a number"),
    ("# x\nH [A/m];B [T]\n25;90 mT\n", "line 3 = '90 mT': not a number"),
    ("H [A/m],B [T]\n25,nan\n", "line 2 = 'nan': not a number"),
    ("H [A/m],B [T]\n25,0.09\n50,0.18\n", "points: too few points: 2"),
    ('H [A/m],B [T]\n"25,0.09\n50,0.18"\n', "line 2 = '25,0.09': 1 instead of 2 cells"),
    (f"H [A/m],B [T]\n25,{'9' * 140_000}\n", "line 2: not CSV (field larger than"),
    ("H [A/m],B [T]\n25,1e999\n50,0.18\n", "points: a point is not finite"),
    ("H [A/m],B [T]\n", "points: too few points: 0"),
]


@pytest.mark.parametrize(("text", "line"), BAD_CSV, ids=[line for _, line in BAD_CSV])
def test_a_bad_csv_file_gets_one_line(tmp_path: Path, text: str, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        curve_of(tmp_path, text)
    assert str(caught.value).startswith(f"{tmp_path / 'sheet.csv'}: ")
    assert line in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_file_that_cannot_be_read_is_named(tmp_path: Path) -> None:
    with pytest.raises(fm.InputError, match="No such file"):
        fm.material(str(tmp_path / "none.csv"))
    (tmp_path / "binary.csv").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(fm.InputError, match="not UTF-8 text"):
        fm.read_material(tmp_path / "binary.csv")
