"""Losses on the terminal: the core's, and all that are known added up."""

from __future__ import annotations

from rich.table import Table
from rich.text import Text

from femag.geometry import PotCore
from femag.materials import Steinmetz
from femag.quantities import CoreLoss
from femag.result import Result
from femag.ripple import Ripple
from femag.units import with_unit

NO_PARAMETERS = "No core loss: the material has no loss parameters; core.material.loss gives them."
METHOD = (
    "Improved generalised Steinmetz equation. A bias is not in it: it raises the loss, in ferrite "
    "under a strong one by a multiple (from memory). Nor is what goes on while the current rests."
)
STRAIGHT_LEGS = "The plates' loss is a lower estimate: this model spreads their flux too evenly."
BEND = 0.01
"""Share of the loss by which B may bend away from the current before it is said."""


def described_ripple(ripple: Ripple, peak: float) -> str:
    """Return a ripple in words, with the mean of a current whose peak is given (A)."""
    shape = {"triangle": "triangle", "sine": "sine", "samples": "waveform"}[ripple.shape]
    if ripple.shape == "triangle" and ripple.rise != 0.5:
        shape += f" rising {ripple.rise:g} of the period"
    return (
        f"ripple {ripple.peak_to_peak:g} A peak to peak at {with_unit(ripple.frequency, 'Hz', 3)}, "
        f"{shape}, mean {ripple.bias(peak):.4g} A"
    )


def loss_lines(result: Result) -> list[Text | Table | str]:
    """Return the lines about losses; without a ripple those of a constant current, if known."""
    if result.design.ripple is None:
        constant = constant_current_loss(result)
        return [Text(constant), ""] if constant else []
    lines: list[Text | Table | str] = []
    if result.core_loss is None:
        lines.append(Text(NO_PARAMETERS))
    else:
        straight = not isinstance(result.design.core, PotCore)
        lines += [
            _core_loss(result.core_loss, straight),
            Text(core_loss_notes(result.core_loss, straight)),
        ]
    return [*lines, "", *_budget(result), ""]


def constant_current_loss(result: Result) -> str:
    """Return the loss of a constant current in words; empty where it is not known."""
    budget = result.loss_budget
    if budget is None:
        return ""
    return (
        f"Loss in the copper: {with_unit(budget.total, 'W', 3)} at a constant "
        f"{abs(result.current):g} A. What a current that alternates adds, here and in the core, "
        "takes drive.ripple."
    )


def core_part(name: str, straight_legs: bool) -> str:
    """Return what a part of the core is called: a ring may stand for straight legs."""
    return "legs" if straight_legs and name == "ring" else name


def _core_loss(loss: CoreLoss, straight_legs: bool) -> Table:
    table = _columns("core loss", "W", "kW/m3", "mm3")
    for part in loss.parts:
        density = f"{1e-3 * part.loss / part.volume:.4g}"
        name = core_part(part.name, straight_legs)
        table.add_row(name, f"{part.loss:.4g}", density, f"{1e9 * part.volume:.0f}")
    volume = sum(part.volume for part in loss.parts)
    total = (f"{loss.total:.4g}", f"{1e-3 * loss.mean_density:.4g}", f"{1e9 * volume:.0f}")
    table.add_row(*(Text(text, style="bold") for text in ("whole core", *total)))
    return table


def core_loss_notes(loss: CoreLoss, straight_legs: bool) -> str:
    """Return what a core loss rests on, what it leaves out, and where it is out of range."""
    swings = ", ".join(f"{share.flux_density:.3f}" for share in loss.volume_shares)
    loops = f", {loss.minor_loops} minor loops apart" if loss.minor_loops else ""
    notes = [
        f"Half, 90 % and 99 % of the core's volume swing by less than {swings} T about the mean. "
        f"The two sides are {_apart(loss):.1g} % apart. "
        f"Shape of the current: {loss.waveform_factor:.4f} of the loss of a sine{loops}.",
        METHOD,
        f"{_parameters(loss.material)}.",
        *_range_notes(loss),
    ]
    if abs(loss.bend) > BEND:
        notes.append(
            "As the core saturates, B does not follow the current in proportion, which adds "
            f"{_percent(loss.bend)} %."
        )
    return " ".join([*notes, STRAIGHT_LEGS] if straight_legs else notes)


def _apart(loss: CoreLoss) -> float:
    flux, potential = loss.total_of_sides
    return 100.0 * abs(potential - flux) / loss.total


def _percent(share: float) -> str:
    """Return a share in per cent, to two digits or to one per cent."""
    percent = 100.0 * share
    return f"{percent:.0f}" if abs(percent) >= 10.0 else f"{percent:.2g}"


def _parameters(material: Steinmetz) -> str:
    at = "" if material.temperature is None else f" at {material.temperature:g} C"
    source = f"; {material.source}" if material.source else ""
    return (
        f"Parameters{at}: k {material.k:.4g}, alpha {material.alpha:.4g}, beta {material.beta:.4g} "
        f"(W/m3, Hz, T){source}"
    )


def _range_notes(loss: CoreLoss) -> list[str]:
    notes = []
    if not loss.frequency_in_range:
        low, high = (with_unit(f, "Hz", 3) for f in loss.material.frequencies)
        notes.append(f"The frequency is outside of {low} to {high}, where they were fitted.")
    if loss.share_in_range < 0.99:
        low, high = (with_unit(b, "T", 3) for b in loss.material.flux_densities)
        notes.append(
            f"{100.0 * (1.0 - loss.share_in_range):.0f} % of the loss arises outside of {low} to "
            f"{high}, where they were fitted."
        )
    return notes


def _budget(result: Result) -> list[Text | Table | str]:
    budget = result.loss_budget
    assert budget is not None
    table = _columns("losses", "W")
    for name, loss in budget.entries.items():
        table.add_row(name, "not known" if loss is None else f"{loss:.4g}")
    what = "known losses" if budget.missing else "all losses"
    table.add_row(Text(what, style="bold"), Text(f"{budget.total:.4g}", style="bold"))
    return [table]


def _columns(*names: str) -> Table:
    table = Table(box=None, padding=(0, 2, 0, 0), pad_edge=False, header_style="underline")
    for i, name in enumerate(names):
        table.add_column(name, justify="right" if i else "left", overflow="fold")
    return table
