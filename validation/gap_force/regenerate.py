r"""Pull of round posts from mode matching and of two coils from the Bessel integral.

The co-energy of two posts with NI is (NI)^2 mu0 pi a^2 F_w/(2 g) and a part that does not hang on
the gap. Its derivative by g is the pull,

.. math:: f_F = F_w - g \, dF_w/dg

over (mu0/2) pi a^2 (NI/g)^2, and -f_F is the slope of the inductance over mu0 pi a^2/g^2. Here
from a fourth-order difference of `round_post_fringing.regenerate.fringing_factors`. Of two coils
dM/dz is the Bessel integral of `air_coils.regenerate` with a factor -k.

Run ``python -m validation.gap_force.regenerate`` to print the values beside the stored ones.
"""

from __future__ import annotations

import math

import numpy as np

from validation.air_coils.regenerate import (
    MU_0,
    PAIR,
    axial_mean,
    radial_mean,
    wave_numbers,
)
from validation.round_post_fringing.regenerate import fringing_factors
from validation.rows import table_of

STEP = 0.02
"""Change of g/a for the difference, over it."""


def post_pull(wall: float, gap: float, height: float = 1.0) -> float:
    """Return f_F for b/a, g/a and h/a."""
    step = STEP * gap
    ahead = [fringing_factors(wall, gap + n * step, height)[0] for n in (-2, -1, 1, 2)]
    slope = float(np.dot([1.0, -8.0, 8.0, -1.0], ahead)) / (12.0 * step)
    return fringing_factors(wall, gap, height)[0] - gap * slope


def coil_pull() -> float:
    """Return dM/dz of the two coils in H/m, below 0: they attract each other."""
    one, other = PAIR
    k, weight = wave_numbers(max(one.outer, other.outer))
    kernel = radial_mean(k, one) * radial_mean(k, other) * axial_mean(k, one, other)
    return -float(MU_0 * math.pi * np.sum(weight * k * kernel))


def main() -> None:
    """Print the recomputed values beside the stored ones."""
    for line in table_of("gap_force"):
        if line["quantity"] == "coils":
            print(f"two coils, dM/dz  {coil_pull():.12e}  {line['value']}")
            continue
        wall, gap = 1.0 / float(line["a_over_b"]), float(line["g_over_a"])
        sign = -1.0 if line["quantity"] == "slope" else 1.0
        value = sign * post_pull(wall, gap)
        print(f"{line['quantity']:<6} {1 / wall:4g} {gap:4g}  {value:.8f}  {line['value']}")


if __name__ == "__main__":
    main()
