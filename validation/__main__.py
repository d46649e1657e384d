"""Print the validation table: ``python -m validation``, exit code 0 if every row passes."""

from __future__ import annotations

import importlib
from collections.abc import Iterator, Sequence

from validation.rows import Row
from validation.table import HEADER, LEGEND, row_line

FOLDERS = (
    "uniform_field",
    "air_coils",
    "coupled_coils",
    "sphere",
    "nonlinear_pot",
    "core_loss",
    "round_post_fringing",
    "gap_force",
    "finite_post",
    "pot_core_26_16",
    "round_leg_3d",
    "handbook_tables",
)
"""In order of what they rest on: closed forms first, makers' tables last."""


def folder_rows(folder: str) -> tuple[Row, ...]:
    """Return the rows of a folder; this solves its problems."""
    rows: tuple[Row, ...] = importlib.import_module(f"validation.{folder}.run").rows()
    return rows


def printed_rows(folders: Sequence[str]) -> Iterator[Row]:
    """Print the table folder by folder and yield its rows."""
    for folder in folders:
        print(f"\n{folder}\n{HEADER}")
        for row in folder_rows(folder):
            print(row_line(row), flush=True)
            yield row


def main(folders: Sequence[str] = ()) -> int:
    """Print the table of folders, all by default, and return the exit code."""
    print(LEGEND)
    rows = tuple(printed_rows(folders or FOLDERS))
    failed = [f"{row.case}, {row.quantity}" for row in rows if not row.passed]
    print(f"\n{len(rows)} rows, {len(failed)} failed" + "".join(f"\n  {name}" for name in failed))
    return 1 if failed else 0


if __name__ == "__main__":
    raise SystemExit(main())
