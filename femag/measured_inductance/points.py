"""Measured points of inductance against current, and how far a solved curve is from them."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from femag.current_curve import MOST_POINTS, InductanceCurve, inductance_curve
from femag.design import CURRENTS, Design
from femag.errors import InputError, number

Array = NDArray[np.float64]
Kind = Literal["apparent", "incremental"]

KINDS: tuple[Kind, ...] = ("apparent", "incremental")
FEWEST_POINTS = 2


@dataclass(frozen=True)
class MeasuredPoints:
    """Inductance as measured at several currents.

    Parameters
    ----------
    current : tuple of float
        Peak or bias current, A; all above 0 or all below, each once, in any order. Any sequence
        is taken.
    inductance : tuple of float
        Inductance at each current, H; above 0.
    kind : {"apparent", "incremental"}
        Flux linkage over current, or slope of the flux linkage at the current (a small ripple
        on a bias).
    source : str
        Path of the file, for print.
    notes : tuple of str
        What was assumed about the data on the way, for print.

    Raises
    ------
    InputError
        If the points are too few, or a current or an inductance cannot be used.
    """

    current: tuple[float, ...]
    inductance: tuple[float, ...]
    kind: Kind = "apparent"
    source: str = ""
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if self.kind not in KINDS:
            raise InputError(
                "unknown kind of inductance", key="kind", value=self.kind,
                accepted=" or ".join(map(repr, KINDS)),
            )  # fmt: skip
        for name in ("current", "inductance"):
            values = (number(value, name, "numbers") for value in getattr(self, name))
            object.__setattr__(self, name, tuple(values))
        if len(self.current) != len(self.inductance):
            raise InputError(
                f"{len(self.current)} currents and {len(self.inductance)} inductances",
                key="inductance", accepted="one inductance for each current",
            )  # fmt: skip
        if not FEWEST_POINTS <= len(self.current) <= MOST_POINTS:
            raise InputError(
                f"{len(self.current)} measured points", key="current",
                accepted=f"{FEWEST_POINTS} points or more, up to {MOST_POINTS}",
            )  # fmt: skip
        _check_currents(self.current)
        _check_inductances(self.inductance)


def measured_curve(
    design: Design,
    points: MeasuredPoints,
    tolerance: float | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> InductanceCurve:
    """Return the solved curve of a design at the measured currents, without saturation currents.

    Parameters
    ----------
    design : Design
        What to solve.
    points : MeasuredPoints
        Their currents are taken, in their order.
    tolerance, progress
        As of `femag.current_curve.inductance_curve`.

    Raises
    ------
    InputError, ToleranceError, NumericalError
        As of `femag.current_curve.inductance_curve`.
    """
    return inductance_curve(design, points.current, tolerance, drops=(), progress=progress)


def residuals(points: MeasuredPoints, curve: InductanceCurve) -> Array:
    """Return the solved inductance over the measured one less 1, at each measured point.

    Parameters
    ----------
    points : MeasuredPoints
        As measured; their kind says which inductance of the curve is meant.
    curve : InductanceCurve
        Solved at the measured currents; others may be among its points.

    Returns
    -------
    array, shape (points,)

    Raises
    ------
    InputError
        If the curve was not solved at a measured current.
    """
    return np.asarray(solved_inductance(points, curve) / np.array(points.inductance) - 1.0)


def solved_inductance(points: MeasuredPoints, curve: InductanceCurve) -> Array:
    """Return the inductance in H of the curve at the measured currents, of the measured kind.

    Raises
    ------
    InputError
        If the curve was not solved at a measured current.
    """
    solved = {point.current: getattr(point, f"{points.kind}_inductance") for point in curve.points}
    for current in points.current:
        if current not in solved:
            raise InputError(
                "the curve was not solved at this measured current", key="current", value=current,
                accepted="a curve that holds every measured current",
            )  # fmt: skip
    return np.array([solved[current] for current in points.current])


def _check_currents(currents: Sequence[float]) -> None:
    seen: set[float] = set()
    for current in currents:
        if not CURRENTS[0] <= abs(current) <= CURRENTS[1]:
            raise InputError(
                "a measured current is zero or out of range", key="current", value=current,
                accepted=f"{CURRENTS[0]:g} A to {CURRENTS[1]:g} A, of either sign",
            )  # fmt: skip
        if current in seen:
            raise InputError(
                "a measured current stands twice", key="current", value=current,
                accepted="each current once; average what was measured at it",
            )  # fmt: skip
        if current * currents[0] < 0.0:
            raise InputError(
                "measured currents of both signs", key="current", value=current,
                accepted="all above 0 or all below",
            )  # fmt: skip
        seen.add(current)


def _check_inductances(inductances: Sequence[float]) -> None:
    for inductance in inductances:
        if not 0.0 < inductance < np.inf:
            raise InputError(
                "a measured inductance is not above zero", key="inductance", value=inductance,
                accepted="inductances above 0 H",
            )  # fmt: skip
