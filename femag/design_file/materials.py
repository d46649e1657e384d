"""The key core.material: a name, a file, points or parameters to a magnetisation curve."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from femag.design_file.messages import keyed
from femag.design_file.tables import MaterialTable
from femag.errors import InputError
from femag.materials import (
    FroehlichCurve,
    LinearCurve,
    MagnetisationCurve,
    TabulatedCurve,
    curve_through,
    material,
    read_material,
)

KINDS = ("permeability", "points", "file", "name")
BESIDE = {
    "permeability": ("saturation", "exponent"),
    "points": ("name", "source", "notes"),
    "file": ("temperature",),
    "name": ("temperature",),
}
"""What may stand beside each way to give a material."""


def material_curve(table: MaterialTable, folder: Path) -> MagnetisationCurve:
    """Return the curve of the key core.material; a path resolves against `folder`.

    Loss parameters in the table take the place of the material's.

    Raises
    ------
    InputError
        If keys do not go together, or the material cannot be had.
    """
    curve = _curve(table, _kind(table), folder)
    if table.loss is None:
        return curve
    assert isinstance(curve, LinearCurve | FroehlichCurve | TabulatedCurve)
    return replace(curve, loss=table.loss)


def _curve(table: MaterialTable, kind: str, folder: Path) -> MagnetisationCurve:
    with keyed("permeability saturation exponent points temperature source", "core.material."):
        if kind == "points":
            return _curve_of_points(table)
        if kind == "permeability":
            return _curve_of_parameters(table)
        if kind == "file":
            assert table.file is not None
            return read_material(folder / table.file).at(table.temperature)
        assert table.name is not None
        try:
            return material(table.name, table.temperature)
        except InputError as error:
            raise error.changed(key="core.material" if error.key == "name" else None) from error


def _kind(table: MaterialTable) -> str:
    """Return which of the ways to give a material was taken."""
    given = table.model_fields_set
    kind = next((kind for kind in KINDS if kind in given), None)
    if kind is None:
        raise InputError(
            "nothing says what the material is", key="core.material",
            accepted="one of permeability, name, file and points",
        )  # fmt: skip
    for key in sorted(given - {kind, "loss", *BESIDE[kind]}):
        raise InputError(
            f"does not go with {kind}", key=f"core.material.{key}",
            accepted=f"beside {kind}: {', '.join(BESIDE[kind])}",
        )  # fmt: skip
    return kind


def _curve_of_parameters(table: MaterialTable) -> MagnetisationCurve:
    assert table.permeability is not None
    if table.saturation is not None:
        return FroehlichCurve(
            table.permeability, table.saturation, 1.0 if table.exponent is None else table.exponent
        )
    if table.exponent is not None:
        raise InputError(
            "an exponent needs a saturation", key="exponent", value=table.exponent,
            accepted="saturation = '0.45 T' beside it, or no exponent",
        )  # fmt: skip
    return LinearCurve(table.permeability)


def _curve_of_points(table: MaterialTable) -> MagnetisationCurve:
    assert table.points is not None
    points: Sequence[tuple[float, float]] = table.points
    h, b = np.array(points, dtype=float).reshape(-1, 2).T
    return curve_through(
        h, b, name=table.name or "", source=table.source or "", notes=tuple(table.notes)
    )
