"""Units of recorded columns, and what turns a recorded voltage into a current."""

from __future__ import annotations

import re

from femag.errors import InputError

_PREFIXES = {"": 1.0, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3, "k": 1e3, "M": 1e6}
_BASES = {
    "s": "s",
    "V": "V",
    "A": "A",
    "ohm": "ohm",
    "Ohm": "ohm",
    "\u2126": "ohm",
    "\u03a9": "ohm",
}
_WORDS = {
    "second": "s", "seconds": "s", "sec": "s", "volt": "V", "volts": "V", "amp": "A", "amps": "A",
    "ampere": "A", "amperes": "A",
}  # fmt: skip
_UNIT = re.compile(rf"([nuµμmkM]?)({'|'.join(_BASES)})")
_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*")

CURRENT_SCALE = "a scale such as '10 A/V', or a plain factor for a column in A"
VOLTAGE_SCALE = "a factor such as '10', the attenuation of the probe"
SHUNT = "a resistance such as '0.1 ohm'"


def unit_factor(text: str) -> tuple[float, str] | None:
    """Return factor and base (``"s"``, ``"V"``, ``"A"`` or ``"ohm"``) of a unit, None if unknown.

    Parameters
    ----------
    text : str
        Such as ``"mV"``, ``"Volt"`` or ``"us"``.
    """
    plain = text.strip()
    if plain.lower() in _WORDS:
        return 1.0, _WORDS[plain.lower()]
    match = _UNIT.fullmatch(plain)
    if match is None:
        return None
    return _PREFIXES[match.group(1)], _BASES[match.group(2)]


def current_scale(text: str) -> tuple[float, str]:
    """Return a factor and the unit that it is applied to, ``"V"`` or ``"A"``.

    Parameters
    ----------
    text : str
        Such as ``"10 A/V"``, ``"100 mV/A"`` (both mean what a current probe says) or ``"2"``.

    Raises
    ------
    InputError
        If it does not read, or is zero.
    """
    number, unit = _split("--current-scale", text, CURRENT_SCALE)
    if not unit:
        return number, "A"
    parts = [unit_factor(part) for part in unit.split("/")]
    bases = tuple(part[1] for part in parts if part)
    if len(parts) == 2 and bases in (("A", "V"), ("V", "A")):
        upper, lower = (part[0] for part in parts if part)
        scale = number * upper / lower
        return (scale if bases == ("A", "V") else 1.0 / scale), "V"
    raise InputError("no scale", key="--current-scale", value=text, accepted=CURRENT_SCALE)


def shunt_resistance(text: str) -> float:
    """Return ohms of a text such as ``"100 mohm"``.

    Raises
    ------
    InputError
        If it is no resistance above zero.
    """
    number, unit = _split("--shunt", text, SHUNT)
    known = unit_factor(unit)
    if known is None or known[1] != "ohm" or number < 0.0:
        raise InputError("no resistance", key="--shunt", value=text, accepted=SHUNT)
    return number * known[0]


def voltage_scale(text: str) -> float:
    """Return the factor of a text such as ``"10"`` or ``"10 V/V"``.

    Raises
    ------
    InputError
        If it does not read, or is zero.
    """
    number, unit = _split("--voltage-scale", text, VOLTAGE_SCALE)
    if unit not in ("", "V/V", "x"):
        raise InputError("no factor", key="--voltage-scale", value=text, accepted=VOLTAGE_SCALE)
    return number


def _split(key: str, text: str, accepted: str) -> tuple[float, str]:
    match = _NUMBER.fullmatch(text)
    if match is None or float(match.group(1)) == 0.0:
        raise InputError("no number, or zero", key=key, value=text, accepted=accepted)
    return float(match.group(1)), match.group(2)
