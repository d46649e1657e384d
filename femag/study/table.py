"""The table of a study: one row for each case, settings and kept numbers in SI.

It becomes a pandas frame or an xarray dataset where those are installed.
"""

from __future__ import annotations

import importlib
import json
import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from types import ModuleType
from typing import TYPE_CHECKING, Any

from femag.design_file import plain_value, unit_of_key
from femag.errors import InputError, MissingLibraryError
from femag.study.quantities import ENTRIES, QUANTITIES, unit_of_column
from femag.study.store import Row, Store

if TYPE_CHECKING:
    import pandas
    import xarray

EXTRA = "pip install 'gapfield[tables]'"


@dataclass(frozen=True)
class Axis:
    """A factor of the plan, as a dimension of the dataset.

    Parameters
    ----------
    name : str
        Of the dimension.
    keys : tuple of str
        Keys that change along it.
    size : int
        Number of steps.
    """

    name: str
    keys: tuple[str, ...]
    size: int


@dataclass(frozen=True)
class StudyTable:
    """What a store holds, by column.

    Parameters
    ----------
    columns : dict of str to list
        ``case`` (number), ``state`` ("done", "failed" or "open"), ``reason`` (of a failure), then
        one for each varied key, then one for each kept number; None where there is none.
    units : dict of str to str
        SI unit of each column, "C" for temperatures, "" for none.
    axes : tuple of Axis
        The plan's factors; the last changes fastest.
    about : dict of str to str
        What the study is and what solved it.
    """

    columns: dict[str, list[Any]]
    units: dict[str, str]
    axes: tuple[Axis, ...]
    about: dict[str, str] = field(default_factory=dict, repr=False)

    def __len__(self) -> int:
        return len(self.columns["case"])

    @property
    def settings(self) -> tuple[str, ...]:
        """The varied keys."""
        return tuple(key for axis in self.axes for key in axis.keys)

    def where(self, column: str, value: object) -> StudyTable:
        """Return the table of the cases that have a value in a column; they are listed then.

        Raises
        ------
        InputError
            If there is no such column or no such case.
        """
        values = self.columns.get(column, [])
        places = [place for place, found in enumerate(values) if found == value]
        if not places:
            known = sorted({str(found) for found in values}) if values else self.columns
            raise InputError("no such case", key=column, value=value, accepted=", ".join(known))
        columns = {name: [all_[place] for place in places] for name, all_ in self.columns.items()}
        return StudyTable(
            columns, self.units, (Axis("case", self.settings, len(places)),), self.about
        )

    def frame(self) -> pandas.DataFrame:
        """Return a pandas frame; ``frame.attrs["units"]`` holds the units.

        Raises
        ------
        MissingLibraryError
            If pandas is not installed.
        """
        frame: pandas.DataFrame = optional("pandas").DataFrame(self.columns)
        frame.attrs["units"] = dict(self.units)
        return frame

    def dataset(self) -> xarray.Dataset:
        """Return an xarray dataset with a dimension for each factor, and units as attributes.

        Kept numbers that a case does not have are NaN.

        Raises
        ------
        MissingLibraryError
            If xarray is not installed.
        """
        xarray_ = optional("xarray")
        names = tuple(axis.name for axis in self.axes)
        shape = tuple(axis.size for axis in self.axes)
        coordinates = self._coordinates()
        variables: dict[str, Any] = {}
        grouped: dict[str, list[str]] = {}
        for column in self.columns:
            if column not in self.settings:
                grouped.setdefault(_variable(column), []).append(column)
        for variable, columns in grouped.items():
            units = self._units(columns[0])
            texts = variable in ("state", "reason")
            arrays = [_array(self.columns[column], texts).reshape(shape) for column in columns]
            quantity = variable.split(".")[0]
            if quantity not in ENTRIES:
                variables[variable] = (names, arrays[0], units)
                continue
            entry = ENTRIES[quantity]
            labels = [column.removeprefix(f"{variable}.") for column in columns]
            coordinates[entry] = ((entry,), labels, {})
            variables[variable] = ((*names, entry), _stacked(arrays), units)
        attributes = {name: self.about.get(name, "") for name in ("title", "versions")}
        dataset: xarray.Dataset = xarray_.Dataset(variables, coordinates, attributes)
        return dataset

    def _units(self, column: str) -> dict[str, str]:
        unit = self.units[column]
        return {"units": unit} if unit else {}

    def _coordinates(self) -> dict[str, Any]:
        """Return the settings along the dimension of each factor."""
        coordinates: dict[str, Any] = {}
        stride = len(self)
        for axis in self.axes:
            stride //= axis.size
            for key in axis.keys:
                steps = self.columns[key][: stride * axis.size : stride]
                coordinates[key] = ((axis.name,), _array(steps), self._units(key))
        return coordinates


