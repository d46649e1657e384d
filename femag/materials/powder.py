"""Points of powder cores from the share of the permeability that a bias leaves."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import beta, betainc

from femag.errors import InputError, number
from femag.units import MU_0

Array = NDArray[np.float64]

POINTS = 60
REACH = (1e-2, 50.0)
"""First and last field strength over that of half the permeability."""


def powder_points(permeability: float, half_field: float, exponent: float) -> tuple[Array, Array]:
    r"""Return H in A/m and B in T of a powder whose permeability falls under a bias as

    .. math:: \frac{dB}{dH} = \mu_0 \left(1 + \frac{\mu_i - 1}{1 + (H/H_h)^c}\right).

    Share of the initial permeability 1/(a + b H^c) with a = 1 and b = H_h^-c, which data sheets of
    powder cores fit; here for what is above mu0, so that the slope tends to mu0.

    Parameters
    ----------
    permeability : float
        Initial relative permeability mu_i, above 1.
    half_field : float
        H_h, where half of mu_i - 1 is left, A/m.
    exponent : float
        c, above 1: otherwise the polarisation has no limit.

    Raises
    ------
    InputError
        If a number is out of range.

    References
    ----------
    The form 1/(a + b H^c) is a trade habit (from memory). Its integral is our own reduction to the
    incomplete beta function: int_0^t dx/(1 + x^c) = B_s(1/c, 1 - 1/c)/c, s = t^c/(1 + t^c).
    """
    for key, value, least in (
        ("permeability", permeability, 1.0),
        ("half_field", half_field, 0.0),
        ("exponent", exponent, 1.0),
    ):
        accepted = f"a number above {least:g}"
        if not least < number(value, key, accepted) < np.inf:
            raise InputError("out of range", key=key, value=value, accepted=accepted)
    t = np.geomspace(*REACH, POINTS)
    p = 1.0 / exponent
    share = 1.0 / (1.0 + t**-exponent)
    integral = p * beta(p, 1.0 - p) * betainc(p, 1.0 - p, share)
    h = half_field * t
    return h, MU_0 * (h + (permeability - 1.0) * half_field * integral)
