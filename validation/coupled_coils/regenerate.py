r"""Leakage of two concentric windings in one dimension.

Between plates of ideal iron, H of opposed ampere turns is axial and does not change along z where
the windings fill the height h. With x the share of the ampere turns inside of r,

.. math:: L = \frac{2 \pi \mu_0 N^2}{h} \int x(r)^2 r \, dr

which is integrated here over both windings and the space between them. The textbook formula takes
mean turns instead, and for windings of height h in a taller window Rogowski's factor:

.. math:: L = \mu_0 N^2 \frac{K}{h} \left(\frac{l_1 a_1}{3} + l_d d + \frac{l_2 a_2}{3}\right),
    \quad K = 1 - \frac{1 - e^{-\pi h/w}}{\pi h/w}, \quad w = a_1 + d + a_2

Run ``python -m validation.coupled_coils.regenerate`` to write reference.csv.

References
----------
Transformer textbooks, after W. Rogowski, 1909 (from memory).
"""

from __future__ import annotations

import math

from validation.rows import write_table

MU_0 = 4e-7 * math.pi
MUTUAL = "3.816821883371e-09"
"""Of one turn pair, H, from the project's notes; validation/air_coils computes it anew."""
RADII = (40.5e-3, 42.0e-3, 43.0e-3, 45.0e-3)
"""Inner and outer radius of both windings, m."""


def exact_leakage(height: float) -> float:
    """Return the leakage of one turn in H of windings that fill the height (m)."""
    r1, r2, r3, r4 = RADII
    inner, outer = r2 - r1, r4 - r3
    rising = inner * (r1 / 3.0 + inner / 4.0)
    falling = outer * (r4 / 3.0 - outer / 4.0)
    return 2.0 * math.pi * MU_0 / height * (rising + (r3**2 - r2**2) / 2.0 + falling)


def textbook_leakage(height: float) -> float:
    """Return the leakage of one turn in H from mean turns and Rogowski's factor."""
    r1, r2, r3, r4 = RADII
    parts = ((r1 + r2) * (r2 - r1) / 3.0, (r2 + r3) * (r3 - r2), (r3 + r4) * (r4 - r3) / 3.0)
    slenderness = math.pi * height / (r4 - r1)
    factor = 1.0 - (1.0 - math.exp(-slenderness)) / slenderness
    return math.pi * MU_0 * factor / height * sum(parts)


def lines() -> list[dict[str, str]]:
    """Return the lines of reference.csv; heights in mm."""
    table = [{"case": "mutual", "height": "", "inductance": MUTUAL}]
    table.append(_line("filled", 20.0, exact_leakage(20e-3)))
    for height in (10.0, 40.0, 160.0):
        table.append(_line("tall", height, textbook_leakage(1e-3 * height)))
    return table


def _line(case: str, height: float, inductance: float) -> dict[str, str]:
    return {"case": case, "height": f"{height:g}", "inductance": f"{inductance:.11e}"}


if __name__ == "__main__":
    write_table("coupled_coils", lines())
