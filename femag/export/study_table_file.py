"""Study tables as files: CSV, Parquet, NetCDF; SI units throughout, said in the file."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from femag.errors import InputError
from femag.export.whole_file import whole_file
from femag.study import StudyTable
from femag.study.charts import ChartTable
from femag.study.table import optional

SUFFIXES = (".csv", ".parquet", ".nc")


def check_table_target(path: str | Path) -> None:
    """Refuse before the work a file that no table can be written to.

    Raises
    ------
    InputError
        If its ending is unknown or its folder is not there.
    MissingLibraryError
        If a library for that ending is not installed.
    """
    file = Path(path)
    if file.suffix.lower() not in SUFFIXES:
        accepted = f"an ending of {', '.join(SUFFIXES)}"
        raise InputError("no format of a table", file=str(path), accepted=accepted)
    if file.is_dir() or not file.parent.is_dir():
        raise InputError(
            "cannot be written", file=str(path), accepted="a file in a folder that exists"
        )
    for library in {".parquet": ("pandas", "pyarrow"), ".nc": ("xarray",)}.get(file.suffix, ()):
        optional(library)


def write_table(table: StudyTable, path: str | Path) -> None:
    """Write a table by the ending of its file, which is complete or not there.

    ``.csv`` has one heading of names with units, such as ``gap.length [m]``; ``.parquet`` carries
    the units in its metadata (pandas' ``attrs``), ``.nc`` as attributes.

    Raises
    ------
    InputError
        If the file cannot be written or its ending names no format.
    MissingLibraryError
        If a library for that ending is not installed.
    """
    check_table_target(path)
    write = {".csv": _write_csv, ".parquet": _write_parquet, ".nc": _write_netcdf}
    with whole_file(path) as temporary:
        write[Path(path).suffix.lower()](table, temporary)


def write_chart_table(table: ChartTable, path: str | Path) -> None:
    """Write the table behind a chart as CSV, which is complete or not there.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    with whole_file(path) as temporary:
        _write_columns(table.columns, table.units, temporary)


def _write_csv(table: StudyTable, path: Path) -> None:
    _write_columns(table.columns, table.units, path)


def _write_columns(
    columns: Mapping[str, Sequence[Any]], units: Mapping[str, str], path: Path
) -> None:
    """Write columns, each headed by its name and unit; None is left empty."""
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(f"{name} [{units[name]}]" if units[name] else name for name in columns)
        writer.writerows(zip(*columns.values(), strict=True))


def _write_parquet(table: StudyTable, path: Path) -> None:
    table.frame().to_parquet(path, engine="pyarrow", index=False)


def _write_netcdf(table: StudyTable, path: Path) -> None:
    table.dataset().to_netcdf(path, engine="scipy", format="NETCDF3_64BIT")
