"""Loss in the copper: by direct current, by the ripple's own current, and by the field across it.

The third is that of the squared field: eddy currents that the ripple's field drives in a strand,
near the gap by its fringe field, elsewhere by the field of the other turns.

References
----------
C. R. Sullivan, "Computationally efficient winding loss calculation with multiple windings,
arbitrary waveforms, and two-dimensional or three-dimensional field geometry", IEEE Trans. Power
Electron. 16 (2001) 142 (cited from memory); the factors in `femag.quantities.ac_factors`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.design import Design, whole_section, wound_coils
from femag.field.bounds import FieldSolution
from femag.field.regional import settled_solution
from femag.geometry import (
    Coil,
    Conductor,
    Foil,
    Layers,
    LitzWire,
    RoundLegCore,
    RoundWire,
    gap_length,
    resistivity,
)
from femag.quantities.ac_factors import (
    foil_crossing_factor,
    foil_skin_factor,
    round_crossing_factor,
    round_skin_factor,
    skin_depth,
)
from femag.quantities.ripple_field import RippleField, ripple_field
from femag.quantities.turn_field import crossing_square, share_through_foil, turn_field
from femag.ripple import Ripple

Array = NDArray[np.float64]

FIELD_ACCURACY = 0.02

MOST_LISTED = 10_000
"""Turns of a winding up to which the loss of each is listed."""

NO_CONDUCTOR = (
    "no conductor: the squared field only, no loss; winding.conductor says what the turns are "
    "made of"
)
AT_STRAIGHT_LEGS = (
    "a spacer opens the straight legs too, and the core of revolution has no usable field beside "
    "them: a field in three dimensions is needed for the loss by the field across the turns"
)


@dataclass(frozen=True)
class LayerLoss:
    """Loss of one layer of a winding.

    Parameters
    ----------
    section, layer : int
        From 1: section from the lowest, layer from inside.
    turns : int
        In it.
    radius : float
        Of its middle, m.
    dc : float
        Resistance times mean current squared, W.
    ripple : float or None
        Of the ripple's own current, skin effect included, W; None where out of range.
    crossing : float or None
        By the ripple's field across the strands, W; None where out of range.
    """

    section: int
    layer: int
    turns: int
    radius: float
    dc: float
    ripple: float | None
    crossing: float | None


@dataclass(frozen=True)
class WindingLoss:
    """Loss of one winding.

    Parameters
    ----------
    name : str
        The winding.
    dc, ripple, crossing : float or None
        Sums over its layers, W; None where out of range or without conductor: the note says why.
    squared_field : float
        Mean over time of the ripple's |B|^2, integrated over the volume of the winding, T2 m3.
    layers : tuple of LayerLoss
        By sections from the lowest, layers from inside; none without a conductor.
    crossing_of_turns : tuple of float
        `crossing` of each turn, by layers and upwards in each; empty where it is None and from
        `MOST_LISTED` turns on.
    note : str
        What is left out, in words; empty if nothing.
    """

    name: str
    dc: float | None
    ripple: float | None
    crossing: float | None
    squared_field: float
    layers: tuple[LayerLoss, ...]
    crossing_of_turns: tuple[float, ...]
    note: str

    @property
    def total(self) -> float | None:
        """Loss, W; None where a part of it is."""
        parts = (self.dc, self.ripple, self.crossing)
        return sum(parts) if None not in parts else None  # type: ignore[arg-type]


@dataclass(frozen=True, eq=False)
class _TurnLosses:
    """Losses of the turns of a section, W, (turns,) each, per what drives them."""

    dc: Array
    ripple: Array | None
    crossing: Array | None
    through_foil: float = 0.0


def copper_loss(
    design: Design, solution: FieldSolution, accuracy: float = FIELD_ACCURACY
) -> tuple[WindingLoss, ...]:
    """Return the loss of every winding of a design with a ripple; none without.

    The peak current of the design holds the ripple; the field is that of a small change about the
    mean current, the same for every harmonic.

    Parameters
    ----------
    design : Design
        With its ripple.
    solution : FieldSolution
        Of the design at its current; its mesh is refined in the windings first.
    accuracy : float
        Root mean square distance of the fields of both sides in the windings, over that of the
        field. The loss by the field is off by about a tenth of it (measured).

    Raises
    ------
    NumericalError
        If the field at the mean current cannot be solved.
    """
    if design.ripple is None:
        return ()
    copper = {region.name for region in whole_section(design).regions if region.winding}
    close, side = settled_solution(solution, copper, accuracy)
    field = ripple_field(close, design.ripple.bias(design.current), side)
    return tuple(_winding_loss(design, coil, field) for coil in wound_coils(design))


def _winding_loss(design: Design, coil: Coil, field: RippleField) -> WindingLoss:
    assert design.ripple is not None
    name, conductor = coil.winding.name, coil.winding.conductor
    regions = tuple(r.name for r in whole_section(design).regions if r.winding == name)
    squared = design.ripple.rms**2 * field.squared_in(regions)
    if conductor is None:
        return WindingLoss(name, None, None, None, squared, (), (), NO_CONDUCTOR)
    sections = [_turn_losses(design, coil, layers, field) for layers in coil.layers]
    rows = tuple(
        row
        for number, (layers, losses) in enumerate(zip(coil.layers, sections, strict=True), 1)
        for row in _layer_losses(number, layers, losses)
    )
    crossing = [turn.crossing for turn in sections if turn.crossing is not None]
    listed = coil.winding.turns <= MOST_LISTED and len(crossing) > 0
    return WindingLoss(
        name=name,
        dc=_sum([row.dc for row in rows]),
        ripple=_sum([row.ripple for row in rows]),
        crossing=_sum([row.crossing for row in rows]),
        squared_field=squared,
        layers=rows,
        crossing_of_turns=tuple(np.concatenate(crossing).tolist()) if listed else (),
        note=_note(design, coil, sections),
    )


def _turn_losses(design: Design, coil: Coil, layers: Layers, field: RippleField) -> _TurnLosses:
    """Return the losses of the turns of a section."""
    assert design.ripple is not None
    winding, conductor = coil.winding, layers.conductor
    rho = resistivity(winding.metal, winding.temperature)
    length = 2.0 * np.pi * layers.positions[:, 0]
    resistance = rho * length / conductor.copper_area
    is_driven = winding in design.driven_windings
    bias = design.ripple.bias(design.current) if is_driven else 0.0
    dc = bias**2 * resistance
    if _is_thick_foil(conductor, design.ripple, rho):
        return _TurnLosses(dc, None, None)
    skin, crossing = _spectrum(conductor, design.ripple, rho)
    ripple = (skin if is_driven else 0.0) * resistance
    if _has_gap_at_straight_legs(design):
        return _TurnLosses(dc, ripple, None)
    turns = turn_field(field, layers, design.detail, is_driven=is_driven)
    by_field = crossing * length * crossing_square(turns, conductor)
    through = share_through_foil(turns) if isinstance(conductor, Foil) else 0.0
    return _TurnLosses(dc, ripple, by_field, through)


def _spectrum(conductor: Conductor, ripple: Ripple, rho: float) -> tuple[float, float]:
    """Return what the harmonics add up to, as laid conductors see them.

    Returns
    -------
    skin : float
        Loss over the resistance to direct current, A2.
    crossing : float
        Loss over length and squared field per squared ampere, W A2/(m T2).
    """
    frequency, amplitude = ripple.harmonics(ripple.enough_harmonics())
    mean_square = 0.5 * np.abs(amplitude) ** 2
    slope_square = (2.0 * np.pi * frequency) ** 2 * mean_square
    depth = skin_depth(frequency, rho)
    if isinstance(conductor, Foil):
        ratio = conductor.thickness / depth
        section = conductor.thickness**3 * conductor.axial_size / (12.0 * rho)
        skin, crossing = foil_skin_factor(ratio), foil_crossing_factor(ratio)
    else:
        diameter, strands = _strand(conductor)
        ratio = diameter / depth
        section = strands * np.pi * diameter**4 / (64.0 * rho)
        skin, crossing = round_skin_factor(ratio), round_crossing_factor(ratio)
    resistive = ripple.rms**2 + np.sum(mean_square * (skin - 1.0))
    return float(resistive), float(section * np.sum(slope_square * crossing))


def _strand(conductor: RoundWire | LitzWire) -> tuple[float, int]:
    """Return diameter (m) and number of the strands."""
    if isinstance(conductor, LitzWire):
        return conductor.strand_diameter, conductor.strands
    return conductor.diameter, 1


def _is_thick_foil(conductor: Conductor, ripple: Ripple, rho: float) -> bool:
    depth = float(skin_depth(ripple.frequency, rho))
    return isinstance(conductor, Foil) and conductor.thickness > depth


def _has_gap_at_straight_legs(design: Design) -> bool:
    return isinstance(design.core, RoundLegCore) and gap_length(design.gaps, "all") > 0.0


def _layer_losses(number: int, layers: Layers, losses: _TurnLosses) -> list[LayerLoss]:
    """Return the losses of the layers of section `number`."""
    ends = np.cumsum(layers.turns_in_layers)
    starts = ends - np.array(layers.turns_in_layers)

    def within(values: Array | None, start: int, end: int) -> float | None:
        return None if values is None else float(values[start:end].sum())

    return [
        LayerLoss(
            section=number,
            layer=layer,
            turns=int(end - start),
            radius=float(layers.positions[start, 0]),
            dc=float(losses.dc[start:end].sum()),
            ripple=within(losses.ripple, start, end),
            crossing=within(losses.crossing, start, end),
        )
        for layer, (start, end) in enumerate(zip(starts, ends, strict=True), 1)
    ]


def _sum(values: list[float] | list[float | None]) -> float | None:
    known = [value for value in values if value is not None]
    return math.fsum(known) if len(known) == len(values) else None


def _note(design: Design, coil: Coil, sections: list[_TurnLosses]) -> str:
    """Say what the loss of a winding leaves out."""
    assert design.ripple is not None
    conductor, winding = coil.layers[0].conductor, coil.winding
    if sections[0].ripple is None:
        assert isinstance(conductor, Foil)
        rho = resistivity(winding.metal, winding.temperature)
        depth = 1e3 * float(skin_depth(design.ripple.frequency, rho))
        return (
            f"foil of {1e3 * conductor.thickness:g} mm is thicker than a skin depth, {depth:.3g} "
            "mm: its current moves towards the gap, and a field with eddy currents is needed"
        )
    if sections[0].crossing is None:
        return AT_STRAIGHT_LEGS
    if isinstance(conductor, Foil):
        share = max(section.through_foil for section in sections)
        return (
            f"a lower estimate: the field through the foil, {share:.2g} of its mean square, drives "
            "currents across its width that are left out; beside a gap they can be many times the "
            "rest"
        )
    return ""
