"""The JSON file of a keep-out distance. The table below is the format."""

from __future__ import annotations

from typing import Any, Literal

from femag.copper_distance import KeepOut
from femag.design_file import design_document
from femag.export.document import Entry


class KeepOutCurveEntry(Entry):
    """Squared field over its gap-free level at each distance; pitch in m."""

    pieces: int
    pitch: float
    winding: tuple[float, ...]
    layer: tuple[float, ...]


class KeepOutDocument(Entry):
    """Squared field against distance, SI."""

    format: Literal["gapfield keep-out 1"]
    gap: float
    distance: float
    distances: tuple[float, ...]
    curves: list[KeepOutCurveEntry]
    design: dict[str, Any]
    design_hash: str
    versions: dict[str, str]
    seconds: float


def keep_out_json(found: KeepOut) -> str:
    """Return a keep-out answer as JSON text, SI units throughout."""
    document = KeepOutDocument(
        format="gapfield keep-out 1",
        gap=found.gap,
        distance=found.distance,
        distances=found.distances,
        curves=[KeepOutCurveEntry(**vars(curve)) for curve in found.curves],
        design=design_document(found.design),
        design_hash=found.design_hash,
        versions=found.versions,
        seconds=found.seconds,
    )
    return document.model_dump_json(indent=2) + "\n"
