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
from dataclasses import dataclass, field
from importlib.metadata import distribution
from pathlib import Path
from typing import Any, Literal, get_args

from femag.errors import InputError, MissingLibraryError
from femag.geometry.pot import DIMENSIONS, PotCore
from femag.units import si_value

FOLDER_VARIABLE = "GAPFIELD_CORES"
Limit = Literal["minimum", "nominal", "maximum"]
LIMITS: tuple[Limit, ...] = get_args(Limit)

OUTER = ("outer_diameter", "post_diameter", "height")
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
        ``"pot"``.
    standard : str
        Where its dimensions are standardised.
    dimensions : mapping of str to Limits
        Limits of each dimension of the assembled set, m.
    sources : mapping of str to str
        Where each dimension was found.
    published : mapping of str to float
        Published effective parameters, SI: core_factor, effective_length, effective_area,
        least_area, as far as known.
    file : str
        The file that holds it.
    """

    size: str
    family: str
    standard: str
    dimensions: Mapping[str, Limits]
    sources: Mapping[str, str]
    published: Mapping[str, float] = field(default_factory=dict)
    file: str = ""

    def core(self, limit: Limit = "nominal") -> PotCore:
        """Return the core with the least, mean or most material that its limits allow."""
        sizes = {
            name: limits.at(limit, large=name in OUTER) for name, limits in self.dimensions.items()
        }
        return PotCore(**sizes, name=f"{self.size}, {limit}")


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
    folders = [_own_folder()]
    if os.environ.get(FOLDER_VARIABLE):
        folders.append(Path(os.environ[FOLDER_VARIABLE]))
    files = [file for folder in folders for file in sorted(folder.glob("*.toml"))]
    cores = [core for file in (*files, *map(Path, extra)) for core in cores_of_file(file)]
    return tuple({_plain(core.size): core for core in cores}.values())


def catalogue_core(size: str, extra: Iterable[str | Path] = ()) -> CatalogueCore:
    """Return the core of a size; blanks and capitals do not matter.

    Raises
    ------
    InputError
        If there is none; it names the nearest.
    """
    known = {_plain(core.size): core for core in catalogue(extra)}
    if _plain(size) not in known:
        raise _unknown_size(size, known.values())
    return known[_plain(size)]


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
        raise _unknown_size(text, cores)
    return found


def _unknown_size(size: str, cores: Iterable[CatalogueCore]) -> InputError:
    known = {_plain(core.size): core.size for core in cores}
    near = difflib.get_close_matches(_plain(size), known, n=3, cutoff=0.4)
    accepted = ", ".join(known[name] for name in near) or "a size that 'gapfield cores' lists"
    return InputError("no core of this size", key="core.size", value=size, accepted=accepted)


def cores_of_file(file: Path) -> tuple[CatalogueCore, ...]:
    """Return the cores of one catalogue file.

    Raises
    ------
    InputError
        If the file cannot be read or used.
    """
    try:
        document = tomllib.loads(file.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file=str(file)) from error
    except (UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        problem = " ".join(str(error).split())
        raise InputError(f"not valid TOML ({problem})", file=str(file)) from error
    try:
        return tuple(_core(entry, document, str(file)) for entry in document.get("core", ()))
    except InputError as error:
        raise error.changed(file=str(file)) from error


def _core(entry: Mapping[str, Any], document: Mapping[str, Any], file: str) -> CatalogueCore:
    size = entry.get("size")
    if not isinstance(size, str) or not size.strip():
        raise InputError("missing", key="core.size", accepted="a name such as 'P 22/13'")
    if document.get("family") != "pot":
        raise InputError(
            "unknown family", key="family", value=document.get("family"), accepted="'pot'"
        )
    given = entry.get("dimensions", {})
    for name in (*DIMENSIONS, *given):
        if name not in DIMENSIONS or name not in given:
            problem = "missing" if name in DIMENSIONS else "unknown key"
            accepted = f"the dimensions {', '.join(DIMENSIONS)}"
            raise InputError(problem, key=f"{size}: dimensions.{name}", accepted=accepted)
    source, exceptions = str(entry.get("source", "not stated")), entry.get("except", {})
    core = CatalogueCore(
        size=size,
        family="pot",
        standard=str(document.get("standard", "not stated")),
        dimensions={
            name: _limits(f"{size}: dimensions.{name}", given[name]) for name in DIMENSIONS
        },
        sources={name: str(exceptions.get(name, source)) for name in DIMENSIONS},
        published={
            name: si_value(text, _PUBLISHED_UNITS[name])
            for name, text in entry.get("published", {}).items()
        },
        file=file,
    )
    for limit in LIMITS:
        core.core(limit)
    return core


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
