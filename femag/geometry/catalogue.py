"""The catalogue of standard cores: one TOML file for each family, limits and source of each number.

Files come from the folder ``geometries`` (of a checkout, or as installed), then from the folder
that the environment variable ``GAPFIELD_CORES`` names, then from files that a design names.
"""

from __future__ import annotations

import difflib
import os
import re
import tomllib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from importlib.metadata import distribution
from pathlib import Path
from typing import Any, Literal, get_args

from femag.errors import InputError, MissingLibraryError
from femag.geometry.effective import effective_parameters
from femag.geometry.families import FAMILIES, core_of_family
from femag.geometry.pot import PotCore
from femag.geometry.turned_core import Core
from femag.units import si_value

FOLDER_VARIABLE = "GAPFIELD_CORES"
Limit = Literal["minimum", "nominal", "maximum"]
LIMITS: tuple[Limit, ...] = get_args(Limit)

OUTER = ("outer_diameter", "post_diameter", "height", "length", "width", "waist", "front")
"""Dimensions that are large when there is much core material; the others are small then."""

_LIMITS = re.compile(r"\s*([\d.]+)\s*(?:(\+-|\+|-)\s*([\d.]+))?\s*(\S+)\s*")
_PUBLISHED_UNITS = {
    "core_factor": "1/m",
    "effective_length": "m",
    "effective_area": "m2",
    "least_area": "m2",
}


@dataclass(frozen=True)
class Limits:
    """A dimension between two limits, m."""

    low: float
    high: float

    @property
    def nominal(self) -> float:
        """The mean of the limits, which effective parameters are based on (IEC 60205)."""
        return round(0.5 * (self.low + self.high), 9)

    def at(self, limit: Limit, *, large: bool) -> float:
        """Return the dimension for a core with the least, mean or most material.

        Parameters
        ----------
        limit : {"minimum", "nominal", "maximum"}
            How much material.
        large : bool
            Whether the dimension is large when there is much of it.
        """
        if limit == "nominal":
            return self.nominal
        return self.high if (limit == "maximum") == large else self.low


@dataclass(frozen=True)
class CatalogueCore:
    """A standard core.

    Parameters
    ----------
    size : str
        Name, such as ``"P 22/13"``.
    family : str
        A key of `families.FAMILIES`.
    standard : str
        Where its dimensions are standardised.
    dimensions : mapping of str to Limits
        Limits of each dimension of the assembled set, m.
    sources : mapping of str to str
        Where each dimension was found.
    published : mapping of str to float
        Published effective parameters, SI: core_factor, effective_length, effective_area,
        least_area, as far as known.
    published_source : str
        Where those were found.
    file : str
        The file that holds it.
    """

    size: str
    family: str
    standard: str
    dimensions: Mapping[str, Limits]
    sources: Mapping[str, str]
    published: Mapping[str, float] = field(default_factory=dict)
    published_source: str = ""
    file: str = ""

    def core(self, limit: Limit = "nominal") -> Core:
        """Return the core with the least, mean or most material that its limits allow.

        A published core factor is that of the nominal core; at the limits it changes in the same
        ratio as the computed one.
        """
        core = core_of_family(self.family, self.sizes(limit), name=f"{self.size}, {limit}")
        published = self.published.get("core_factor")
        if published is None or isinstance(core, PotCore):
            return core
        if limit != "nominal":
            nominal = core_of_family(self.family, self.sizes("nominal"))
            published *= effective_parameters(core).c1 / effective_parameters(nominal).c1
        return replace(core, core_factor=published)

    def sizes(self, limit: Limit) -> dict[str, float]:
        """Return the dimensions in m with the least, mean or most material."""
        return {
            name: limits.at(limit, large=name in OUTER) for name, limits in self.dimensions.items()
        }


def catalogue(extra: Iterable[str | Path] = ()) -> tuple[CatalogueCore, ...]:
    """Return every known core; a later file's core replaces an earlier one of the same size.

    Parameters
    ----------
    extra : iterable of path
        Further files.

    Raises
    ------
    InputError
        If a file cannot be read or used.
    """
    return tuple(_core(entry) for entry in _entries(extra).values())


def catalogue_core(size: str, extra: Iterable[str | Path] = ()) -> CatalogueCore:
    """Return the core of a size; blanks and capitals do not matter.

    Raises
    ------
    InputError
        If there is none; it names the nearest.
    """
    known = _entries(extra)
    if _plain(size) not in known:
        raise _unknown_size(size, [entry.size for entry in known.values()])
    return _core(known[_plain(size)])


def matching_cores(cores: Sequence[CatalogueCore], text: str) -> tuple[CatalogueCore, ...]:
    """Return the core of the size `text`, else those whose size holds it.

    Raises
    ------
    InputError
        If there is none.
    """
    exact = tuple(core for core in cores if _plain(core.size) == _plain(text))
    found = exact or tuple(core for core in cores if _plain(text) in _plain(core.size))
    if not found:
        raise _unknown_size(text, [core.size for core in cores])
    return found


