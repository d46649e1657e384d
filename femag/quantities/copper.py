"""What the winding takes: layers, wire, resistance."""

from __future__ import annotations

from dataclasses import dataclass

from femag.design import Design, laid_windings
from femag.geometry import dc_resistance


@dataclass(frozen=True)
class WoundCopper:
    """The conductor of one winding.

    Parameters
    ----------
    name : str
        The winding.
    turns : int
        Its turns.
    layers : int
        Layers that they fill.
    fill : float
        Share of conductor in the room that there was to fill.
    mean_turn_length : float
        Length of a turn, m.
    wire_length : float
        Length of all turns, without leads, m.
    resistance : float
        Direct-current resistance, ohm.
    temperature : float
        Of the conductor, degrees Celsius.
    """

    name: str
    turns: int
    layers: int
    fill: float
    mean_turn_length: float
    wire_length: float
    resistance: float
    temperature: float


def wound_copper(design: Design) -> tuple[WoundCopper, ...]:
    """Return the conductor of every winding that has one."""
    laid = laid_windings(design)
    return tuple(
        WoundCopper(
            name=winding.name,
            turns=int(winding.turns),
            layers=len(layers.turns_in_layers),
            fill=layers.fill_of_room,
            mean_turn_length=layers.mean_turn_length,
            wire_length=layers.wire_length,
            resistance=dc_resistance(layers, layers.conductor, winding.metal, winding.temperature),
            temperature=float(winding.temperature),
        )
        for winding in design.windings
        if (layers := laid.get(winding.name)) is not None
    )
