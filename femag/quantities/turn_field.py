"""The ripple's field over the metal of each turn, as moments, and what of it crosses a strand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.geometry import Conductor, Detail, Foil, Layers, LitzWire, RoundWire
from femag.quantities.ripple_field import RippleField
from femag.units import MU_0

Array = NDArray[np.float64]

FINELY = 2_000
"""Turns up to which a round section is sampled at 24 points, above at 4."""
ALONG_FOIL = 48
"""Pieces that the height of a foil is sampled in, 3 points across its thickness in each."""


@dataclass(frozen=True, eq=False)
class TurnField:
    """The field over the metal of turns; of a round section over its circle.

    Parameters
    ----------
    mean : array, (2, turns)
        Mean of B_r and of B_z over the section, T/A.
    square : array, (2, turns)
        Mean of B_r^2 and of B_z^2, T2/A2.
    density : float
        Current density that the solved field has there, 1/m2 (per ampere).
    """

    mean: Array
    square: Array
    density: float


def turn_field(field: RippleField, layers: Layers, detail: Detail, *, is_driven: bool) -> TurnField:
    """Return the field over each of laid turns.

    Parameters
    ----------
    field : RippleField
        Of the design.
    layers : Layers
        The turns.
    detail : {"block", "turn"}
        How the field was solved.
    is_driven : bool
        Whether the turns carry the ripple.

    Notes
    -----
    The means are exact for fields of degree 5 (degree 3 from `FINELY` turns on) over a circle.
    """
    offsets, weights = _samples(layers.conductor, len(layers.positions))
    points = layers.positions[:, None, :] + offsets
    b = field.at_points(points.reshape(-1, 2).T).reshape(2, -1, len(weights))
    density = 1.0 / _current_area(layers.conductor, detail) if is_driven else 0.0
    return TurnField(b @ weights, b**2 @ weights, density)


def crossing_square(turns: TurnField, conductor: Conductor) -> Array:
    """Return the squared field in T2/A2 that acts on the strands of each turn, (turns,).

    Notes
    -----
    What a turn's own current makes of the field over its section is known for a straight turn:
    mean squares (mu0 J)^2 a^2/8 over a circle of radius a and (mu0 J t)^2/12 across a foil, with
    no mean field. It is taken off as far as the solved field holds it.

    Round wire: the mean field squared, and a third of the mean square about it, since the loss by
    a field that grows across the wire, A = G r^2 sin(2 phi)/2, is a third of what its mean square
    would give by the rule for uniform fields (both from A at low frequency, derived here). Its own
    field is left to the skin factor.

    Litz: the mean square over the bundle, that of the bundle's current at its own density included.

    Foil: the mean square of the component along its faces, less its own part, which is left to the
    skin factor. That through the foil is not in it.
    """
    if isinstance(conductor, Foil):
        own = (MU_0 * turns.density * conductor.thickness) ** 2 / 12.0
        return np.asarray(np.maximum(turns.square[1] - own, 0.0))
    radius = 0.5 * _carrying_diameter(conductor)
    mean = np.sum(turns.mean**2, axis=0)
    own = (MU_0 * turns.density * radius) ** 2 / 8.0
    gradient = np.maximum(np.sum(turns.square, axis=0) - mean - own, 0.0)
    if isinstance(conductor, RoundWire):
        return np.asarray(mean + gradient / 3.0)
    bundle = (MU_0 * radius / _current_area(conductor, "turn")) ** 2 / 8.0
    return np.asarray(mean + gradient + (bundle if turns.density else 0.0))


def share_through_foil(turns: TurnField) -> float:
    """Return the squared field through foils over that of both components."""
    return float(np.sum(turns.square[0]) / np.sum(turns.square))


def _current_area(conductor: Conductor, detail: Detail) -> float:
    """Return the area in m2 over which the solved field spreads a turn's current."""
    if detail == "block":
        return conductor.radial_size * conductor.axial_size
    if isinstance(conductor, LitzWire):
        return float(np.pi / 4 * _carrying_diameter(conductor) ** 2)
    return conductor.copper_area


def _carrying_diameter(conductor: RoundWire | LitzWire) -> float:
    """Return the diameter of bare wire or of the bundle inside of its wrapping, m."""
    if isinstance(conductor, RoundWire):
        return conductor.diameter
    return conductor.radial_size - 2.0 * conductor.insulation


def _samples(conductor: Conductor, turns: int) -> tuple[Array, Array]:
    """Return places (n, 2) in m about the centre of a turn and their weights, sum 1."""
    if isinstance(conductor, Foil):
        return _rectangle_samples(conductor.thickness, conductor.axial_size)
    rings, spokes = (3, 8) if turns <= FINELY else (1, 4)
    share, weight = np.polynomial.legendre.leggauss(rings)
    radius = 0.5 * _carrying_diameter(conductor) * np.sqrt(0.5 * (1.0 + share))
    angle = 2.0 * np.pi * (np.arange(spokes) + 0.5) / spokes
    along = np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    places = radius[:, None, None] * along
    return places.reshape(-1, 2), np.repeat(0.5 * weight / spokes, spokes)


def _rectangle_samples(width: float, height: float) -> tuple[Array, Array]:
    """Return Gauss points across and midpoints of equal pieces along a rectangle."""
    share, weight = np.polynomial.legendre.leggauss(3)
    along = (np.arange(ALONG_FOIL) + 0.5) / ALONG_FOIL - 0.5
    r, z = np.meshgrid(0.5 * width * share, height * along, indexing="ij")
    return np.stack([r, z], axis=-1).reshape(-1, 2), np.repeat(
        0.5 * weight / ALONG_FOIL, ALONG_FOIL
    )
