"""Units at the edges: text with a unit to SI numbers, and SI numbers to short text.

Only the units of this trade are defined, so that a misspelt one is found and the registry
builds fast. Inside the package everything is SI.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Sequence
from decimal import Decimal, DecimalException
from functools import cache
from typing import TYPE_CHECKING

from femag.errors import InputError

if TYPE_CHECKING:
    import pint

MU_0 = 4e-7 * math.pi
"""Magnetic constant, H/m. CODATA 2022 gives 1.25663706127(20)e-6, which is smaller by 1.3e-10 of
its value: far below any tolerance here, and 4e-7 pi makes results comparable with tables."""

_DEFINITIONS = """
milli- = 1e-3 = m-
micro- = 1e-6 = µ- = μ- = u-
nano- = 1e-9 = n-
pico- = 1e-12 = p-
centi- = 1e-2 = c-
kilo- = 1e3 = k-
mega- = 1e6 = M-
metre = [length] = m = meter
second = [time] = s
ampere = [current] = A = amp
kilogram = [mass]
gram = 1e-3 kilogram = g
kelvin = [temperature] = K
inch = 25.4e-3 metre = in
mil = 25.4e-6 metre
hertz = 1 / second = Hz
newton = kilogram * metre / second ** 2 = N
joule = newton * metre = J
watt = joule / second = W
volt = watt / ampere = V
ohm = volt / ampere = Ω
henry = volt * second / ampere = H
weber = volt * second = Wb
tesla = weber / metre ** 2 = T
gauss = 1e-4 tesla = G
oersted = 79.57747154594767 ampere / metre = Oe
"""

_PREFIXES = ((1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "u"), (1e-9, "n"), (1e-12, "p"))


@cache
def _registry() -> pint.UnitRegistry[float]:
    import pint

    registry: pint.UnitRegistry[float] = pint.UnitRegistry(None, case_sensitive=True)
    registry.load_definitions(_DEFINITIONS.strip().splitlines())
    return registry


_NUMBER_AND_UNIT = re.compile(
    r"\s*([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)\s*(\S.*?)?\s*"
)

TEMPERATURE = "a temperature in degrees Celsius, such as '100 C'"
_POWER = re.compile(r"(?<=[a-zA-Z])([23])$")

ACCEPTED = {
    "m": "a length with its unit, such as '0.5 mm' or '26 mil'",
    "A": "a current with its unit, such as '1 A'",
    "T": "a flux density with its unit, such as '0.45 T' or '4500 G'",
    "A/m": "a field strength with its unit, such as '250 A/m' or '3 Oe'",
    "m2": "an area with its unit, such as '63.4 mm2'",
    "1/m": "a core factor with its unit, such as '0.497 1/mm'",
    "H": "an inductance with its unit, such as '250 uH'",
    "Hz": "a frequency with its unit, such as '120 kHz'",
    "W": "a power with its unit, such as '2.5 W'",
    "N": "a force with its unit, such as '40 N'",
    "W/m3": "a loss density with its unit, such as '400 kW/m3'",
    "s": "a time with its unit, such as '10 us'",
}
"""What is accepted for a quantity of each SI unit, for messages and the file reference."""


def si_value(text: object, unit: str) -> float:
    """Return the SI number of a text such as ``"0.5 mm"``.

    Parameters
    ----------
    text : object
        What the user wrote.
    unit : str
        SI unit that fixes the dimension: ``"m"``, ``"A"``, ``"T"``, ``"A/m"``, ``"H"``, ``"Hz"``,
        ``"s"``.

    Raises
    ------
    InputError
        If the unit is missing, unknown or of another dimension, or the number does not read.
    """
    accepted = ACCEPTED[unit]
    if isinstance(text, int | float) and not isinstance(text, bool):
        raise InputError("the unit is missing", value=text, accepted=accepted)
    match = _NUMBER_AND_UNIT.fullmatch(text) if isinstance(text, str) else None
    if match is None:
        raise InputError("not a number with a unit", value=text, accepted=accepted)
    if match.group(2) is not None and match.group(2).startswith(","):
        raise InputError("a decimal comma", value=text, accepted=accepted)
    number, name = match.groups()
    if name is None:
        raise InputError("the unit is missing", value=text, accepted=accepted)
    factor = _si_factor(name, unit, text, accepted)
    try:
        value = float(Decimal(number) * Decimal(repr(factor)))
    except DecimalException:
        value = math.inf
    if not math.isfinite(value):
        raise InputError("the number is out of range", value=text, accepted=accepted)
    return value


def _si_factor(name: str, unit: str, text: object, accepted: str) -> float:
    import pint

    try:
        return _unit_ratio(name, unit)
    except pint.DimensionalityError as error:
        raise InputError(
            f"{name!r} is not a unit of this quantity", value=text, accepted=accepted
        ) from error
    except Exception as error:  # pint's parser raises errors of many kinds on odd text
        near = difflib.get_close_matches(name, _names(), n=1, cutoff=0.7)
        hint = f", nearest known: {near[0]!r}" if near else ""
        raise InputError(f"unknown unit {name!r}{hint}", value=text, accepted=accepted) from error


@cache
def _unit_ratio(name: str, unit: str) -> float:
    """Return how many of `unit` one of `name` is; pint's errors pass."""
    registry = _registry()
    units = (registry.parse_units(_POWER.sub(r"**\1", text)) for text in (name, unit))
    return float(registry.Quantity(1.0, next(units)).to(next(units)).magnitude)


