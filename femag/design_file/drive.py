"""The table drive: what of the current repeats, from numbers or from a file of one period."""

from __future__ import annotations

from pathlib import Path

from femag.design_file.tables import DriveTable
from femag.design_file.waveform_file import read_ripple
from femag.errors import InputError
from femag.ripple import Ripple


def drive_ripple(table: DriveTable, folder: Path) -> Ripple | None:
    """Return the ripple of a drive, None without one; a path resolves against `folder`.

    Raises
    ------
    InputError
        If keys do not go together, or the waveform cannot be had.
    """
    given = table.model_fields_set
    if table.waveform is not None:
        for key in ("ripple", "shape", "rise"):
            if key in given:
                raise InputError(
                    "stands beside drive.waveform", key=f"drive.{key}", accepted="one of the two"
                )
        return _ripple_of_waveform(table, folder)
    if table.ripple is None:
        for key in ("frequency", "shape", "rise"):
            if key in given:
                raise InputError(
                    "needs a ripple", key=f"drive.{key}",
                    accepted="drive.ripple = '1 A' or drive.waveform = 'ripple.csv' beside it",
                )  # fmt: skip
        return None
    if table.shape != "triangle" and "rise" in given:
        raise InputError(
            f"a {table.shape} has no rise", key="drive.rise", accepted="shape = 'triangle'"
        )
    return Ripple(table.ripple, _frequency(table), table.shape, table.rise)


def _ripple_of_waveform(table: DriveTable, folder: Path) -> Ripple:
    if isinstance(table.waveform, str):
        return read_ripple(folder / table.waveform, table.frequency)
    return Ripple.of_samples(table.waveform or (), _frequency(table))


def _frequency(table: DriveTable) -> float:
    if table.frequency is None:
        raise InputError(
            "missing", key="drive.frequency",
            accepted="a frequency with its unit, such as '100 kHz'",
        )  # fmt: skip
    return table.frequency
