"""What the charts of a study show, as tables: of the cases that are done and have a gap."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.study.table import StudyTable

Array = NDArray[np.float64]

FIGURES = 3
"""Significant figures to which ratios count as equal."""
MOST_CLASSES = 6
"""Different window heights that are shown one by one; more are put into as many classes."""
MOST_CELLS = (14, 8)
"""Different gaps and window heights that get a cell of their own in a plane."""


@dataclass(frozen=True)
class ChartTable:
    """Columns that a chart is drawn of.

    Parameters
    ----------
    columns : dict of str to list
        Values by name.
    units : dict of str to str
        SI unit by name, "" for none.
    """

    columns: dict[str, list[Any]]
    units: dict[str, str]


@dataclass(frozen=True)
class Series:
    """Points that differ in the gap only.

    Parameters
    ----------
    label : str
        What they have in common.
    x, y : array, (points,)
        In order of x.
    group : int
        Series of one group look alike.
    """

    label: str
    x: Array
    y: Array
    group: int


@dataclass(frozen=True)
class Plane:
    """Error of a formula over gap and window height, both over the post's diameter.

    Parameters
    ----------
    formula : str
        Its name.
    gaps, heights : array
        Middle of the cells along each direction; ratios.
    error : array, (heights, gaps)
        The error of largest size in each cell, as a share; NaN without a case.
    in_range : bool array, (heights, gaps)
        Whether all cases of the cell are inside of the formula's range.
    """

    formula: str
    gaps: Array
    heights: Array
    error: Array
    in_range: NDArray[np.bool_]


def _usable(table: StudyTable, needed: Sequence[str]) -> list[int]:
    """Return the cases that are done and have a gap.

    Raises
    ------
    InputError
        If a column is not kept, or there is no such case.
    """
    for name in needed:
        kept = any(column == name or column.startswith(f"{name}.") for column in table.columns)
        if not kept and "shape.gap" in table.columns:
            raise InputError(f"the study does not keep {name!r}", key="keep", accepted=repr(name))
    gaps = table.columns.get("shape.gap", [])
    found = [place for place, gap in enumerate(gaps) if gap]
    if not found:
        raise InputError("no case with a gap is done", key="charts")
    return found


def _ratios(table: StudyTable, cases: Sequence[int]) -> tuple[Array, Array]:
    """Return gap and window height over the post's diameter."""
    gap, height, post = (
        np.array([table.columns[f"shape.{name}"][case] for case in cases])
        for name in ("gap", "window_height", "post_diameter")
    )
    return gap / post, height / post


def fringing_table(table: StudyTable) -> ChartTable:
    """Return fringing factor, gap and window height over the post's diameter, and settings."""
    cases = _usable(table, ["fringing_factor"])
    gaps, heights = _ratios(table, cases)
    columns = {
        "gap_over_post": gaps.tolist(),
        "window_height_over_post": heights.tolist(),
        "fringing_factor": _picked(table, "fringing_factor", cases),
    }
    return _with_settings(table, cases, columns, {})


def al_table(table: StudyTable) -> ChartTable:
    """Return gap in m, inductance over turns squared in H, and settings."""
    cases = _usable(table, ["al_value"])
    columns = {
        "gap": _picked(table, "shape.gap", cases),
        "al_value": _picked(table, "al_value", cases),
    }
    return _with_settings(table, cases, columns, {"gap": "m", "al_value": "H"})


def hand_error_table(table: StudyTable) -> ChartTable:
    """Return the error of every hand formula, a line for each case and formula."""
    cases = _usable(table, ["hand"])
    gaps, heights = _ratios(table, cases)
    lines = [
        (case, formula, gap, height, *_of_formula(table, formula, case))
        for formula in formulas(table)
        for case, gap, height in zip(cases, gaps.tolist(), heights.tolist(), strict=True)
    ]
    names = ("case", "formula", "gap_over_post", "window_height_over_post", "error", "in_range")
    columns = {name: [line[place] for line in lines] for place, name in enumerate(names)}
    return ChartTable(columns, dict.fromkeys(names, ""))


def formulas(table: StudyTable) -> list[str]:
    """Return the names of the hand formulas in a table."""
    start = "hand.error."
    return [name.removeprefix(start) for name in table.columns if name.startswith(start)]


def fringing_series(table: StudyTable) -> list[Series]:
    """Return fringing factor against gap over post diameter, grouped by window height."""
    found = fringing_table(table).columns
    heights = np.array(found["window_height_over_post"])
    classes, labels = _classes(heights)
    x, y = np.array(found["gap_over_post"]), np.array(found["fringing_factor"])
    groups = _same_but_gap(table, found["case"])
    series = []
    for members in groups.values():
        for group in sorted(set(classes[members].tolist())):
            those = members[classes[members] == group]
            series.append(Series(labels[group], *_sorted(x[those], y[those]), group))
    return series


