"""Newton's method for either side: damped by a line search, started from secant coefficients.

On the potential side saturation flattens B(H), and Newton's steps overshoot: there the conjugate
field B is carried along as an unknown of its own, and the relation |H| B = b(|H|) H linearised in
both. Iterations then hardly depend on the knee; each matrix stays positive definite, and the
steps lead downhill.

References
----------
T. F. Chan, G. H. Golub and P. Mulet, "A nonlinear primal-dual method for total variation-based
image restoration", SIAM J. Sci. Comput. 20 (1999) 1964, for the same difficulty elsewhere.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, partial

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import splu

from femag.errors import NewtonError, NumericalError
from femag.field.numbering import FILL_REDUCING
from femag.field.side import Side, linearised
from femag.line_search import step_length

Array = NDArray[np.float64]

MAXIMUM_ITERATIONS = 100
EXACT = 1e-11
"""Accuracy that leaves rounding only: the last step squares the decrement once more."""

BACKWARD_ERROR = 1e-12
"""Largest normwise backward error of a linear system that counts as solved."""

CLOSE = 1e-6
"""Squared decrement below which the whole step is taken without a look at the slope after it."""


@dataclass(frozen=True)
class Minimum:
    """The minimiser of one side at one current.

    Parameters
    ----------
    side : Side
        What was minimised.
    current : float
        A.
    x : array
        Unknowns.
    field : array, (elements, 2, points)
        B - Br or H + Br/mu, which is B or H outside of magnets.
    secant, tangent : array, (elements, points)
        Coefficients at the field.
    history : tuple of float
        Squared Newton decrement over the stored energy, one entry an iteration; empty when the
        problem is linear.
    """

    side: Side
    current: float
    x: Array
    field: Array
    secant: Array
    tangent: Array
    history: tuple[float, ...]

    @cached_property
    def functional(self) -> float:
        """Value of the functional, J."""
        return self.side.functional(self.x, self.current)


def minimum(
    side: Side,
    current: float,
    start: Array | None = None,
    accuracy: float = EXACT,
    guess: Array | None = None,
    most: int | None = None,
) -> Minimum:
    """Return the minimiser of a side's functional.

    Parameters
    ----------
    side : Side
        Flux or potential side.
    current : float
        A.
    start : array, (elements, 2, points), optional
        Field of a nearby solution; the first step is Newton's from there. Without it the first
        step solves with the coefficients at zero field.
    guess : array, (size,), optional
        Unknowns to start from, instead of a field.
    accuracy : float
        Largest squared Newton decrement over the stored energy before the last full step.
    most : int, optional
        Largest number of iterations.

    Raises
    ------
    NewtonError
        If it does not converge; the error holds the history.
    NumericalError
        If a linear system cannot be solved.
    """
    if guess is not None:
        x, flow = guess, None
    else:
        x = _first_iterate(side, current, np.zeros_like(side.source) if start is None else start)
        flow = np.zeros_like(side.source) if start is None else None
    history: list[float] = []
    length = 0.0
    while True:
        field = side.field(x, current)
        secant, tangent = side.coefficients(field)
        done = length == 1.0 and history[-1] < accuracy
        if done or (guess is None and np.array_equal(secant, tangent)):
            return Minimum(side, current, x, field, secant, tangent, tuple(history))
        if len(history) == (most or MAXIMUM_ITERATIONS):
            raise NewtonError(f"Newton's method did not converge on the {side.name}", history)
        gradient = side.gradient(field, secant, current)
        toward = _toward(field, secant, flow) if side.flattens else None
        matrix = side.hessian(field, secant, tangent, toward)
        step = solved(matrix, -gradient, side.numbering.ordering)
        decrement = float(-gradient @ step)
        scale = float(np.sum(side.weight * secant * np.sum(field**2, axis=1)))
        history.append(abs(decrement) / scale)
        slope = partial(_slope, side, x, step, current)
        length = 1.0 if history[-1] < CLOSE else step_length(slope, decrement)
        change = side.change(step)
        flow = secant[:, None] * field + linearised(field, secant, tangent, change, toward)
        x = x + length * step


def _toward(field: Array, secant: Array, flow: Array | None) -> Array | None:
    """Return the conjugate field over its magnitude on the curve, at most of length 1."""
    if flow is None:
        return None
    on_curve = secant * np.hypot(field[:, 0], field[:, 1])
    magnitude = np.maximum(np.hypot(flow[:, 0], flow[:, 1]), on_curve)
    return np.asarray(flow / np.maximum(magnitude, 1e-300)[:, None])


def solved(matrix: csc_matrix, load: Array, ordering: str = FILL_REDUCING) -> Array:
    """Return the solution of a symmetric positive definite system.

    SuperLU with an ordering and without pivoting that suit such systems; its blocking pays for
    denser ones only (panels of one column are a third quicker from 2 000 to 30 000 unknowns).

    Raises
    ------
    NumericalError
        If the matrix is singular, or the backward error is not small.
    """
    try:
        factor = splu(
            matrix,
            permc_spec=ordering,
            diag_pivot_thresh=0.0,
            relax=1,
            panel_size=1,
            options={"SymmetricMode": True},
        )
    except RuntimeError as error:
        raise NumericalError(f"a linear system cannot be solved ({error})") from error
    solution = np.asarray(factor.solve(load))
    off = backward_error(matrix, solution, load)
    if not off <= BACKWARD_ERROR:
        raise NumericalError(f"a linear system is solved to a backward error of {off:.1e} only")
    return solution


def backward_error(matrix: csc_matrix, solution: Array, load: Array) -> float:
    """Return the least relative change of a symmetric matrix and load that makes a solution exact.

    Normwise, in the maximum norm: |A x - b| / (|A| |x| + |b|); NaN where something is not finite.

    References
    ----------
    J. L. Rigal and J. Gaches, "On the compatibility of a given solution with the data of a linear
    system", J. ACM 14 (1967) 543; N. J. Higham, Accuracy and Stability of Numerical Algorithms, 2nd
    ed., SIAM 2002, section 7.1 (both cited from memory).
    """
    residual = np.max(np.abs(matrix @ solution - load))
    sums = np.add.reduceat(np.abs(matrix.data), matrix.indptr[:-1])
    size = np.max(sums) * np.max(np.abs(solution)) + np.max(np.abs(load))
    return float(residual / size) if size != 0.0 else 0.0


def evaluated(side: Side, found: Minimum, current: float) -> Minimum:
    """Return a minimiser with its field and functional at the quadrature points of `side`."""
    field = side.field(found.x, current)
    return Minimum(side, current, found.x, field, *side.coefficients(field), found.history)


def _first_iterate(side: Side, current: float, start: Array) -> Array:
    """Return the minimiser of the quadratic model of the functional around a field `start`."""
    secant, tangent = side.coefficients(start)
    change = linearised(start, secant, tangent, side.prescribed(current) - start)
    flow = secant[:, None] * start + change
    load = current * side.load - side.tested(flow, np.ones_like(secant))
    return solved(side.hessian(start, secant, tangent), load, side.numbering.ordering)


def _slope(side: Side, x: Array, step: Array, current: float, length: float) -> float:
    field = side.field(x + length * step, current)
    secant, _ = side.coefficients(field)
    return float(side.gradient(field, secant, current) @ step)
