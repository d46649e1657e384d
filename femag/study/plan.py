"""The plan of a study as a value: a base design, and factors whose product are the cases."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from itertools import product
from typing import Any

from femag.design_file import (
    check_tables,
    design_from_document,
    files_of,
    folder_of,
    unit_of_key,
    with_key,
)
from femag.errors import InputError
from femag.geometry import catalogue_files

Document = Mapping[str, Any]

MOST_CASES = 1_000_000


@dataclass(frozen=True)
class Factor:
    """Keys that change together.

    Parameters
    ----------
    name : str
        For tables.
    keys : tuple of str
        Dotted keys of the design file.
    rows : tuple of tuple
        Values of the keys, as in a design file, in each step.
    alike : bool
        Whether all rows are of one kind, so that to check the first is to check all.
    """

    name: str
    keys: tuple[str, ...]
    rows: tuple[tuple[Any, ...], ...]
    alike: bool = False

    def __post_init__(self) -> None:
        if not self.rows:
            raise InputError("empty", key=self.name, accepted="one value or more")
        for row in self.rows:
            if not self.alike and self.rows.count(row) > 1:
                value = row[0] if len(row) == 1 else row
                raise InputError("stands there twice", key=self.name, value=value)


@dataclass(frozen=True)
class Case:
    """One case of a plan.

    Parameters
    ----------
    number : int
        Place in the plan, from 0.
    settings : dict
        The keys that the plan changes, with their values as in a design file.
    document : dict
        The whole design as a design document.
    """

    number: int
    settings: dict[str, Any]
    document: dict[str, Any] = field(repr=False)


@dataclass(frozen=True)
class Plan:
    """A base design and the factors whose product are the cases, the last factor fastest.

    Parameters
    ----------
    base : mapping
        Design document; it need not be a whole design without the factors.
    factors : tuple of Factor
        Without a common key.
    file : str, optional
        The base's file, which paths resolve against.
    """

    base: Document
    factors: tuple[Factor, ...]
    file: str | None = None

    def __post_init__(self) -> None:
        keys = [key.replace(".0.", ".") for key in self.keys]
        for place, key in enumerate(keys):
            unit_of_key(key)
            if any(f"{other}.".startswith(f"{key}.") for other in keys[:place]):
                raise InputError(
                    "is set already",
                    key=key,
                    accepted="each key once, tables before what is in them",
                )
        if not keys:
            raise InputError("nothing is varied", key="axes", accepted="one key or more")
        if len(self) > MOST_CASES:
            raise InputError(f"{len(self)} cases", accepted=f"at most {MOST_CASES}")

    def __len__(self) -> int:
        return math.prod(len(factor.rows) for factor in self.factors)

    @property
    def keys(self) -> tuple[str, ...]:
        """All keys that are varied."""
        return tuple(key for factor in self.factors for key in factor.keys)

    def case(self, number: int) -> Case:
        """Return the case of a number."""
        rows: list[tuple[Any, ...]] = []
        rest = number
        for factor in reversed(self.factors):
            rest, place = divmod(rest, len(factor.rows))
            rows.insert(0, factor.rows[place])
        return self._case(number, rows)

    def cases(self) -> Iterator[Case]:
        """Yield all cases in order."""
        for number, rows in enumerate(product(*(factor.rows for factor in self.factors))):
            yield self._case(number, rows)

    def _case(self, number: int, rows: Iterable[Sequence[Any]]) -> Case:
        values = [value for row in rows for value in row]
        settings = dict(zip(self.keys, values, strict=True))
        return Case(number, settings, self._document(settings))

    def _document(self, settings: Mapping[str, Any]) -> dict[str, Any]:
        document = dict(self.base)
        try:
            for key, value in settings.items():
                document = with_key(document, key, value)
        except InputError as error:
            raise error.changed(file=self.file) from error
        return document

    def check(self) -> None:
        """Check every value by itself, and that one case at least is a design.

        Raises
        ------
        InputError
            If a value is not of its key's kind, or no case makes a design.
        """
        first = [factor.rows[0] for factor in self.factors]
        for place, factor in enumerate(self.factors):
            for row in factor.rows[: 1 if factor.alike else None]:
                rows = [*first[:place], row, *first[place + 1 :]]
                check_tables(self._case(0, rows).document, self.file)
        refusal: InputError | None = None
        for case in self.cases():
            try:
                design_from_document(case.document, self.file)
            except InputError as error:
                refusal = refusal or error
            else:
                return
        assert refusal is not None
        raise InputError(f"none of the {len(self)} cases is a design; the first: {refusal}")

    @cached_property
    def digests(self) -> dict[str, str]:
        """Digest of each file that a case names, and of the catalogue where sizes are used."""
        first = [factor.rows[0] for factor in self.factors]
        documents = [
            self._case(0, [*first[:place], row, *first[place + 1 :]]).document
            for place, factor in enumerate(self.factors)
            if any(key.startswith(("core", "drive")) for key in factor.keys)
            for row in factor.rows
        ]
        documents.append(self._case(0, first).document)
        found = {file for document in documents for file in files_of(document)}
        digests = {file: _digest_of_file(folder_of(self.file) / file) for file in sorted(found)}
        if any("size" in document.get("core", {}) for document in documents):
            texts = [_digest_of_file(file) for file in catalogue_files()]
            digests["catalogue"] = _digest(texts)
        return digests

    @cached_property
    def identity(self) -> str:
        """Digest of all that fixes the cases: base, factors and the files that they name."""
        factors = [(factor.name, factor.keys, factor.rows) for factor in self.factors]
        return _digest([self.base, factors, self.digests])

    def key(self, case: Case, versions: Mapping[str, str]) -> str:
        """Return the digest of a case: its whole design, its files and the versions that solve it.

        Parameters
        ----------
        case : Case
            Of this plan.
        versions : mapping
            Versions of the program and its libraries.
        """
        named = {*files_of(case.document), "catalogue"}
        files = {file: digest for file, digest in self.digests.items() if file in named}
        return _digest([case.document, files, versions])


def _digest_of_file(file: Any) -> str:
    """Return the digest of a file's bytes; of a missing one that it is missing."""
    try:
        return hashlib.sha256(file.read_bytes()).hexdigest()
    except OSError:
        return "missing"


def _digest(content: Any) -> str:
    text = json.dumps(content, sort_keys=True, default=str)
    return hashlib.sha256(text.encode()).hexdigest()
