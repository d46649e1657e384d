"""Loss in the copper in words: rows of a table, and what they leave out."""

from __future__ import annotations

from femag.quantities import LayerLoss, WindingLoss
from femag.result import Result
from femag.units import with_common_unit

LOSS_COLUMNS = ("loss of", "turns", "DC", "ripple", "crossing", "total")
MOST_LAYERS = 12
"""Layers of a winding up to which each has a row."""
LOSS_NOTE = (
    "DC: mean current. ripple: its own current, with skin effect. crossing: eddy currents by the "
    "ripple's field across the strands, that of the gap and of the other turns."
)


def loss_rows(result: Result) -> list[tuple[str, ...]]:
    """Return the rows under `LOSS_COLUMNS`: every layer, then every winding; W, all alike."""
    largest = max(_known(loss) for loss in result.copper_loss)
    rows = []
    for loss in result.copper_loss:
        several = len({layer.section for layer in loss.layers}) > 1
        if 1 < len(loss.layers) <= MOST_LAYERS:
            rows += [
                _row(_layer_name(row, several), row.turns, row, largest) for row in loss.layers
            ]
        turns = next(w.turns for w in result.design.windings if w.name == loss.name)
        rows.append(_row(f"winding {loss.name}", int(turns), loss, largest))
    return rows


def loss_notes(result: Result) -> list[str]:
    """Return what the losses are, and what they leave out."""
    notes = [f"winding {row.name}: {row.note}." for row in result.copper_loss if row.note]
    return [LOSS_NOTE, *notes]


def _layer_name(row: LayerLoss, several: bool) -> str:
    return f"  section {row.section}, layer {row.layer}" if several else f"  layer {row.layer}"


def _known(loss: WindingLoss) -> float:
    return max(part for part in (loss.dc, loss.ripple, loss.crossing, 0.0) if part is not None)


def _row(name: str, turns: int, loss: LayerLoss | WindingLoss, lead: float) -> tuple[str, ...]:
    """Return a row whose losses have the unit and decimals of the largest one."""
    parts = (loss.dc, loss.ripple, loss.crossing)
    total = sum(part for part in parts if part is not None) if None not in parts else None
    texts = with_common_unit((lead, *(part or 0.0 for part in (*parts, total))), "W")[1:]
    known = (
        "-" if part is None else text for part, text in zip((*parts, total), texts, strict=True)
    )
    return (name, f"{turns}", *known)
