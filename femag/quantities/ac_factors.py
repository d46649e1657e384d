"""How eddy currents in a conductor grow, and when they shield the metal from themselves.

Each factor depends on one number, the size of the conductor over the skin depth. All are ratios of
Bessel functions whose difference from the low-frequency value is taken in closed form
(J0 + J2 = 2 J1/x), so that neither small nor large arguments lose digits.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ive, jve

from femag.units import MU_0

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

NEGLIGIBLE = 1e-6
"""Size over skin depth below which every factor is 1 to rounding."""


def skin_depth(frequency: ArrayLike, resistivity: float) -> Array:
    """Return the skin depth sqrt(rho / (pi f mu0)) in m.

    Parameters
    ----------
    frequency : array
        Above 0, Hz.
    resistivity : float
        Of the metal, ohm m.
    """
    return np.asarray(np.sqrt(resistivity / (np.pi * MU_0 * np.asarray(frequency, dtype=float))))


def round_crossing_factor(ratio: ArrayLike) -> Array:
    """Return the loss of a round wire in a transverse field over its low-frequency value, 1.

    Parameters
    ----------
    ratio : array
        Diameter over skin depth.

    Notes
    -----
    -8/|x|^2 Im[J2(x)/J0(x)] with x = (d/2) sqrt(-j omega mu0 sigma). The low-frequency value is
    pi omega^2 B^2 d^4 sigma / 128 per length, B the peak of the field far from the wire, at right
    angles to it. Derived from A = C J1(k r) sin(phi) inside and B r + D/r outside, with the inward
    Poynting vector; for one wire by itself: neighbours closer than about a diameter shield each
    other further once d exceeds the skin depth, which this leaves out.
    """
    ratio = np.asarray(ratio, dtype=float)
    x = _round_argument(ratio)
    shielded = -8.0 / np.abs(x) ** 2 * (jve(2, x) / jve(0, x)).imag
    return np.asarray(np.where(ratio < NEGLIGIBLE, 1.0, shielded))


def round_skin_factor(ratio: ArrayLike) -> Array:
    """Return the resistance of a round wire to its own current over that to direct current, 1.

    Parameters
    ----------
    ratio : array
        Diameter over skin depth.

    Notes
    -----
    Re[x J0(x) / (2 J1(x))], x as for `round_crossing_factor`; textbooks, from memory.
    """
    ratio = np.asarray(ratio, dtype=float)
    x = _round_argument(ratio)
    return np.asarray(np.where(ratio < NEGLIGIBLE, 1.0, (x * jve(0, x) / (2.0 * jve(1, x))).real))


def foil_crossing_factor(ratio: ArrayLike) -> Array:
    """Return the loss of a foil between equal fields over its low-frequency value, 1.

    Parameters
    ----------
    ratio : array
        Thickness over skin depth.

    Notes
    -----
    6/xi^3 (sinh xi - sin xi)/(cosh xi + cos xi), as 6/xi^2 Im[I_{3/2}(y)/I_{-1/2}(y)] with
    y = (1 + j) xi/2. The low-frequency value is omega^2 B^2 t^3 sigma / 24 per area, B the peak of
    the field along both faces. Only that component: a field through the foil drives currents across
    its whole width. P. L. Dowell, Proc. IEE 113 (1966) 1387 (from memory), derived again.
    """
    ratio = np.asarray(ratio, dtype=float)
    y = _foil_argument(ratio)
    shielded = 6.0 / np.maximum(ratio, NEGLIGIBLE) ** 2 * (ive(1.5, y) / ive(-0.5, y)).imag
    return np.asarray(np.where(ratio < NEGLIGIBLE, 1.0, shielded))


def foil_skin_factor(ratio: ArrayLike) -> Array:
    """Return the resistance of a wide foil to its own current over that to direct current, 1.

    Parameters
    ----------
    ratio : array
        Thickness over skin depth.

    Notes
    -----
    xi/2 (sinh xi + sin xi)/(cosh xi - cos xi) = Re[y coth y]; fields equal and opposite on both
    faces. P. L. Dowell, as above.
    """
    ratio = np.asarray(ratio, dtype=float)
    y = _foil_argument(ratio)
    return np.asarray(np.where(ratio < NEGLIGIBLE, 1.0, (y * ive(-0.5, y) / ive(0.5, y)).real))


def _round_argument(ratio: Array) -> Complex:
    """Return radius times sqrt(-j omega mu0 sigma)."""
    return np.asarray(np.maximum(ratio, NEGLIGIBLE) * np.exp(-0.25j * np.pi) / np.sqrt(2.0))


def _foil_argument(ratio: Array) -> Complex:
    return np.asarray(np.maximum(ratio, NEGLIGIBLE) * (0.5 + 0.5j))
