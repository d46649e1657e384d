"""Material files: TOML with curves at temperatures, or CSV with the points of one curve."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.materials.csv_points import csv_points
from femag.materials.diagnosis import curve_through
from femag.materials.known_keys import require_known
from femag.materials.loss_table import loss_of_table
from femag.materials.powder import powder_points
from femag.materials.steinmetz import Steinmetz
from femag.materials.tabulated import TabulatedCurve
from femag.materials.temperature import Material
from femag.text_file import text_of_file
from femag.units import celsius, si_value

Array = NDArray[np.float64]

SUFFIXES = (".toml", ".csv", ".tsv", ".txt")
"""Endings that tell the path of a material file from the name of a material."""
UNITS = {"field_strength": ("A/m", "'A/m' or 'Oe'"), "flux_density": ("T", "'T', 'mT' or 'kG'")}
PAIRS = "a list of pairs [H, B], numbers in the units of [units] or texts with units"


def is_material_file(text: str) -> bool:
    """Return whether a text is the path of a material file, by its ending."""
    return Path(text).suffix.casefold() in SUFFIXES


def read_material(path: str | Path) -> Material:
    """Return the material of a file, TOML or else CSV.

    Raises
    ------
    InputError
        If the file cannot be read or used; it names the file.
    """
    file = Path(path)
    text = text_of_file(file, "TOML or CSV")
    try:
        if file.suffix.casefold() == ".toml":
            return material_of_document(_document(text))
        return _material_of_csv(text, file.stem)
    except InputError as error:
        raise error.changed(file=str(path)) from error


def material_of_document(document: Mapping[str, Any]) -> Material:
    """Return the material that a nested mapping describes, as in a TOML file.

    Raises
    ------
    InputError
        If a key or value cannot be used.
    """
    require_known(document, ("name", "source", "units", "curve", "powder", "loss"))
    name, source = (_text(document, key) for key in ("name", "source"))
    loss = loss_of_table(document["loss"]) if "loss" in document else None
    if "powder" in document:
        if "curve" in document:
            raise InputError("stands beside a powder", key="curve", accepted="one of the two")
        h, b = _powder(document["powder"])
        curve = curve_through(h, b, name=name, source=source)
        return Material(name, source, ((None, replace(curve, loss=loss)),))
    units = _units(document.get("units", {}))
    entries = document.get("curve")
    if not isinstance(entries, list) or not entries:
        raise InputError("missing", key="curve", accepted="tables headed [[curve]]")
    curves = [_curve(entry, i, name, source, units, loss) for i, entry in enumerate(entries)]
    temperatures = [temperature for temperature, _ in curves if temperature is not None]
    if len(curves) > 1 and len(set(temperatures)) < len(curves):
        raise InputError(
            "several curves without a temperature each, or two with the same",
            key="curve.temperature", accepted="such as '25 C', different in each [[curve]]",
        )  # fmt: skip
    return Material(name, source, tuple(sorted(curves, key=lambda pair: pair[0] or 0.0)))


def _curve(
    entry: object,
    index: int,
    name: str,
    source: str,
    units: Mapping[str, float | None],
    loss: Steinmetz | None,
) -> tuple[float | None, TabulatedCurve]:
    """Return temperature and curve of an entry; its own loss goes before the material's."""
    key = "curve" if index == 0 else f"curve.{index}"
    if not isinstance(entry, Mapping):
        raise InputError("not a table", key=key, value=entry, accepted="tables headed [[curve]]")
    try:
        require_known(entry, ("temperature", "points", "loss"))
        temperature = celsius(entry["temperature"]) if "temperature" in entry else None
        h, b = _points(entry.get("points"), units)
        titled = name if temperature is None else f"{name} at {temperature:g} C"
        if "loss" in entry:
            own = loss_of_table(entry["loss"])
            loss = own if own.temperature is not None else replace(own, temperature=temperature)
        curve = curve_through(h, b, name=titled, source=source)
        return temperature, replace(curve, loss=loss)
    except InputError as error:
        raise error.changed(key=f"{key}.{error.key or 'temperature'}") from error


