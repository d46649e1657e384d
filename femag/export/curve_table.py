"""A curve as a table of comma-separated values, SI."""

from __future__ import annotations

import csv
from pathlib import Path

from femag.current_curve import InductanceCurve
from femag.export.whole_file import whole_file

COLUMNS = (
    "current (A)",
    "flux linkage (Wb)",
    "apparent inductance (H)",
    "incremental inductance (H)",
    "coenergy lower (J)",
    "coenergy (J)",
    "coenergy upper (J)",
)


def write_curve_table(curve: InductanceCurve, path: str | Path) -> None:
    """Write a line for every point of a curve, under a line of names with units.

    Numbers have all their digits. The file is complete or not there.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    with whole_file(path) as temporary, temporary.open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(COLUMNS)
        for point in curve.points:
            energy = point.coenergy
            writer.writerow(
                (
                    point.current,
                    point.flux_linkage,
                    point.apparent_inductance,
                    point.incremental_inductance,
                    energy.lower,
                    energy.value,
                    energy.upper,
                )
            )
