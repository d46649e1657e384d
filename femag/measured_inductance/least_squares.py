"""Least squares within bounds for costly residuals, counting every evaluation.

The Jacobian is found by differences at the start, corrected by what each step shows (Broyden's rank
one update), and found again by differences at the end.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import lsq_linear

from femag.errors import InputError

Array = NDArray[np.float64]

DIFFERENCE = 0.01
"""Step of the differences; far above the scatter of a mesh that changes with the unknowns."""
FIRST_RADIUS = float(np.log(2.0))
"""Largest change of an unknown in one step, at first."""
ENOUGH = 2e-4
"""Step below which the search ends."""
OFFSET = 0.03
"""Step over the standard errors below which the search ends."""


@dataclass(frozen=True)
class Linearisation:
    """Residuals and their Jacobian at a point.

    Parameters
    ----------
    x : array, shape (unknowns,)
        The point.
    residuals : array, shape (n,)
        At the point.
    jacobian : array, shape (n, unknowns)
        Derivatives of the residuals.
    by_differences : bool
        Whether the Jacobian was found at this point.
    """

    x: Array
    residuals: Array
    jacobian: Array
    by_differences: bool = True

    @property
    def cost(self) -> float:
        """Sum of the squared residuals."""
        return float(self.residuals @ self.residuals)


@dataclass
class CostlyResiduals:
    """Residuals as a function of the unknowns, with a count of how often it was evaluated.

    Parameters
    ----------
    function : callable
        Residuals (n,) of unknowns (k,); an InputError says that there are none.
    most : int
        Evaluations that may be spent.
    spent : int
        Evaluations that were begun.
    report : callable, optional
        Called with that number as each begins.
    """

    function: Callable[[Array], Array]
    most: int
    spent: int = 0
    report: Callable[[int], None] | None = None

    def __call__(self, x: Array) -> Array | None:
        """Return the residuals at x, None where there are none."""
        self.spent += 1
        if self.report is not None:
            self.report(self.spent)
        try:
            return self.function(x)
        except InputError:
            return None


def linearised(residuals: CostlyResiduals, x: Array, at_x: Array, upper: Array) -> Linearisation:
    """Return residuals and Jacobian at x by one-sided differences that stay within bounds.

    Parameters
    ----------
    residuals : CostlyResiduals
        Evaluated once for each unknown.
    x, at_x : array
        The point and the residuals at it.
    upper : array, shape (unknowns,)
        Upper bounds; the step is taken downwards where it would cross them.
    """
    columns = []
    for place in range(len(x)):
        step = np.zeros_like(x)
        step[place] = DIFFERENCE if x[place] + DIFFERENCE <= upper[place] else -DIFFERENCE
        moved = residuals(x + step)
        columns.append(np.zeros_like(at_x) if moved is None else (moved - at_x) / step[place])
    return Linearisation(x, at_x, np.column_stack(columns))


def least_squares(
    residuals: CostlyResiduals, start: Linearisation, lower: Array, upper: Array
) -> Linearisation:
    """Return the linearisation at the minimum within bounds, or where the evaluations ran out.

    Parameters
    ----------
    residuals : CostlyResiduals
        What is made small.
    start : Linearisation
        Where the search begins.
    lower, upper : array, shape (unknowns,)
        Bounds of the unknowns.

    References
    ----------
    C. G. Broyden, Math. Comp. 19 (1965) 577 (from memory). An end against the standard errors:
    D. M. Bates and D. G. Watts, Technometrics 23 (1981) 179 (from memory).
    """
    here, radius = start, FIRST_RADIUS
    while True:
        box = np.maximum(lower, here.x - radius), np.minimum(upper, here.x + radius)
        step = remaining_step(here, *box)
        small = is_small(step, here)
        exhausted = residuals.spent + len(here.x) > residuals.most
        if exhausted or (small and here.by_differences):
            return here
        if small:
            here = linearised(residuals, here.x, here.residuals, upper)
            continue
        found = residuals(here.x + step)
        if found is not None and found @ found < here.cost:
            here, radius = _updated(here, step, found), 2.0 * radius
        else:
            radius = 0.5 * float(np.max(np.abs(step)))
            here = here if found is None else _corrected(here, step, found)


def remaining_step(here: Linearisation, lower: Array, upper: Array) -> Array:
    """Return the step to the minimum of the linearised residuals within bounds, (unknowns,)."""
    box = (np.minimum(lower - here.x, -1e-12), np.maximum(upper - here.x, 1e-12))
    step = lsq_linear(here.jacobian, -here.residuals, box, method="bvls").x
    return np.asarray(np.clip(here.x + step, lower, upper) - here.x)


def is_small(step: Array, here: Linearisation, times: float = 1.0) -> bool:
    """Return whether a step is small by itself, or against the standard errors of the unknowns.

    Parameters
    ----------
    step : array, shape (unknowns,)
        From `here`.
    here : Linearisation
        Whose residuals and Jacobian give the standard errors.
    times : float
        How many times the step at which a search ends still counts as small.
    """
    points, unknowns = here.jacobian.shape
    gain = float(np.sum((here.jacobian @ step) ** 2)) / unknowns
    scatter = here.cost / max(points - unknowns, 1)
    size = float(np.max(np.abs(step)))
    return size < times * ENOUGH or gain < (times * OFFSET) ** 2 * scatter


def _updated(here: Linearisation, step: Array, found: Array) -> Linearisation:
    """Return the linearisation at the end of a step, its Jacobian corrected."""
    corrected = _corrected(here, step, found)
    return replace(corrected, x=here.x + step, residuals=found)


def _corrected(here: Linearisation, step: Array, found: Array) -> Linearisation:
    """Return the linearisation with a Jacobian that gives what was found a step away.

    A step shorter than those of the differences says nothing new of the Jacobian.
    """
    if float(np.max(np.abs(step))) <= DIFFERENCE:
        return here
    missed = found - here.residuals - here.jacobian @ step
    jacobian = here.jacobian + np.outer(missed, step) / (step @ step)
    return replace(here, jacobian=jacobian, by_differences=False)
