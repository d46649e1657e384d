"""What the winding takes: layers, wire, resistance."""

from __future__ import annotations

from dataclasses import dataclass

from femag.design import Design, wound_coils
from femag.geometry import Coil, dc_resistance


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
        Layers that they fill; the most in a section.
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
    turns_in_sections, layers_in_sections : tuple of int
        Turns and layers of each section, from the lowest upwards.
    """

    name: str
    turns: int
    layers: int
    fill: float
    mean_turn_length: float
    wire_length: float
    resistance: float
    temperature: float
    turns_in_sections: tuple[int, ...]
    layers_in_sections: tuple[int, ...]


def wound_copper(design: Design) -> tuple[WoundCopper, ...]:
    """Return the conductor of every winding that has one."""
    return tuple(_copper_of(coil) for coil in wound_coils(design) if coil.layers)


def _copper_of(coil: Coil) -> WoundCopper:
    winding = coil.winding
    layers_in_sections = tuple(len(layers.turns_in_layers) for layers in coil.layers)
    return WoundCopper(
        name=winding.name,
        turns=int(winding.turns),
        layers=max(layers_in_sections),
        fill=coil.fill_of_room,
        mean_turn_length=coil.mean_turn_length,
        wire_length=coil.wire_length,
        resistance=sum(
            dc_resistance(layers, winding.metal, winding.temperature) for layers in coil.layers
        ),
        temperature=float(winding.temperature),
        turns_in_sections=tuple(layers.turns for layers in coil.layers),
        layers_in_sections=layers_in_sections,
    )
