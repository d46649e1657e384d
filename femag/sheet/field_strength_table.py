"""H against |B| of a material as a short table, as close as a page shows it."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from femag.materials import MagnetisationCurve

Array = NDArray[np.float64]

FIELD_STRENGTH_ERROR = 1e-6
"""Largest relative error of H between the entries, at the places that were looked at."""
FIRST = 17
"""Entries to start with."""
PLACES = np.array([0.25, 0.5, 0.75])
"""Where in each interval the table is held against the curve."""
ROUNDS = 40


class FieldStrengthTable(NamedTuple):
    """H of a material between entries by the cubic that has its values and slopes.

    Parameters
    ----------
    b : array, (n,)
        Flux density, T, rising from 0.
    h : array, (n,)
        Field strength, A/m.
    slope : array, (n,)
        dH/dB, m/H.
    """

    b: Array
    h: Array
    slope: Array


def field_strength_table(curve: MagnetisationCurve, largest: float) -> FieldStrengthTable:
    """Return the table of a material up to a flux density in T.

    Intervals are halved until the cubic is as close as `FIELD_STRENGTH_ERROR`. A linear material
    needs two entries.
    """
    b = np.array([0.0, largest]) if curve.is_linear else np.linspace(0.0, largest, FIRST)
    for _ in range(ROUNDS):
        table = _entries(curve, b)
        wide = _is_off(curve, table)
        if not np.any(wide):
            break
        b = np.sort(np.concatenate([b, 0.5 * (b[:-1] + b[1:])[wide]]))
    return table


def interpolated(table: FieldStrengthTable, b: Array) -> Array:
    """Return H in A/m at flux densities in T within the table."""
    i = np.clip(np.searchsorted(table.b, b, side="right") - 1, 0, len(table.b) - 2)
    width = table.b[i + 1] - table.b[i]
    t = (b - table.b[i]) / width
    return np.asarray(
        (1 + 2 * t) * (1 - t) ** 2 * table.h[i]
        + t * (1 - t) ** 2 * width * table.slope[i]
        + t**2 * (3 - 2 * t) * table.h[i + 1]
        - t**2 * (1 - t) * width * table.slope[i + 1]
    )


def _entries(curve: MagnetisationCurve, b: Array) -> FieldStrengthTable:
    h = curve.field_strength(b)
    return FieldStrengthTable(b, h, 1.0 / curve.differential_permeability(h))


def _is_off(curve: MagnetisationCurve, table: FieldStrengthTable) -> NDArray[np.bool_]:
    """Return which intervals are not close enough, (n - 1,)."""
    places = table.b[:-1, None] + np.diff(table.b)[:, None] * PLACES
    exact = curve.field_strength(places)
    off = np.abs(interpolated(table, places) - exact) > FIELD_STRENGTH_ERROR * exact
    return np.asarray(np.any(off, axis=1))
