"""The losses of the sheet: copper by layers, core by parts, and all of them added up."""

from __future__ import annotations

from femag.copper_answer import LOSS_COLUMNS, loss_notes, loss_rows
from femag.geometry import PotCore
from femag.loss_answer import (
    NO_PARAMETERS,
    constant_current_loss,
    core_loss_notes,
    core_part,
    described_ripple,
)
from femag.quantities import CoreLoss
from femag.result import Result
from femag.sheet.tables import Table
from femag.sheet.texts import shown, with_micro

NO_RIPPLE = (
    "Losses were not computed: the drive has no ripple, and a winding that carries its current no "
    "conductor. The keys ripple and frequency of the table [drive] give it one."
)


def loss_tables(result: Result) -> tuple[Table, ...]:
    """Return the tables of the losses; none without a ripple."""
    if result.design.ripple is None:
        return ()
    tables = [_copper_table(result)] if result.copper_loss else []
    if result.core_loss is not None:
        straight = not isinstance(result.design.core, PotCore)
        tables.append(_core_table(result.core_loss, straight))
    return (*tables, _budget_table(result))


def loss_texts(result: Result) -> tuple[str, ...]:
    """Return what the losses belong to, what they are, and what they leave out."""
    design = result.design
    if design.ripple is None:
        return (constant_current_loss(result) or NO_RIPPLE,)
    drive = described_ripple(design.ripple, design.current)
    texts = [f"{drive[0].upper()}{drive[1:]}.", *(loss_notes(result) if result.copper_loss else [])]
    if result.core_loss is None:
        return (*texts, NO_PARAMETERS)
    return (*texts, core_loss_notes(result.core_loss, not isinstance(design.core, PotCore)))


def _copper_table(result: Result) -> Table:
    """Return layers and windings; a layer is named with its winding, whose row comes after it."""
    rows: list[tuple[str, ...]] = []
    winding = ""
    for name, *cells in reversed(loss_rows(result)):
        is_layer = name.startswith(" ")
        winding = winding if is_layer else name
        name = f"{winding}, {name.strip()}" if is_layer else name
        rows.insert(0, (name, *(with_micro(cell.strip()) for cell in cells)))
    return Table("Loss in the copper", LOSS_COLUMNS, tuple(rows))


def _core_table(loss: CoreLoss, straight_legs: bool) -> Table:
    rows = [
        (core_part(part.name, straight_legs), shown(part.loss, "W"),
         f"{1e-3 * part.loss / part.volume:.4g}", f"{1e9 * part.volume:.0f}")
        for part in loss.parts
    ]  # fmt: skip
    volume = sum(part.volume for part in loss.parts)
    total = shown(loss.total, "W"), f"{1e-3 * loss.mean_density:.4g}", f"{1e9 * volume:.0f}"
    rows.append(("whole core", *total))
    cubed = "\N{SUPERSCRIPT THREE}"
    return Table("Loss in the core", ("part", "loss", f"kW/m{cubed}", f"mm{cubed}"), tuple(rows))


def _budget_table(result: Result) -> Table:
    budget = result.loss_budget
    assert budget is not None
    rows = [
        (name, "not known" if loss is None else shown(loss, "W"))
        for name, loss in budget.entries.items()
    ]
    rows.append(("known losses" if budget.missing else "all losses", shown(budget.total, "W")))
    return Table("Losses added up", ("", "loss"), tuple(rows))