def al_series(table: StudyTable) -> list[Series]:
    """Return AL in nH against gap in mm, one series for all that differ in the gap only."""
    found = al_table(table).columns
    x, y = 1e3 * np.array(found["gap"]), 1e9 * np.array(found["al_value"])
    return [
        Series(label, *_sorted(x[members], y[members]), place)
        for place, (label, members) in enumerate(_same_but_gap(table, found["case"]).items())
    ]


def error_plane(table: StudyTable, formula: str) -> Plane:
    """Return the error of a formula over gap and window height.

    Parameters
    ----------
    table : StudyTable
        The study.
    formula : str
        Name of the formula.
    """
    cases = _usable(table, ["hand"])
    gaps, heights = _ratios(table, cases)
    columns, rows = _cells(gaps, MOST_CELLS[0]), _cells(heights, MOST_CELLS[1])
    error = np.full((len(rows[1]), len(columns[1])), np.nan)
    inside = np.ones(error.shape, dtype=bool)
    for case, row, column in zip(cases, rows[0].tolist(), columns[0].tolist(), strict=True):
        value, in_range = _of_formula(table, formula, case)
        inside[row, column] &= bool(in_range)
        if np.isnan(error[row, column]) or abs(value) > abs(error[row, column]):
            error[row, column] = value
    return Plane(formula, columns[1], rows[1], error, inside)


def _of_formula(table: StudyTable, formula: str, case: int) -> tuple[float, bool]:
    error = table.columns[f"hand.error.{formula}"][case]
    return error, bool(table.columns[f"hand.in_range.{formula}"][case])


def _picked(table: StudyTable, column: str, cases: Sequence[int]) -> list[Any]:
    values = table.columns[column]
    return [values[case] for case in cases]


def _with_settings(
    table: StudyTable, cases: Sequence[int], columns: Mapping[str, list[Any]], units: dict[str, str]
) -> ChartTable:
    known = dict.fromkeys(columns, "") | units
    settings = {key: _picked(table, key, cases) for key in table.settings}
    kept = {key: table.units[key] for key in table.settings}
    return ChartTable({"case": list(cases), **columns, **settings}, {"case": ""} | known | kept)


def _same_but_gap(table: StudyTable, cases: Sequence[int]) -> dict[str, NDArray[np.int64]]:
    """Return the places in `cases` of those that share all settings but those of gaps, by them."""
    keys = [key for key in table.settings if not key.startswith("gap")]
    groups: dict[str, list[int]] = {}
    for place, case in enumerate(cases):
        texts = (f"{key} {_short(table, key, case)}" for key in keys)
        groups.setdefault(", ".join(texts), []).append(place)
    return {label: np.array(members) for label, members in groups.items()}


def _short(table: StudyTable, key: str, case: int) -> str:
    """Return a setting for print: lengths in mm."""
    value, unit = table.columns[key][case], table.units[key]
    if isinstance(value, str):
        return value
    return f"{1e3 * value:.4g} mm" if unit == "m" else f"{value:.4g} {unit}".strip()


def _sorted(x: Array, y: Array) -> tuple[Array, Array]:
    order = np.argsort(x, kind="stable")
    return x[order], y[order]


def _rounded(values: Array) -> Array:
    return np.array([float(f"{value:.{FIGURES}g}") for value in values.tolist()])


def _classes(values: Array) -> tuple[NDArray[np.int64], list[str]]:
    """Return the class of each value and a label for each class."""
    place, middle = _cells(values, MOST_CLASSES)
    if len(set(_rounded(values).tolist())) == len(middle):
        return place, [f"{value:g}" for value in middle.tolist()]
    spans = [values[place == number] for number in range(len(middle))]
    return place, [f"{span.min():.3g} to {span.max():.3g}" for span in spans]


def _cells(values: Array, most: int) -> tuple[NDArray[np.int64], Array]:
    """Return the cell of each value and the middle of each cell: one a value, or `most` shares."""
    distinct, place = np.unique(_rounded(values), return_inverse=True)
    if len(distinct) <= most:
        return place, distinct
    limits = np.quantile(values, np.linspace(0.0, 1.0, most + 1)[1:-1])
    place = np.searchsorted(limits, values, side="right")
    used, place = np.unique(place, return_inverse=True)
    return place, _rounded(np.array([np.median(values[place == n]) for n in range(len(used))]))