def _names() -> list[str]:
    return ["mm", "cm", "um", "m", "mil", "inch", "in", "A", "mA", "kA", "T", "mT", "G", "gauss",
            "A/m", "kA/m", "Oe", "H", "mH", "uH", "nH", "Hz", "kHz", "MHz",
            "W", "mW", "kW", "N", "mN", "kN"]  # fmt: skip


def celsius(text: object) -> float:
    """Return the degrees Celsius of a text such as ``"100 C"``.

    Raises
    ------
    InputError
        If it does not read.
    """
    match = _NUMBER_AND_UNIT.fullmatch(text) if isinstance(text, str) else None
    if match is None or match.group(2) not in ("C", "degC", "°C"):
        raise InputError("not a temperature", value=text, accepted=TEMPERATURE)
    return float(match.group(1))


def exact_text(value: float, unit: str, prefix: str = "") -> str:
    """Return a text that `si_value` reads back to the same number, such as ``"0.5 mm"``.

    Parameters
    ----------
    value : float
        SI value.
    unit : str
        SI unit symbol.
    prefix : {"", "m"}
        Prefix to write the unit with.
    """
    power = {"": 0, "m": 3}[prefix]
    number = Decimal(repr(float(value))).scaleb(power).normalize()
    return f"{number:f} {prefix}{unit}"


def with_unit(value: float, unit: str, digits: int = 4) -> str:
    """Return a short text such as ``"650.2 uH"``: `digits` significant figures and a prefix.

    Parameters
    ----------
    value : float
        SI value.
    unit : str
        SI unit symbol.
    digits : int
        Significant figures.
    """
    (text,) = with_common_unit((value,), unit, digits)
    return text


def with_common_unit(values: Sequence[float], unit: str, digits: int = 4) -> tuple[str, ...]:
    """Return texts that share the prefix and the decimals of the first value.

    Beyond the prefixes, below a hundredth of the least or above 10 000 of the greatest, they have
    powers of ten.
    """
    lead = abs(values[0])
    if lead != 0.0 and not 1e-2 * _PREFIXES[-1][0] <= lead < 1e4 * _PREFIXES[0][0]:
        return tuple(f"{value:.{digits - 1}e} {unit}" for value in values)
    if not math.isfinite(lead) or lead == 0.0:
        factor, prefix, decimals = 1.0, "", digits - 1
    else:
        rounded = float(f"{lead:.{digits - 1}e}")
        factor, prefix = next((s for s in _PREFIXES if rounded >= s[0] * (1 - 1e-12)), (1e-12, "p"))
        decimals = max(0, digits - 1 - math.floor(math.log10(rounded / factor) + 1e-12))
    return tuple(f"{value / factor:.{decimals}f} {prefix}{unit}" for value in values)
