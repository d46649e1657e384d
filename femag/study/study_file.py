"""Study files: TOML in, checked key by key."""

from __future__ import annotations

from pathlib import Path
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from femag.design_file import first_error, plain_value, read_document
from femag.errors import InputError, entry_key
from femag.study.sampling import ACCEPTED_RANGE, ACCEPTED_STEPS, METHODS, Sample
from femag.study.study import Study

AXES = f"a table of design keys, each with {ACCEPTED_STEPS}"


class _Table(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class SampleTable(_Table):
    """How a box is filled."""

    method: Literal["sobol", "latin hypercube"] = Field(
        default="sobol", description=" or ".join(map(repr, METHODS))
    )
    cases: int = Field(description="a whole number, for 'sobol' a power of 2")
    seed: int = Field(default=0, description="a whole number from 0")


class StudyFileTable(_Table):
    """The whole file."""

    title: str = Field(default="", description="text in quotes")
    base: str = Field(description="the path of a design file, in quotes")
    keep: list[str] = Field(default=[], description="a list of quantities")
    axes: dict[str, list[Any] | str] = Field(default={}, description=AXES)
    together: list[dict[str, list[Any]]] = Field(
        default=[], description="tables headed [[together]] of design keys, each with a list"
    )
    case: list[dict[str, Any]] = Field(
        default=[], description="tables headed [[case]] of design keys, each with a value"
    )
    sample: SampleTable | None = Field(default=None, description="a table, [sample]")
    ranges: dict[str, list[Any]] = Field(
        default={}, description=f"a table of design keys, each with {ACCEPTED_RANGE}"
    )


def read_study(path: str | Path) -> Study:
    """Return the study that a TOML file describes; its base is looked for beside it.

    Raises
    ------
    InputError
        If the file cannot be read or used; it names the file, the key and the value.
    """
    file = str(path)
    document = read_document(path)
    _refuse_keys_without_quotes(document, file)
    try:
        table = StudyFileTable.model_validate(document)
    except ValidationError as error:
        raise first_error(error, file, StudyFileTable) from error
    try:
        return _study(table, Path(path).parent)
    except InputError as error:
        raise (error if error.file else error.changed(file=file)) from error


def _refuse_keys_without_quotes(document: dict[str, Any], file: str) -> None:
    """TOML reads ``gap.length`` without quotes as a table in a table."""
    tables = [(name, document.get(name)) for name in ("axes", "ranges")]
    for name in ("together", "case"):
        entries = document.get(name)
        if isinstance(entries, list):
            tables += [(entry_key(name, index), entry) for index, entry in enumerate(entries)]
    for name, table in tables:
        for key, value in table.items() if isinstance(table, dict) else ():
            if isinstance(value, dict) and value and "." not in key:
                raise InputError(
                    "a table", key=f"{name}.{key}", file=file,
                    accepted=f'"{key}.{next(iter(value))}" in quotes, as every key with a dot',
                )  # fmt: skip


def _study(table: StudyFileTable, folder: Path) -> Study:
    if (table.sample is None) != (not table.ranges):
        raise InputError(
            "stands alone", key="ranges" if table.ranges else "sample",
            accepted="[sample] and [ranges] together",
        )  # fmt: skip
    axes: dict[Any, Any] = dict(table.axes)
    for index, lists in enumerate(table.together):
        axes[tuple(lists)] = _zipped(lists, entry_key("together", index))
    _refuse_bare_numbers(table)
    sample = None
    if table.sample is not None:
        sample = Sample(table.ranges, **table.sample.model_dump())
    return Study(folder / table.base, axes, table.case, sample, tuple(table.keep), table.title)


def _zipped(lists: dict[str, list[Any]], key: str) -> list[tuple[Any, ...]]:
    lengths = {name: len(values) for name, values in lists.items()}
    if len(set(lengths.values())) != 1:
        raise InputError(
            "lists of different lengths", key=key, accepted="lists of one length",
            value=", ".join(f"{name}: {length}" for name, length in lengths.items()),
        )  # fmt: skip
    return list(zip(*lists.values(), strict=True))


def _refuse_bare_numbers(table: StudyFileTable) -> None:
    """In a file a number without a unit is an error where one is due."""
    given = [*table.axes.items(), *table.ranges.items()]
    given += [item for lists in table.together for item in lists.items()]
    given += [(key, [value]) for case in table.case for key, value in case.items()]
    for key, values in given:
        for value in [] if isinstance(values, str) else values:
            if isinstance(value, int | float):
                plain_value(key, value)
