"""A material: curves at one or several temperatures."""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.materials.steinmetz import mean_steinmetz
from femag.materials.tabulated import TabulatedCurve

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Material:
    """A named material with its curves.

    Parameters
    ----------
    name, source : str
        For print.
    curves : tuple of (float or None, TabulatedCurve)
        Degrees Celsius, in rising order, and the curve; None if one curve has none stated.
    """

    name: str
    source: str
    curves: tuple[tuple[float | None, TabulatedCurve], ...]

    @property
    def temperatures(self) -> tuple[float, ...]:
        """Degrees Celsius of the curves, rising; empty if none is stated."""
        return tuple(t for t, _ in self.curves if t is not None)

    def at(self, temperature: float | None = None) -> TabulatedCurve:
        """Return the curve at a temperature, between two curves at equal H.

        At equal H, since a mean of the two B is finite and rises at least as mu0 H whatever the
        field; at equal B there is none above the saturation of the hotter curve.

        Parameters
        ----------
        temperature : float, optional
            Degrees Celsius; may be left out when there is only one curve.

        Raises
        ------
        InputError
            If it lies outside the range of the curves, or is needed and missing.
        """
        if temperature is None and len(self.curves) == 1:
            return self.curves[0][1]
        low, high = (min(self.temperatures, default=None), max(self.temperatures, default=None))
        accepted = (
            "no temperature, since the data have none"
            if low is None
            else f"{low:g} C to {high:g} C"
            if low != high
            else f"{low:g} C, or none"
        )
        if temperature is None:
            raise InputError(
                f"{self.name} has curves at several temperatures", key="temperature",
                accepted=accepted,
            )  # fmt: skip
        if low is None or high is None or not low <= temperature <= high:
            raise InputError(
                f"out of the range of {self.name}", key="temperature",
                value=f"{temperature:g} C", accepted=accepted,
            )  # fmt: skip
        above = bisect_right(self.temperatures, temperature)
        cooler, curve = self.curves[above - 1]
        if cooler == temperature:
            return curve
        hotter, other = self.curves[above]
        assert cooler is not None
        assert hotter is not None
        share = (temperature - cooler) / (hotter - cooler)
        between = mean_curve(curve, other, share)
        said = f"B interpolated between {cooler:g} C and {hotter:g} C at equal H"
        return replace(
            between,
            name=f"{self.name} at {temperature:g} C",
            source=self.source,
            notes=(*dict.fromkeys((*curve.notes, *other.notes)), said),
            loss=mean_steinmetz(curve.loss, other.loss, share)
            if curve.loss and other.loss
            else None,
        )


def mean_curve(first: TabulatedCurve, second: TabulatedCurve, share: float) -> TabulatedCurve:
    """Return the curve whose B is (1 - share) of the first's and share of the second's.

    It goes through that mean at every H of either table.

    Parameters
    ----------
    first, second : TabulatedCurve
        Curves.
    share : float
        From 0 to 1.
    """
    h = np.unique([h for curve in (first, second) for h, _ in curve.points])
    b = (1.0 - share) * first.flux_density(h) + share * second.flux_density(h)
    return TabulatedCurve(tuple(zip(h.tolist(), b.tolist(), strict=True)))
