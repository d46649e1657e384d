r"""Closed forms of axial fields that are the same at every height.

Cylinder of radius R and height h between ideal planes, one turn of uniform J in all of it.

* Ideal iron at r = R: :math:`H_z = J (R - r)`, :math:`L = \mu_0 \mu_r \pi R^2/(6 h)`.
* No flux through r = R: :math:`H_z = J (2R/3 - r)`, :math:`L = \mu_0 \mu_r \pi R^2/(18 h)`.
* Two layers in series with the turns shared like l/mu: B is the same in both, so that
  mu_r/h becomes :math:`1/(l_1/\mu_1 + l_2/\mu_2)` in the first form.

Run ``python -m validation.uniform_field.regenerate`` to write reference.csv.
"""

from __future__ import annotations

import math

from validation.rows import write_table

MU_0 = 4e-7 * math.pi
RADIUS, HEIGHT = 8e-3, 12e-3
CASES = (
    ("normal", "1", "1"),
    ("normal", "2000", "2000"),
    ("tangential", "1", "1"),
    ("tangential", "2000", "2000"),
    ("normal", "2000", "1"),
)
"""Outer wall, and relative permeability of the lower two thirds and of the upper third."""


def inductance(wall: str, lower: float, upper: float) -> float:
    """Return the inductance of one turn in H."""
    reluctance = (2.0 / lower + 1.0 / upper) * HEIGHT / 3.0
    return MU_0 * math.pi * RADIUS**2 / ((6.0 if wall == "normal" else 18.0) * reluctance)


def lines() -> list[dict[str, str]]:
    """Return the lines of reference.csv."""
    return [
        {
            "outer_wall": wall,
            "lower_permeability": lower,
            "upper_permeability": upper,
            "inductance": f"{inductance(wall, float(lower), float(upper)):.14e}",
            "mark": "closed form",
        }
        for wall, lower, upper in CASES
    ]


if __name__ == "__main__":
    write_table("uniform_field", lines())