def _unknown_size(size: str, sizes: Iterable[str]) -> InputError:
    known = {_plain(other): other for other in sizes}
    near = difflib.get_close_matches(_plain(size), known, n=3, cutoff=0.4)
    accepted = ", ".join(known[name] for name in near) or "a size that 'gapfield cores' lists"
    return InputError("no core of this size", key="core.size", value=size, accepted=accepted)


@dataclass(frozen=True)
class _Entry:
    """A core as its file has it, not yet read."""

    size: str
    table: Mapping[str, Any]
    document: Mapping[str, Any]
    file: str


def catalogue_files() -> list[Path]:
    """Return the files of the catalogue, those of the user's own folder last."""
    folders = [_own_folder()]
    if os.environ.get(FOLDER_VARIABLE):
        folders.append(Path(os.environ[FOLDER_VARIABLE]))
    return [file for folder in folders for file in sorted(folder.glob("*.toml"))]


def _entries(extra: Iterable[str | Path]) -> dict[str, _Entry]:
    """Return the entry of each size, by its plain name; later files replace earlier ones."""
    files = (*catalogue_files(), *map(Path, extra))
    found = [entry for file in files for entry in _entries_of_file(file)]
    return {_plain(entry.size): entry for entry in found}


def _entries_of_file(file: Path) -> list[_Entry]:
    try:
        document = tomllib.loads(file.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file=str(file)) from error
    except (UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        problem = " ".join(str(error).split())
        raise InputError(f"not valid TOML ({problem})", file=str(file)) from error
    if document.get("family") not in FAMILIES:
        raise InputError(
            "unknown family", key="family", value=document.get("family"), file=str(file),
            accepted=", ".join(map(repr, FAMILIES)),
        )  # fmt: skip
    entries = []
    for table in document.get("core", ()):
        size = table.get("size")
        if not isinstance(size, str) or not size.strip():
            accepted = "a name such as 'P 22/13'"
            raise InputError("missing", key="core.size", accepted=accepted, file=str(file))
        entries.append(_Entry(size, table, document, str(file)))
    return entries


def _core(entry: _Entry) -> CatalogueCore:
    try:
        return _read_core(entry)
    except InputError as error:
        raise error.changed(file=entry.file) from error


def _read_core(entry: _Entry) -> CatalogueCore:
    family, size, table = entry.document["family"], entry.size, entry.table
    given, names = table.get("dimensions", {}), FAMILIES[family]
    for name in (*names, *given):
        if name not in names or name not in given:
            problem = "missing" if name in names else "unknown key"
            accepted = f"the dimensions {', '.join(names)}"
            raise InputError(problem, key=f"{size}: dimensions.{name}", accepted=accepted)
    source, exceptions = str(table.get("source", "not stated")), table.get("except", {})
    published = table.get("published", {})
    core = CatalogueCore(
        size=size,
        family=family,
        standard=str(entry.document.get("standard", "not stated")),
        dimensions={name: _limits(f"{size}: dimensions.{name}", given[name]) for name in names},
        sources={name: str(exceptions.get(name, source)) for name in names},
        published=_published(size, published),
        published_source=str(published.get("source", source)),
        file=entry.file,
    )
    for limit in LIMITS:
        core_of_family(family, core.sizes(limit))
    return core


def _published(size: str, table: Mapping[str, Any]) -> dict[str, float]:
    """Return published effective parameters, SI."""
    for name in table:
        if name != "source" and name not in _PUBLISHED_UNITS:
            accepted = ", ".join(("source", *_PUBLISHED_UNITS))
            raise InputError("unknown key", key=f"{size}: published.{name}", accepted=accepted)
    try:
        return {
            name: si_value(table[name], unit)
            for name, unit in _PUBLISHED_UNITS.items()
            if name in table
        }
    except InputError as error:
        raise error.changed(key=f"{size}: published") from error


def _limits(key: str, text: object) -> Limits:
    """Return the limits of a text such as ``"22 -0.8 mm"``."""
    match = _LIMITS.fullmatch(text) if isinstance(text, str) else None
    if match is None:
        raise InputError(
            "not a dimension with limits", key=key, value=text,
            accepted="'22 -0.8 mm', '17.9 +0.6 mm', '16.4 +-0.1 mm' or '16.4 mm'",
        )  # fmt: skip
    base, sign, tolerance, unit = match.groups()
    try:
        middle = si_value(f"{base} {unit}", "m")
        room = si_value(f"{tolerance or 0} {unit}", "m")
    except InputError as error:
        raise error.changed(key=key, value=text) from error
    return Limits(
        round(middle - room, 9) if sign in ("-", "+-") else middle,
        round(middle + room, 9) if sign in ("+", "+-") else middle,
    )


def _plain(size: str) -> str:
    return "".join(size.split()).casefold()


def _own_folder() -> Path:
    """Return the catalogue of the checkout that this package lies in, else the installed one."""
    root = Path(__file__).parents[2]
    if (root / "pyproject.toml").is_file():
        return root / "geometries"
    for file in distribution("gapfield").files or ():
        if file.parts[-2:] == ("geometries", "pot.toml"):
            return Path(str(file.locate())).resolve().parent
    raise MissingLibraryError("the core catalogue was not installed; install gapfield again")
