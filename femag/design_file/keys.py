"""Single keys of a design document: setting one, its unit, and the files that a document names."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping, Sequence
from functools import cache, partial
from pathlib import Path
from typing import Any, get_args, get_origin

from pydantic import BaseModel, BeforeValidator

from femag.design_file.messages import table_in
from femag.design_file.tables import (
    DesignTable,
    MaterialTable,
    material_table,
    read_quantity,
    read_temperature,
)
from femag.errors import InputError
from femag.materials import is_material_file
from femag.units import celsius, exact_text, si_value

Document = Mapping[str, Any]

CELSIUS = "C"
"""Unit of temperatures, the only one here that is not SI."""


def with_key(document: Document, key: str, value: object) -> dict[str, Any]:
    """Return a document with one key set; the one that is given stays as it is.

    Parameters
    ----------
    document : mapping
        Nested, as a design file reads.
    key : str
        Dotted, such as ``"gap.length"``; in a list the first entry is meant, in ``"gap.1.length"``
        the second. Tables on the way that are missing are made.
    value : object
        As in a design file.

    Raises
    ------
    InputError
        If there is no such entry, or something else than a table stands on the way.
    """
    return _with_parts(document, DesignTable, key.split("."), value, key)


def _with_parts(
    document: Document, table: Any, parts: Sequence[str], value: object, key: str
) -> dict[str, Any]:
    name, *rest = parts
    if not rest:
        return {**document, name: value}
    field = table.model_fields.get(name)
    inner = table_in(field.annotation) if field else None
    inside = document.get(name)
    if field is not None and get_origin(field.annotation) is list:
        return {**document, name: _with_entry(inside or [], inner, rest, value, key)}
    if inner is MaterialTable:
        inside = material_table(inside)
    if not isinstance(inside, Mapping | None):
        raise InputError(
            f"{inside!r} stands at {name!r} in the base", key=key, accepted=f"{name!r} as a table"
        )
    return {**document, name: _with_parts(inside or {}, inner, rest, value, key)}


def _with_entry(
    entries: Sequence[Document], table: Any, parts: Sequence[str], value: object, key: str
) -> list[Any]:
    number = parts[0].isdigit()
    index = int(parts[0]) if number else 0
    rest = parts[1:] if number else parts
    if index > len(entries):
        raise InputError(f"the base has {len(entries)} entries of this list", key=key)
    found: list[Any] = list(entries)
    if index == len(found):
        found.append({})
    found[index] = _with_parts(found[index], table, rest, value, key) if rest else value
    return found


@cache
def unit_of_key(key: str) -> str:
    """Return the SI unit of a dotted key, "C" for temperatures, "" where no unit belongs.

    Raises
    ------
    InputError
        If the design file has no such key; it names the nearest.
    """
    parts = [part for part in key.split(".") if not part.isdigit()]
    table: Any = DesignTable
    for place, name in enumerate(parts):
        is_table = isinstance(table, type) and issubclass(table, BaseModel)
        fields = table.model_fields if is_table else {}
        if name not in fields:
            near = difflib.get_close_matches(key, list(_all_keys(DesignTable)), n=1, cutoff=0.0)
            raise InputError("unknown key", key=key, accepted=f"nearest known key: {near[0]!r}")
        field = fields[name]
        if place == len(parts) - 1:
            return _unit(field.metadata) or _unit(_annotations(field.annotation))
        table = table_in(field.annotation)
    return ""


def _all_keys(table: Any, before: str = "") -> Iterator[str]:
    for name, field in table.model_fields.items():
        inner = table_in(field.annotation)
        yield f"{before}{name}"
        if isinstance(inner, type) and issubclass(inner, BaseModel):
            yield from _all_keys(inner, f"{before}{name}.")


def _annotations(annotation: Any) -> Iterator[Any]:
    """Yield what stands beside the types in ``Annotated[...] | None``."""
    for part in get_args(annotation):
        yield from getattr(part, "__metadata__", ())


def _unit(metadata: Any) -> str:
    for entry in metadata:
        if isinstance(entry, BeforeValidator):
            if entry.func is read_temperature:
                return CELSIUS
            if isinstance(entry.func, partial) and entry.func.func is read_quantity:
                return str(entry.func.args[0])
    return ""


def plain_value(key: str, value: object) -> Any:
    """Return the number in SI (temperatures in C) of a key's text; other values as they are.

    Raises
    ------
    InputError
        If it does not read.
    """
    unit = unit_of_key(key)
    if not unit:
        return value
    try:
        return celsius(value) if unit == CELSIUS else si_value(value, unit)
    except InputError as error:
        raise error.changed(key=key) from error


def as_written(key: str, value: Any) -> Any:
    """Return what stands in a design file for a value; numbers are in SI (temperatures in C)."""
    unit = unit_of_key(key)
    value = value.item() if hasattr(value, "item") else value  # numpy's numbers
    if not unit or isinstance(value, bool) or not isinstance(value, int | float):
        return value
    if unit == CELSIUS:
        return f"{float(value)!r} C"
    return exact_text(float(value), unit, "m" if unit == "m" else "")


def named_files(document: Document) -> Iterator[tuple[str, str]]:
    """Yield dotted key and path, as it is written, of every file that a design document names."""
    core, drive = document.get("core"), document.get("drive")
    if isinstance(core, Mapping):
        material, extra = core.get("material"), core.get("catalogue")
        if isinstance(material, str) and is_material_file(material):
            yield "core.material", material
        if isinstance(material, Mapping) and isinstance(material.get("file"), str):
            yield "core.material.file", material["file"]
        if isinstance(extra, str):
            yield "core.catalogue", extra
    if isinstance(drive, Mapping) and isinstance(drive.get("waveform"), str):
        yield "drive.waveform", drive["waveform"]


def files_of(document: Document) -> Iterator[str]:
    """Yield the paths of the files that a design document names, as they are written."""
    for _, path in named_files(document):
        yield path


def folder_of(file: str | None) -> Path:
    """Return the folder that paths in a design file resolve against."""
    return Path(file).parent if file else Path()
