r"""The sphere in a shell of current: one root, the rest closed forms.

Material in r < a, current density J0 sin(theta) in a < r < c, open space. With
:math:`A_\varphi = f(r) \sin\theta` the vector potential is

.. math:: f = Br/2 \;(r<a), \quad \alpha r + \beta/r^2 - \mu_0 J_0 r^2/4 \;(a<r<c),
          \quad \gamma/r^2 \;(r>c)

and continuity of A and of the tangential H gives alpha = mu0 J0 c/3 and

.. math:: H(B) + B/(2\mu_0) = J_0 (c - a).

The flux linkage is the integral of J A over NI, NI = J0 (c^2 - a^2). Outside the sphere
everything is linear, so that W' = lambda NI/2 + V (w'(H) - H B/2), V the sphere's volume.

Run ``python -m validation.sphere.regenerate`` to write reference.csv.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.optimize import brentq

from validation.rows import write_table

MU_0 = 4e-7 * math.pi
SPHERE, SHELL = 10e-3, 15e-3
SATURATION = 0.45 / MU_0
KNEE = SATURATION / 1999.0
CASES = (("linear 1", 1e7), ("linear 2000", 1e7), ("saturating", 1e7), ("saturating", 5e7))


@dataclass(frozen=True)
class SphereValues:
    """Ampere turns (A), B inside (T), flux linkage (Wb) and co-energy (J) of one turn."""

    ampere_turns: float
    flux_density: float
    flux_linkage: float
    coenergy: float


def sphere_values(material: str, current_density: float) -> SphereValues:
    """Return the exact values for a material of `CASES` and J0 in A/m2."""
    a, c = SPHERE, SHELL
    drive = current_density * (c - a)
    h = brentq(lambda h: h + _flux_density(material, h) / (2.0 * MU_0) - drive, 0.0, drive,
               xtol=1e-12, rtol=1e-15)  # fmt: skip
    b = _flux_density(material, h)
    source = MU_0 * current_density
    alpha = source * c / 3.0
    beta = a**2 * (b * a / 2.0 - alpha * a + source * a**2 / 4.0)
    moment = (
        alpha * (c**4 - a**4) / 4.0 + beta * (c - a) - source * (c**5 - a**5) / 20.0
    )  # integral of f r^2 over the shell
    ampere_turns = current_density * (c**2 - a**2)
    linkage = 8.0 * math.pi / 3.0 * current_density * moment / ampere_turns
    volume = 4.0 / 3.0 * math.pi * a**3
    excess = _coenergy_density(material, h) - 0.5 * h * b
    coenergy = 0.5 * linkage * ampere_turns + volume * excess
    return SphereValues(ampere_turns, b, linkage, coenergy)


def _flux_density(material: str, h: float) -> float:
    if material == "saturating":
        return MU_0 * (h + SATURATION * h / (h + KNEE))
    return MU_0 * float(material.split()[1]) * h


def _coenergy_density(material: str, h: float) -> float:
    if material == "saturating":
        return MU_0 * (0.5 * h**2 + SATURATION * (h - KNEE * math.log1p(h / KNEE)))
    return 0.5 * MU_0 * float(material.split()[1]) * h**2


def lines() -> list[dict[str, str]]:
    """Return the lines of reference.csv."""
    table = []
    for material, current_density in CASES:
        values = sphere_values(material, current_density)
        table.append({
            "material": material,
            "ampere_turns": f"{values.ampere_turns:g}",
            "flux_density": f"{values.flux_density:.11e}",
            "flux_linkage": f"{values.flux_linkage:.11e}",
            "coenergy": f"{values.coenergy:.11e}",
            "mark": "closed form",
        })  # fmt: skip
    return table


if __name__ == "__main__":
    write_table("sphere", lines())
