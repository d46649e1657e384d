import pytest

import femag as fm
from femag.units import exact_text, si_value, with_common_unit, with_unit


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("0.5 mm", "m", 0.5e-3),
        ("25.5mm", "m", 25.5e-3),
        ("26 mil", "m", 26 * 25.4e-6),
        ("1 in", "m", 25.4e-3),
        ("-4.8 mm", "m", -4.8e-3),
        ("1e-3 m", "m", 1e-3),
        ("250 µm", "m", 250e-6),
        ("120 kHz", "Hz", 120e3),
        ("4500 G", "T", 0.45),
        ("250 uH", "H", 250e-6),
        ("3000 Oe", "A/m", 3000 * 1e3 / (4 * 3.141592653589793)),
    ],
)
def test_text_becomes_si(text: str, unit: str, value: float) -> None:
    assert si_value(text, unit) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "problem"),
    [
        (0.5, "the unit is missing"),
        ("0.5", "the unit is missing"),
        ("0.5 A", "'A' is not a unit of this quantity"),
        ("0.5 parsec", "unknown unit 'parsec'"),
        ("0.5 gaus", "unknown unit 'gaus', nearest known: 'gauss'"),
        ("0,5 mm", "a decimal comma"),
        ("a bit", "not a number with a unit"),
        (None, "not a number with a unit"),
        (True, "not a number with a unit"),
        ("1e400 mm", "the number is out of range"),
        ("1e99999999999999999999 mm", "the number is out of range"),
        ("1e999999 Mm", "the number is out of range"),
        ("\u0660.\u0666 mm", "not a number with a unit"),
        ("1 mm; import os", "unknown unit"),
    ],
)
def test_text_that_is_no_length_is_refused(text: object, problem: str) -> None:
    with pytest.raises(fm.InputError, match=problem) as caught:
        si_value(text, "m")
    assert caught.value.accepted


@pytest.mark.parametrize("value", [0.0255, 0.1 + 0.2, 1 / 3, -4.8e-3, 5e-324, 1e20])
def test_exact_text_reads_back_to_the_same_number(value: float) -> None:
    assert si_value(exact_text(value, "m", "m"), "m") == value


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (650.187e-6, "650.2 uH"),
        (0.0, "0.000 H"),
        (9.9999e-7, "1.000 uH"),
        (1.0, "1.000 H"),
        (-3e-3, "-3.000 mH"),
        (1e-14, "0.01000 pH"),
        (3.1712e-22, "3.171e-22 H"),
        (-2.5e13, "-2.500e+13 H"),
    ],
)
def test_short_text(value: float, text: str) -> None:
    assert with_unit(value, "H") == text


def test_common_unit_is_that_of_the_first() -> None:
    assert with_common_unit((650.19e-6, 1.2e-3, 9e-9), "H") == ("650.2 uH", "1200.0 uH", "0.0 uH")
    assert with_common_unit((2e-21, 5e-22), "W") == ("2.000e-21 W", "5.000e-22 W")