def _variable(column: str) -> str:
    """Return the dataset's variable that a column belongs to: its name without the entry."""
    quantity, *parts = column.split(".", 2)
    return ".".join((quantity, *parts[:1])) if quantity in ENTRIES else column


def _array(values: Sequence[Any], texts: bool = False) -> Any:
    """Return values as an array: numbers with NaN for none, texts, or booleans as 0 and 1."""
    import numpy as np

    if texts or any(isinstance(value, str) for value in values):
        return np.array(["" if value is None else str(value) for value in values], dtype=str)
    if all(isinstance(value, int) and not isinstance(value, bool) for value in values):
        return np.array(values, dtype=np.int64)
    return np.array([math.nan if value is None else float(value) for value in values])


def _stacked(arrays: Sequence[Any]) -> Any:
    import numpy as np

    return np.stack(arrays, axis=-1)


def table_of(store: Store) -> StudyTable:
    """Return the table of a store as it is now.

    Raises
    ------
    InputError
        If the store cannot be read.
    """
    about = store.about()
    axes = tuple(Axis(name, tuple(keys), size) for name, keys, size in json.loads(about["axes"]))
    rows = store.rows()
    settings = [key for axis in axes for key in axis.keys]
    known: dict[tuple[str, str], Any] = {}
    columns: dict[str, list[Any]] = {
        "case": [row.number for row in rows],
        "state": ["open" if row.state == "taken" else row.state for row in rows],
        "reason": [row.reason for row in rows],
    }
    for key in settings:
        columns[key] = [_plain(key, row.settings[key], known) for row in rows]
    units = dict.fromkeys(columns, "") | {key: unit_of_key(key) for key in settings}
    values = [row.values or {} for row in rows]
    for column in _kept_columns(rows):
        columns[column] = [kept.get(column) for kept in values]
        units[column] = unit_of_column(column)
    return StudyTable(columns, units, axes, about)


def _kept_columns(rows: Sequence[Row]) -> list[str]:
    """Return the names of all kept columns, by quantity and part in the order of `QUANTITIES`."""
    found: dict[str, None] = {}
    for row in rows:
        found.update(dict.fromkeys(row.values or ()))
    order = {name: place for place, name in enumerate(QUANTITIES)}
    parts = {name: {part: n for n, part in enumerate(found)} for name, found in QUANTITIES.items()}

    def place(column: str) -> tuple[int, int]:
        name, part, *_ = (*column.split(".", 2), "")
        return order.get(name, len(order)), parts.get(name, {}).get(part, 0)

    return sorted(found, key=place)


def _plain(key: str, value: Any, known: dict[tuple[str, str], Any]) -> Any:
    """Return a setting as a number in SI, or as text."""
    text = value if isinstance(value, str) else json.dumps(value)
    if (key, text) not in known:
        plain = plain_value(key, value)
        known[key, text] = json.dumps(plain) if isinstance(plain, dict | list) else plain
    return known[key, text]


def read_table(path: str | Path) -> StudyTable:
    """Return the table of the store in a file; it may be in use.

    Raises
    ------
    InputError
        If the store cannot be read.
    """
    with Store(path) as store:
        return table_of(store)


def optional(name: str) -> ModuleType:
    """Return a library of the extra ``tables``.

    Raises
    ------
    MissingLibraryError
        If it is not installed.
    """
    try:
        return importlib.import_module(name)
    except ImportError as error:
        raise MissingLibraryError(f"{name} is not installed: {EXTRA}") from error
