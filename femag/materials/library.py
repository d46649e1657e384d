"""The library of generic materials, and materials by name or file."""

from __future__ import annotations

import difflib
import re
import tomllib
from functools import cache
from pathlib import Path

from femag.errors import InputError
from femag.materials.material_file import is_material_file, material_of_document, read_material
from femag.materials.tabulated import TabulatedCurve
from femag.materials.temperature import Material

FILE = Path(__file__).with_name("library.toml")
_WITH_TEMPERATURE = re.compile(r"(?P<name>.+)-(?P<celsius>[0-9]+(?:\.[0-9]+)?)C", re.IGNORECASE)


@cache
def material_library() -> tuple[Material, ...]:
    """Return every material of the library. They are generic: no maker's grade is meant."""
    document = tomllib.loads(FILE.read_text(encoding="utf-8"))
    units = {"units": document["units"]}
    return tuple(material_of_document(entry | units) for entry in document["material"])


def material(name: str, temperature: float | None = None) -> TabulatedCurve:
    """Return the curve of a library material or of a material file.

    Parameters
    ----------
    name : str
        A name such as ``"mnzn-power"``, also with a temperature in it, ``"mnzn-power-25C"``; or
        the path of a file that ends in .toml, .csv, .tsv or .txt.
    temperature : float, optional
        Degrees Celsius; between two curves B is interpolated at equal H.

    Raises
    ------
    InputError
        If there is none of that name, the file cannot be used, or the temperature is missing or
        out of range.
    """
    if not isinstance(name, str):
        raise InputError(
            "not a name", key="name", value=name, accepted="a name or the path of a file, in quotes"
        )
    if is_material_file(name):
        return read_material(name).at(temperature)
    match = _WITH_TEMPERATURE.fullmatch(name)
    if match is None:
        return library_material(name).at(temperature)
    if temperature is not None:
        raise InputError(
            f"stands beside the temperature in {name!r}", key="temperature",
            value=f"{temperature:g} C", accepted="one of the two",
        )  # fmt: skip
    return library_material(match["name"]).at(float(match["celsius"]))


def library_material(name: str) -> Material:
    """Return the library material of a name; capitals do not matter.

    Raises
    ------
    InputError
        If there is none; it names the nearest.
    """
    known = {entry.name: entry for entry in material_library()}
    if name.casefold() in known:
        return known[name.casefold()]
    near = difflib.get_close_matches(name.casefold(), known, n=3, cutoff=0.5)
    raise InputError(
        "no material of this name", key="name", value=name,
        accepted=", ".join(near or known) + "; or a file that ends in .toml or .csv",
    )  # fmt: skip
