r"""Fringing factors of two round posts between ideal plates, by corner-adapted mode matching.

Lengths in post radii. Upper half: posts r < 1 with s < z < h, g = 2 s, return wall r = b, all
iron ideal, a thin sheet of NI at r = 1 that is uniform in z. The scalar potential over NI/2 is

.. math:: \Omega = z/s + \sum_n g_n \sin(n\pi z/s)\, I_0(n\pi r/s)/I_0(n\pi/s), \quad r < 1

.. math:: \Omega = \sum_m (t_m + w_m) \sin(m\pi z/h)\, R_m(r)/R_m(1), \quad 1 < r < b

where t is the triangle that the sheet leaves of z/s (of 1 beside the post), R_m vanishes at b,
and g_n, w_m are the sine coefficients of one unknown function on the opening z < s. Near the
edge the potential is a series in powers 2/3, 4/3, ... of the distance, so the function is
expanded in :math:`(1 - t^2)^{\nu - 1/2} C^{(\nu)}_{2j+1}(t)`, t = z/s, for both
:math:`\nu = 7/6` and :math:`11/6`; their sine transforms are Bessel functions,
:math:`(-1)^j J_{2j+1+\nu}(x)/x^\nu`. The co-energy is quadratic in the coefficients and its
minimum converges from above. Nothing here is shared with the field solver.

Run ``python -m validation.round_post_fringing.regenerate`` to print the table.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray
from scipy.special import gamma, i0e, i1e, jv, k0e, k1e

from validation.rows import table_of

Array = NDArray[np.float64]

ORDERS = (7.0 / 6.0, 11.0 / 6.0)
"""Gegenbauer orders: exponents 2/3 and 4/3 of the potential at the edge, plus 1/2."""


def fringing_factors(
    wall: float, gap: float, height: float, functions: int = 5, modes: int = 500
) -> tuple[float, float]:
    """Return F_w (inductance) and F_root (post flux at the plate), each over the plain gap's.

    Parameters
    ----------
    wall, gap, height : float
        b/a, g/a and h/a.
    functions : int
        Functions of either order on the opening.
    modes : int
        Modes of the gap in the shortest partial sum; the window gets as many a length.
    """
    s = gap / 2.0
    period = 2 * Fraction(height / s).limit_denominator(10_000).numerator
    window_modes = period * max(1, round(modes * height / s / period))

    def window(m: Array) -> Array:
        return _window_products(m, wall, s, height, functions)

    own = _summed(lambda n: _gap_products(n, s, functions), modes, 4.0 / 3.0)
    total = _summed(window, window_modes, _window_exponents(functions))
    matrix, load = own + total[:-2, :-2], total[:-2, -2]
    opening = _minimiser(matrix, load)
    inductance = 1.0 + gap * (total[-2, -2] + load @ opening)
    root_flux = 1.0 + gap * (total[-2, -1] + total[:-2, -1] @ opening)
    return float(inductance), float(root_flux)


def _gap_products(n: Array, s: float, functions: int) -> Array:
    """Return the sum over gap modes n of the products of every two opening functions."""
    k = n * np.pi / s
    opening = 2.0 * _transforms(k * s, functions)
    weight = 0.5 * s * k * i1e(k) / i0e(k)
    return np.asarray(np.einsum("im,jm,m->ij", opening, opening, weight))


def _window_products(m: Array, wall: float, s: float, height: float, functions: int) -> Array:
    """Return the same for window modes m; the last two functions are the triangle and the post.

    The latter is 1 on the post and z/s below it, so that its product with a potential is the
    flux that leaves the post.
    """
    k = m * np.pi / height
    triangle = 2.0 / (height * s) * np.sin(k * s) / k**2
    post = triangle - 2.0 / height * np.cos(m * np.pi) / k
    opening = 2.0 * s / height * _transforms(k * s, functions)
    all_functions = np.vstack([opening, triangle, post])
    weight = 0.5 * height * k * _slope_at_post(k, wall)
    products: Array = np.einsum("im,jm,m->ij", all_functions, all_functions, weight)
    products[-1, -1] = 0.0  # diverges: the weight function jumps where the post meets the plate
    return products


def _window_exponents(functions: int) -> Array:
    """Return the powers of 1/M with which the remainders of the window's sums begin."""
    exponents = np.full((2 * functions + 2, 2 * functions + 2), 4.0 / 3.0)
    exponents[-2:] = exponents[:, -2:] = 5.0 / 3.0
    exponents[-2:, -2:] = 2.0
    return exponents


def _transforms(x: Array, functions: int) -> Array:
    """Return the sine transforms of the opening functions, (2 functions, len(x))."""
    return np.array([
        (-1.0) ** j * gamma(order + 1.0) * jv(2 * j + 1 + order, x) / (0.5 * x) ** order
        for order in ORDERS
        for j in range(functions)
    ])  # fmt: skip


def _slope_at_post(k: Array, wall: float) -> Array:
    """Return -R'(1)/(k R(1)) of the radial function that vanishes at the wall."""
    fade = np.exp(-2.0 * k * (wall - 1.0))
    slope = i1e(k) * k0e(k * wall) * fade + k1e(k) * i0e(k * wall)
    return np.asarray(slope / (k0e(k) * i0e(k * wall) - i0e(k) * k0e(k * wall) * fade))


def _summed(terms: Callable[[Array], Array], modes: int, exponent: float | Array) -> Array:
    """Return an infinite sum from three partial sums, two powers of the remainder removed."""
    first = terms(np.arange(1.0, modes + 1))
    second = first + terms(np.arange(modes + 1.0, 2 * modes + 1))
    third = second + terms(np.arange(2 * modes + 1.0, 4 * modes + 1))
    ratio = 2.0**exponent
    once = (ratio * second - first) / (ratio - 1.0), (ratio * third - second) / (ratio - 1.0)
    return np.asarray((2.0 * ratio * once[1] - once[0]) / (2.0 * ratio - 1.0))


def _minimiser(matrix: Array, load: Array) -> Array:
    """Return the solution of a scaled system; the two families overlap, hence least squares."""
    scale = 1.0 / np.sqrt(np.diag(matrix))
    scaled = matrix * scale * scale[:, None]
    return np.asarray(-scale * np.linalg.lstsq(scaled, load * scale, rcond=1e-14)[0])


def main() -> None:
    """Print the recomputed factors beside the stored ones."""
    print(" a/b   g/a  h/a  F_w           stored       F_root       stored")
    for line in table_of("round_post_fringing"):
        if line["winding"] != "window":
            continue
        a_b, g_a, h_a = (float(line[key]) for key in ("a_over_b", "g_over_a", "h_over_a"))
        factor, root = fringing_factors(1.0 / a_b, g_a, h_a)
        print(
            f"{a_b:4g}  {g_a:4g}  {h_a:3g}  {factor:.9f}   {line['factor']:<11}  "
            f"{root:.8f}   {line['root_factor']}"
        )


if __name__ == "__main__":
    main()
