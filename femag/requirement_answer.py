"""Requirements in print: what is asked, what is known, the room in between."""

from __future__ import annotations

from rich.table import Table
from rich.text import Text

from femag.answer_table import columns
from femag.requirement_checks import RequirementCheck
from femag.requirements import Sense
from femag.units import with_common_unit, with_unit

SIGNS: dict[Sense, str] = {"least": "at least", "most": "at most"}


def requirement_lines(checks: tuple[RequirementCheck, ...]) -> list[Table | Text]:
    """Return the table of requirements, at most 80 columns wide, and why some are not shown."""
    table = columns("requirement", "value", "limit", "margin", "", words=["requirement", ""])
    for check in checks:
        table.add_row(
            check.words, value_text(check), limit_text(check), margin_text(check), check.verdict
        )
    reasons = "; ".join(f"{check.words}: {reason(check)}" for check in checks if reason(check))
    return [table, *([Text(f"{reasons[0].upper()}{reasons[1:]}.")] if reasons else [])]


def reason(check: RequirementCheck) -> str:
    """Return why a requirement is not shown, or that tolerances alone miss it; else nothing."""
    if check.is_missed_by_tolerance:
        return "missed with all parts at their worse ends, kept by nominal ones"
    if check.verdict != "not shown":
        return ""
    if check.known.value is None:
        return check.known.basis
    return f"the limit lies between the {check.known.basis}; lower solve.tolerance"


def value_text(check: RequirementCheck) -> str:
    """Return the value of a check; a dash where nothing is known."""
    value = check.known.value
    if value is None:
        return "-"
    return _quantity(value, check.unit) if check.unit else "yes"


def limit_text(check: RequirementCheck) -> str:
    """Return the limit of a check and its side."""
    if check.limit is None:
        return "required"
    return f"{SIGNS[check.sense]} {_quantity(check.limit, check.unit, exact=True)}"


def margin_text(check: RequirementCheck) -> str:
    """Return the margin of a check, per cent of the limit or kelvin."""
    if check.margin is None:
        return "-"
    return f"{check.margin:+.0f} K" if check.unit == "C" else f"{100 * check.margin:+.1f} %"


def interval_text(check: RequirementCheck) -> str:
    """Return both ends of what is known, empty where they are one."""
    known = check.known
    if known.value is None or known.lower is None or known.upper is None:
        return ""
    if known.lower == known.upper:
        return ""
    texts = with_common_unit((known.value, known.lower, known.upper), check.unit, 5)
    return f"{texts[1].split()[0]} to {texts[2].split()[0]}"


def spread_text(check: RequirementCheck) -> str:
    """Return what part tolerances may add or take off; a dash where that is not known."""
    if check.known.spread is None or not check.known.value:
        return "-"
    return f"\N{PLUS-MINUS SIGN}{100 * check.known.spread / check.known.value:.1f} %"


def _quantity(value: float, unit: str, *, exact: bool = False) -> str:
    """Return a value with its unit; a limit without the noughts that its text has not."""
    if unit == "C":
        return f"{value:g} C"
    if unit == "m":
        return f"{1e3 * value:g} mm" if exact else f"{1e3 * value:.3f} mm"
    if unit == "T":
        return f"{value:g} T" if exact else f"{value:.4f} T"
    text, symbol = with_unit(value, unit, 6 if exact else 4).split()
    if exact and "." in text:
        text = text.rstrip("0").rstrip(".")
    return f"{text} {symbol}"
