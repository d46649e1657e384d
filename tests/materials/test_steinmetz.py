import math
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design_file import design_from_toml
from femag.materials import Steinmetz, loss_document, loss_of_table, material_library

POWER = Steinmetz(1.5, 1.45, 2.6, (25e3, 300e3), (0.03, 0.3), 100.0, "invented")
TABLE = {
    "k": 1.5, "alpha": 1.45, "beta": 2.6, "frequencies": ["25 kHz", "300 kHz"],
    "flux_densities": ["30 mT", "3000 G"], "temperature": "100 C", "source": "invented",
}  # fmt: skip
CURVE = 'name = "x"\nsource = "y"\n[[curve]]\ntemperature = "{} C"\npoints = [["50 A/m", "0.2 T"], '
CURVE += '["100 A/m", "0.3 T"], ["500 A/m", "0.4 T"]]\n'


def test_a_table_gives_the_parameters_and_they_give_the_table() -> None:
    assert loss_of_table(TABLE) == POWER
    assert loss_of_table(loss_document(POWER)) == POWER


def test_readings_of_a_power_law_give_its_parameters_back() -> None:
    f = np.array([50e3, 100e3, 200e3, 100e3, 50e3])
    b = np.array([0.1, 0.1, 0.05, 0.2, 0.25])
    found = fm.steinmetz_through(f, b, POWER.loss_density(1.0, b) * f**1.45)
    assert (found.alpha, found.beta) == (pytest.approx(1.45), pytest.approx(2.6))
    assert found.k == pytest.approx(1.5, rel=1e-9)
    assert (found.frequencies, found.flux_densities) == ((50e3, 200e3), (0.05, 0.25))


def test_readings_off_the_law_are_fitted_in_the_least_squares_of_logarithms() -> None:
    """Four readings on a square of log f and log B: a factor on one moves the means by a half."""
    f, b = np.array([1e4, 1e5, 1e4, 1e5]), np.array([0.01, 0.01, 0.1, 0.1])
    p = POWER.loss_density(1.0, b) * f**1.45 * np.array([1.0, 1.0, 1.0, 2.0])
    found = fm.steinmetz_through(f, b, p)
    assert found.alpha == pytest.approx(1.45 + 0.5 * math.log10(2.0))
    assert found.beta == pytest.approx(2.6 + 0.5 * math.log10(2.0))
    assert "fitted to 4 readings, worst 19 % off" in found.source  # 2**(1/4)


def test_between_two_temperatures_the_logarithm_of_the_loss_is_interpolated() -> None:
    cool, mid, hot = (fm.material("mnzn-power", t).loss for t in (25.0, 55.0, 100.0))
    assert cool is not None
    assert mid is not None
    assert hot is not None
    assert mid.temperature == 55.0
    p = [float(loss.loss_density(7e4, 0.11)) for loss in (cool, mid, hot)]
    assert math.log(p[1]) == pytest.approx(0.6 * math.log(p[0]) + 0.4 * math.log(p[2]))


def test_every_loss_of_the_library_says_that_it_is_invented() -> None:
    losses = [curve.loss for material in material_library() for _, curve in material.curves]
    assert all(loss is not None and "invented" in loss.source for loss in losses)


@pytest.mark.parametrize("temperature", ["25", "80"])
def test_a_material_file_carries_loss(tmp_path: Path, temperature: str) -> None:
    file = tmp_path / "x.toml"
    table = "k = 2.0\nalpha = 1.5\nbeta = 2.5\nfrequencies = ['1 kHz', '2 kHz']\n"
    table += "flux_densities = ['0.1 T', '0.2 T']\n"
    file.write_text(CURVE.format(temperature) + "[curve.loss]\n" + table)
    loss = fm.read_material(file).at().loss
    assert loss == Steinmetz(2.0, 1.5, 2.5, (1e3, 2e3), (0.1, 0.2), float(temperature))
    file.write_text(CURVE.format(temperature) + "[loss]\n" + table)
    loss = fm.read_material(file).at().loss
    assert loss == Steinmetz(2.0, 1.5, 2.5, (1e3, 2e3), (0.1, 0.2))


HEAD = '[core]\nsize = "P 26/16"\n[[winding]]\nturns = 50\n[core.material]\n'


@pytest.mark.parametrize(
    "kind",
    [
        "permeability = 2000",
        "permeability = 2000\nsaturation = '0.4 T'",
        "name = 'mnzn-power-25C'",
        "points = [['50 A/m', '0.2 T'], ['100 A/m', '0.3 T'], ['500 A/m', '0.4 T']]",
    ],
)
def test_a_design_carries_loss_whatever_its_material(kind: str) -> None:
    loss = 'loss = { k = 1.5, alpha = 1.45, beta = 2.6, frequencies = ["25 kHz", "300 kHz"], '
    loss += 'flux_densities = ["30 mT", "300 mT"], temperature = "100 C", source = "invented" }\n'
    design = design_from_toml(HEAD + kind + "\n" + loss)
    assert design.material.loss == POWER
    assert design_from_toml(fm.design_toml(design)) == design


BAD = [
    ({"k": 0.0}, "loss.k = 0.0: out of range; accepted: a number above 0"),
    ({"k": "1"}, "loss.k = '1': not a number"),
    ({"alpha": 5.0}, "loss.alpha = 5.0: out of range; accepted: 0.5 to 3"),
    ({"beta": 0.5}, "loss.beta = 0.5: out of range; accepted: 1 to 4"),
    ({"frequencies": ["25 kHz"]}, "loss.frequencies = ['25 kHz']: not a pair"),
    ({"frequencies": ["25 kHz", "1 kHz"]}, "loss.frequencies = (25000.0, 1000.0): no range"),
    ({"frequencies": ["25 kHz", "1 T"]}, "loss.frequencies = '1 T': 'T' is not a unit"),
    ({"temperature": "hot"}, "loss.temperature = 'hot': not a temperature"),
    ({"gamma": 1}, "loss.gamma: unknown key"),
    ({"readings": []}, "loss.k: stands beside readings"),
]


@pytest.mark.parametrize(("change", "message"), BAD)
def test_bad_tables_get_one_line(change: dict[str, object], message: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        loss_of_table(TABLE | change)
    assert message in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("readings", "message"),
    [
        ([["100 kHz", "0.1 T"]], "not a triple"),
        ([["100 kHz", "0.1 T", "1 W"]], "'W' is not a unit of this quantity"),
        ([["100 kHz", "0.1 T", "-1 W/m3"]] * 3, "not above 0"),
        ([["100 kHz", "0.1 T", "9 W/m3"], ["1 kHz", "0.1 T", "1 W/m3"]] * 2, "do not fix three"),
    ],
)
def test_bad_readings_get_one_line(readings: list[object], message: str) -> None:
    with pytest.raises(fm.InputError, match=message):
        loss_of_table({"readings": readings})


def test_a_design_file_names_the_key() -> None:
    with pytest.raises(fm.InputError, match=r"^core\.material\.loss\.alpha: missing; accepted"):
        design_from_toml(HEAD + "permeability = 2000\nloss = { k = 1 }")
