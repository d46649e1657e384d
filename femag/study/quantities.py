"""What a study keeps of each result: names, units and where each comes from."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from operator import attrgetter
from typing import TYPE_CHECKING, Any

from femag.errors import InputError
from femag.geometry import half_window_height

if TYPE_CHECKING:
    from femag.result import Result

Value = float | int | bool | str | None
BOUNDS = ("lower", "value", "upper")


@dataclass(frozen=True)
class Part:
    """One number of a quantity, or one for each of its entries.

    Parameters
    ----------
    unit : str
        SI unit, "" for none.
    of : callable
        The number of a result; where the quantity has entries, a mapping from their names.
    """

    unit: str
    of: Callable[[Result], Any]


def _bounds(name: str, unit: str) -> dict[str, Part]:
    return {bound: Part(unit, attrgetter(f"{name}.{bound}")) for bound in BOUNDS}


def _scalar(name: str, unit: str = "") -> dict[str, Part]:
    return {"": Part(unit, attrgetter(name))}


def _of_hand(name: str) -> Callable[[Result], dict[str, Value]]:
    value = attrgetter(name)
    return lambda result: {row.estimate.name: value(row) for row in result.hand}


def _of_each(entries: str, label: str, name: str) -> Callable[[Result], dict[str, Value]]:
    value = attrgetter(name)
    return lambda result: {
        str(getattr(entry, label)): value(entry) for entry in getattr(result, entries)
    }


def _gap(result: Result) -> float:
    gaps = result.design.gaps
    return gaps[0].length if gaps else 0.0


def _window_height(result: Result) -> float:
    return 2.0 * half_window_height(result.design.core, result.design.gaps)


QUANTITIES: dict[str, dict[str, Part]] = {
    "shape": {
        "gap": Part("m", _gap),
        "post_diameter": Part("m", lambda result: 2.0 * result.design.core.turned.post_radius),
        "window_diameter": Part("m", lambda result: 2.0 * result.design.core.window_radius),
        "window_height": Part("m", _window_height),
        "turns": Part("", attrgetter("design.turns")),
    },
    "inductance": _bounds("inductance", "H"),
    "apparent_inductance": _scalar("apparent_inductance", "H"),
    "incremental_inductance": _scalar("incremental_inductance", "H"),
    "plain_inductance": _scalar("plain_inductance", "H"),
    "al_value": _scalar("al_value", "H"),
    "flux_linkage": _scalar("flux_linkage", "Wb"),
    "magnet_flux_linkage": _scalar("magnet_flux_linkage", "Wb"),
    "coenergy": _bounds("coenergy", "J"),
    "stored_energy": _scalar("stored_energy", "J"),
    "fringing_factor": _scalar("fringing_factor"),
    "gap_factor": _scalar("gap_factor"),
    "current": _scalar("current", "A"),
    "tolerance": _scalar("design.tolerance"),
    "unknowns": _scalar("unknowns"),
    "refinements": _scalar("refinements"),
    "seconds": _scalar("seconds", "s"),
    "design_hash": _scalar("design_hash"),
    "hand": {
        "error": Part("", _of_hand("error")),
        "in_range": Part("", _of_hand("estimate.in_range")),
        "inductance": Part("H", _of_hand("estimate.inductance")),
    },
    "section_means": {"flux_density": Part("T", _of_each("section_means", "name", "flux_density"))},
    "volume_shares": {
        "flux_density": Part("T", _of_each("volume_shares", "share", "flux_density"))
    },
    "copper": {
        "fill": Part("", _of_each("copper", "name", "fill")),
        "layers": Part("", _of_each("copper", "name", "layers")),
        "wire_length": Part("m", _of_each("copper", "name", "wire_length")),
        "resistance": Part("ohm", _of_each("copper", "name", "resistance")),
    },
}
"""Quantities, each with its parts; a part without a name is the quantity itself."""

ENTRIES = {
    "hand": "formula",
    "section_means": "section",
    "volume_shares": "share",
    "copper": "winding",
}
"""What an entry of a quantity that has entries is called."""

DEFAULT = (
    "inductance", "apparent_inductance", "incremental_inductance", "plain_inductance",
    "al_value", "flux_linkage", "magnet_flux_linkage", "coenergy", "stored_energy",
    "fringing_factor", "gap_factor", "current", "tolerance", "unknowns", "refinements", "hand",
)  # fmt: skip


def checked_quantities(names: Iterable[str]) -> tuple[str, ...]:
    """Return the quantities to keep: the shape and those asked for, all usual ones if none is.

    Raises
    ------
    InputError
        If one is unknown.
    """
    asked = tuple(names)
    for name in asked:
        if name not in QUANTITIES:
            near = difflib.get_close_matches(str(name), QUANTITIES, n=1, cutoff=0.5)
            accepted = f"nearest known: {near[0]!r}" if near else ", ".join(QUANTITIES)
            raise InputError("no such quantity", key="keep", value=name, accepted=accepted)
    return tuple(dict.fromkeys(("shape", *(asked or DEFAULT))))


def kept(result: Result, names: Iterable[str]) -> dict[str, Value]:
    """Return the numbers that are kept of a result, by column name.

    A name is that of the quantity, its part and its entry, joined by dots, as far as it has them:
    ``"inductance.lower"``, ``"fringing_factor"``, ``"hand.error.round edge"``.
    """
    found: dict[str, Value] = {}
    for name in names:
        for part, source in QUANTITIES[name].items():
            column = f"{name}.{part}".rstrip(".")
            value = source.of(result)
            if isinstance(value, Mapping):
                found |= {f"{column}.{entry}": number for entry, number in value.items()}
            else:
                found[column] = value
    return found


def unit_of_column(column: str) -> str:
    """Return the SI unit of a kept column, "" for none or one that is not known."""
    name, part, *_ = (*column.split(".", 2), "")
    found = QUANTITIES.get(name, {}).get(part)
    return found.unit if found else ""
