"""Conductors that a winding is laid with, and the metals that they are made of."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, number

SIZES = (1e-7, 1.0)
"""Smallest and largest size of a conductor, m; common practice, no source."""

MOST_STRANDS = 1_000_000

LITZ_PACKING = 0.5
"""Copper over the bundle's circle; common practice, no source. A bundle of n enamelled strands is
about 1.28 sqrt(n) strands wide, which fills 0.61 of it, and 0.7 to 0.85 of that is copper."""

DENSEST_PACKING = math.pi / math.sqrt(12.0)
"""Share of the plane that equal circles can fill (hexagonal); two or more in a circle fill less."""

SIDES = 12
"""Sides of the polygon that stands for a circle; a multiple of 4."""

TEMPERATURES = (-100.0, 300.0)
"""Where resistivity is taken as linear, C; common practice, no source."""

_LENGTH = f"a length from {SIZES[0] * 1e6:g} um to {SIZES[1]:g} m"
_INSULATION = f"a length from 0 to {SIZES[1]:g} m"


@dataclass(frozen=True)
class RoundWire:
    """Solid round wire.

    Parameters
    ----------
    diameter : float
        Of the bare metal, m.
    insulation : float
        Thickness of the coating all round, m; it counts twice in the outer diameter.
    """

    diameter: float
    insulation: float = 0.0

    def __post_init__(self) -> None:
        _check_size(self.diameter, "conductor.round")
        _check_insulation(self.insulation)

    @property
    def copper_area(self) -> float:
        """Area of the metal in the section, m2."""
        return math.pi / 4 * self.diameter**2

    @property
    def radial_size(self) -> float:
        """Room of one turn along r, m: the outer diameter."""
        return self.diameter + 2 * self.insulation

    @property
    def axial_size(self) -> float:
        """Room of one turn along z, m: the outer diameter."""
        return self.radial_size


@dataclass(frozen=True)
class LitzWire:
    """A round bundle of insulated strands.

    Parameters
    ----------
    strands : int
        Number of strands, at least 2.
    strand_diameter : float
        Of the bare metal of one strand, m.
    packing : float, optional
        Metal over the area of the bundle's circle, strand enamel and voids being the rest;
        `LITZ_PACKING` when neither this nor `outer_diameter` is given.
    insulation : float
        Thickness of the wrapping round the bundle, m; it counts twice in the outer diameter.
    outer_diameter : float, optional
        Over everything, m, where it is known; then `packing` is left out.

    Notes
    -----
    The twist is left out: it makes strands a few per cent longer than the bundle.
    """

    strands: int
    strand_diameter: float
    packing: float | None = None
    insulation: float = 0.0
    outer_diameter: float | None = None

    def __post_init__(self) -> None:
        _check_strands(self.strands)
        _check_size(self.strand_diameter, "conductor.litz.strand")
        _check_insulation(self.insulation)
        if self.packing is not None:
            _check_packing(self.packing)
        if self.outer_diameter is not None:
            _check_outer_diameter(self)

    @property
    def copper_area(self) -> float:
        """Area of the metal of all strands, m2."""
        return self.strands * math.pi / 4 * self.strand_diameter**2

    @property
    def radial_size(self) -> float:
        """Room of one turn along r, m: the outer diameter."""
        if self.outer_diameter is not None:
            return self.outer_diameter
        packing = LITZ_PACKING if self.packing is None else self.packing
        return self.strand_diameter * math.sqrt(self.strands / packing) + 2 * self.insulation

    @property
    def axial_size(self) -> float:
        """Room of one turn along z, m: the outer diameter."""
        return self.radial_size


@dataclass(frozen=True)
class Foil:
    """Foil, of which each turn is a layer.

    Parameters
    ----------
    thickness : float
        Of the metal, along r, m.
    width : float, optional
        Along z, m; the height of the room when left out.
    insulation : float
        Thickness of the insulating film wound along with each turn, m; it counts once.
    """

    thickness: float
    width: float | None = None
    insulation: float = 0.0

    def __post_init__(self) -> None:
        _check_size(self.thickness, "conductor.foil")
        if self.width is not None:
            _check_size(self.width, "conductor.width")
        _check_insulation(self.insulation)

    @property
    def copper_area(self) -> float:
        """Area of the metal in the section, m2; InputError while the width is left out."""
        return self.thickness * self.axial_size

    @property
    def radial_size(self) -> float:
        """Room of one turn along r, m: foil and film."""
        return self.thickness + self.insulation

    @property
    def axial_size(self) -> float:
        """Room of one turn along z, m: the width; InputError while it is left out."""
        if self.width is None:
            raise InputError(
                "the width follows from the room that the foil is laid in",
                key="conductor.width",
                accepted=_LENGTH,
            )
        return self.width


Conductor: TypeAlias = RoundWire | LitzWire | Foil


def current_outline(conductor: Conductor) -> NDArray[np.float64]:
    """Return the corners (n, 2) in m, about its centre, of what carries a turn's current.

    Parameters
    ----------
    conductor : RoundWire, LitzWire or Foil
        As laid: foil with its width.

    Notes
    -----
    A round wire becomes a regular polygon of `SIDES` sides with the area of its metal, litz one
    with the area of the bundle inside of the wrapping, foil the rectangle of its metal. Sides, not
    corners, face along r and z, so that a polygon stays inside the square round its circle and
    bare wires in square order do not overlap.
    """
    match conductor:
        case Foil():
            half = 0.5 * np.array([conductor.thickness, conductor.axial_size])
            corners = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]])
            return np.asarray(half * corners)
        case RoundWire():
            diameter = conductor.diameter
        case LitzWire():
            diameter = conductor.radial_size - 2 * conductor.insulation
    angle = 2 * np.pi / SIDES
    radius = 0.5 * diameter * math.sqrt(angle / math.sin(angle))
    corner = angle * (np.arange(SIDES) + 0.5)
    return np.asarray(radius * np.column_stack([np.cos(corner), np.sin(corner)]))


def as_laid(conductor: Conductor, height: float) -> Conductor:
    """Return the conductor as it lies in a room of `height` (m): foil gets its width.

    Raises
    ------
    InputError
        If it is no conductor.
    """
    if not isinstance(conductor, RoundWire | LitzWire | Foil):
        raise InputError(
            "not a conductor", key="conductor", value=conductor,
            accepted="a RoundWire, a LitzWire or a Foil",
        )  # fmt: skip
    if isinstance(conductor, Foil) and conductor.width is None:
        return replace(conductor, width=height)
    return conductor


@dataclass(frozen=True)
class Metal:
    """What a conductor is made of.

    Parameters
    ----------
    name : str
        For print.
    resistivity : float
        At 20 C, ohm m.
    temperature_coefficient : float
        Relative rise of the resistivity at 20 C, 1/K.
    """

    name: str
    resistivity: float
    temperature_coefficient: float

    def __post_init__(self) -> None:
        for name, accepted in (
            ("resistivity", "a number above 0 and below 1, ohm m"),
            ("temperature_coefficient", "a number from 0 to below 0.008, 1/K"),
        ):
            key, value = f"conductor.metal.{name}", getattr(self, name)
            size = number(value, key, accepted)
            fits = 0.0 < size < 1.0 if name == "resistivity" else 0.0 <= size < 0.008
            if not fits:
                raise InputError("out of range", key=key, value=value, accepted=accepted)


COPPER = Metal("copper", 1.7241e-8, 0.00393)
"""Annealed copper, IEC 60028; from memory."""

ALUMINIUM = Metal("aluminium", 2.8264e-8, 0.00403)
"""Hard-drawn aluminium, IEC 60889 (61 % of the conductivity of annealed copper); from memory."""


def resistivity(metal: Metal, temperature: float) -> float:
    """Return the resistivity in ohm m, linear in the temperature.

    Parameters
    ----------
    metal : Metal
        `COPPER`, `ALUMINIUM` or another.
    temperature : float
        In degrees Celsius, within `TEMPERATURES`.

    Raises
    ------
    InputError
        If the temperature is out of that range, or `metal` is none.
    """
    if not isinstance(metal, Metal):
        raise InputError(
            "not a metal",
            key="conductor.metal",
            value=metal,
            accepted="COPPER, ALUMINIUM or a Metal",
        )
    low, high = TEMPERATURES
    accepted = f"degrees Celsius from {low:g} to {high:g}"
    if not low <= number(temperature, "conductor.temperature", accepted) <= high:
        raise InputError(
            "temperature out of range", key="conductor.temperature", value=temperature,
            accepted=accepted,
        )  # fmt: skip
    return metal.resistivity * (1.0 + metal.temperature_coefficient * (temperature - 20.0))


def _check_size(value: object, key: str) -> None:
    if not SIZES[0] <= number(value, key, _LENGTH) <= SIZES[1]:
        raise InputError("size out of range", key=key, value=value, accepted=_LENGTH)


def _check_insulation(value: object) -> None:
    key = "conductor.insulation"
    if not 0.0 <= number(value, key, _INSULATION) <= SIZES[1]:
        raise InputError("size out of range", key=key, value=value, accepted=_INSULATION)


def _check_strands(value: object) -> None:
    key, accepted = "conductor.litz.strands", f"a whole number from 2 to {MOST_STRANDS}"
    strands = number(value, key, accepted)
    if not (2 <= strands <= MOST_STRANDS and strands == int(strands)):
        raise InputError("strands out of range", key=key, value=value, accepted=accepted)


def _check_packing(value: object) -> None:
    key, accepted = "conductor.litz.packing", f"a number from 0.01 to {DENSEST_PACKING:.3f}"
    if not 0.01 <= number(value, key, accepted) <= DENSEST_PACKING:
        raise InputError("packing out of range", key=key, value=value, accepted=accepted)


def _check_outer_diameter(litz: LitzWire) -> None:
    key = "conductor.litz.outer_diameter"
    _check_size(litz.outer_diameter, key)
    if litz.packing is not None:
        raise InputError(
            "packing and outer diameter are both given", key=key, value=litz.outer_diameter,
            accepted="one of them",
        )  # fmt: skip
    bundle = litz.strand_diameter * math.sqrt(litz.strands / DENSEST_PACKING)
    least = bundle + 2 * litz.insulation
    if litz.radial_size < least:
        raise InputError(
            "the strands and the insulation do not fit in it", key=key, value=litz.outer_diameter,
            accepted=f"at least {least * 1e3:.4g} mm",
        )  # fmt: skip