def _points(points: object, units: Mapping[str, float | None]) -> tuple[Array, Array]:
    """Return H and B of pairs of numbers, or of texts with units, but not of both."""
    if not isinstance(points, list) or not points:
        raise InputError("missing", key="points", accepted=PAIRS)
    for pair in points:
        if not isinstance(pair, Sequence) or isinstance(pair, str) or len(pair) != 2:
            raise InputError("not a pair", key="points", value=pair, accepted=PAIRS)
    kinds = {isinstance(value, str) for pair in points for value in pair}
    if kinds == {True, False}:
        raise InputError(
            "some points have units and some have none", key="points",
            accepted="all with units, or none and [units]",
        )  # fmt: skip
    try:
        if kinds == {True}:
            rows = [(si_value(h, "A/m"), si_value(b, "T")) for h, b in points]
        else:
            factors = [_factor(units, quantity) for quantity in UNITS]
            rows = [(_number(h) * factors[0], _number(b) * factors[1]) for h, b in points]
    except InputError as error:
        raise error.changed(key=error.key or "points") from error
    h, b = np.array(rows).T
    return h, b


def _number(value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise InputError("not a number", key="points", value=value, accepted=PAIRS)
    return float(value)


def _factor(units: Mapping[str, float | None], quantity: str) -> float:
    factor = units[quantity]
    if factor is None:
        accepted = f"[units] with {quantity} = {UNITS[quantity][1]}"
        raise InputError(f"the unit of the {quantity.replace('_', ' ')} is missing", key="points",
                         accepted=accepted)  # fmt: skip
    return factor


def _units(table: object) -> dict[str, float | None]:
    """Return what one of each declared unit is in SI."""
    if not isinstance(table, Mapping):
        raise InputError("not a table", key="units", value=table, accepted="a table, [units]")
    require_known(table, tuple(UNITS), "units.")
    factors: dict[str, float | None] = dict.fromkeys(UNITS)
    for quantity, unit in table.items():
        si, accepted = UNITS[quantity]
        try:
            factors[quantity] = si_value(f"1 {unit}", si)
        except InputError as error:
            raise InputError(
                error.problem, key=f"units.{quantity}", value=unit, accepted=accepted
            ) from error
    return factors


def _powder(table: object) -> tuple[Array, Array]:
    if not isinstance(table, Mapping):
        raise InputError("not a table", key="powder", value=table, accepted="a table, [powder]")
    names = ("permeability", "half_field", "exponent")
    require_known(table, names, "powder.")
    for key in names:
        if key not in table:
            raise InputError("missing", key=f"powder.{key}", accepted=", ".join(names))
    try:
        half_field = si_value(table["half_field"], "A/m")
    except InputError as error:
        raise error.changed(key="powder.half_field") from error
    try:
        return powder_points(table["permeability"], half_field, table["exponent"])
    except InputError as error:
        raise error.changed(key=f"powder.{error.key}") from error


def _material_of_csv(text: str, stem: str) -> Material:
    found = csv_points(text)
    name = found.stated.get("name", stem)
    source = found.stated.get("source", "source not stated")
    curve = curve_through(
        found.field_strength, found.flux_density, name=name, source=source, notes=found.notes
    )
    return Material(name, source, ((None, curve),))


def _document(text: str) -> Mapping[str, Any]:
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        problem = " ".join(str(error).split())
        raise InputError(f"not valid TOML ({problem})") from error


def _text(document: Mapping[str, Any], key: str) -> str:
    value = document.get(key)
    if not isinstance(value, str) or not value.strip() or not value.isprintable():
        raise InputError(
            "missing" if value is None else "not a text", key=key, value=value,
            accepted=f"one line of text in quotes; the {key} is printed with every answer",
        )  # fmt: skip
    return value
