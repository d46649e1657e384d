r"""The one-dimensional pot: a root and three quadratures.

Post r < a, winding of uniform J in c < r < d, return e < r < f with A = 0 at f, all of height h
between ideal planes. Every field is axial, and by Ampere's law

.. math:: H(r) = H_p \text{ for } r < c, \quad H_p - NI/h \text{ for } r > d,

linear in r across the winding. The one unknown H_p makes the net flux inside f vanish. The
co-energy follows from the densities, the flux linkage from the flux inside each turn.

Run ``python -m validation.nonlinear_pot.regenerate`` to write reference.csv.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from validation.rows import write_table

Array = NDArray[np.float64]

MU_0 = 4e-7 * math.pi
POST, INNER, OUTER, RETURN, WALL = 5e-3, 6e-3, 9e-3, 10e-3, 11.5e-3
HEIGHT = 10e-3
SATURATION = 0.45 / MU_0
KNEE = SATURATION / 1999.0
CURRENTS = (10.0, 100.0, 1000.0)


def flux_density(h: float) -> float:
    """Return B in T of the material at H in A/m, odd in H."""
    return MU_0 * (h + SATURATION * h / (abs(h) + KNEE))


def coenergy_density(h: float) -> float:
    """Return the integral of B dH in J/m3."""
    size = abs(h)
    return MU_0 * (0.5 * h**2 + SATURATION * (size - KNEE * math.log1p(size / KNEE)))


def pot_values(current: float) -> dict[str, float]:
    """Return flux densities, flux linkage and co-energy of one turn at a current in A."""
    fall = current / HEIGHT
    post = brentq(lambda h: net_flux(h, h - fall), 0.0, fall, xtol=1e-13, rtol=1e-15)
    back = post - fall
    return {
        "B_post": flux_density(post),
        "B_return": flux_density(back),
        "flux_linkage": _flux_linkage(post, back),
        "coenergy": _coenergy(post, back),
    }


def net_flux(post: float, back: float) -> float:
    """Return the flux inside the wall in Wb for H in the post and in the return."""
    winding = _over_winding(lambda r: MU_0 * _field(r, post, back))
    return (
        _ring(0.0, POST) * flux_density(post)
        + _ring(POST, INNER) * MU_0 * post
        + winding
        + _ring(OUTER, RETURN) * MU_0 * back
        + _ring(RETURN, WALL) * flux_density(back)
    )


def _coenergy(post: float, back: float) -> float:
    winding = _over_winding(lambda r: 0.5 * MU_0 * _field(r, post, back) ** 2)
    return HEIGHT * (
        _ring(0.0, POST) * coenergy_density(post)
        + _ring(POST, INNER) * 0.5 * MU_0 * post**2
        + winding
        + _ring(OUTER, RETURN) * 0.5 * MU_0 * back**2
        + _ring(RETURN, WALL) * coenergy_density(back)
    )


def _flux_linkage(post: float, back: float) -> float:
    """Return the mean flux inside the turns: the flux at r counts for the turns outside of r."""
    outside = (OUTER - INNER) ** -1
    inner = _ring(0.0, POST) * flux_density(post) + _ring(POST, INNER) * MU_0 * post
    return inner + _over_winding(lambda r: MU_0 * _field(r, post, back) * (OUTER - r) * outside)


def _field(r: Array, post: float, back: float) -> Array:
    return post + (back - post) * (r - INNER) / (OUTER - INNER)


def _ring(inner: float, outer: float) -> float:
    return math.pi * (outer**2 - inner**2)


def _over_winding(density: Callable[[Array], Array]) -> float:
    """Return the integral of 2 pi r density dr; Gauss' rule is exact for its polynomials."""
    points, weights = np.polynomial.legendre.leggauss(4)
    r = INNER + (OUTER - INNER) * (points + 1.0) / 2.0
    return float(np.sum(weights * 2.0 * math.pi * r * density(r)) * (OUTER - INNER) / 2.0)


def lines() -> list[dict[str, str]]:
    """Return the lines of reference.csv."""
    table = []
    for current in CURRENTS:
        values = pot_values(current)
        texts = {name: f"{value:.12e}" for name, value in values.items()}
        table.append({"current": f"{current:g}", **texts, "mark": "computed"})
    return table


if __name__ == "__main__":
    write_table("nonlinear_pot", lines())
