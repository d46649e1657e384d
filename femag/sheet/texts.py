"""Numbers as the sheet prints them."""

from __future__ import annotations

from collections.abc import Sequence

from femag.units import with_common_unit, with_unit

UNITS = ("H", "Wb", "J", "A", "m", "W", "ohm", "N", "T")


def shown(value: float, unit: str, digits: int = 4) -> str:
    """Return a value with its unit, such as ``"396.4 µH"``."""
    return with_micro(with_unit(value, unit, digits))


def shown_together(values: Sequence[float], unit: str, digits: int = 4) -> tuple[str, ...]:
    """Return values with the prefix and the decimals of the first."""
    return tuple(with_micro(text) for text in with_common_unit(values, unit, digits))


def with_micro(text: str) -> str:
    """Return a text with the sign of micro instead of the u before a unit."""
    return " ".join(
        f"\N{MICRO SIGN}{word[1:]}" if word.startswith("u") and word[1:] in UNITS else word
        for word in text.split(" ")
    )
