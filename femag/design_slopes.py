"""The door to derivatives: a design or its result in, what every parameter does out."""

from __future__ import annotations

from femag.design import Design
from femag.quantities.parameter_slopes import Sensitivity, sensitivities_of
from femag.result import Result, solve


def sensitivities(of: Design | Result) -> tuple[Sensitivity, ...]:
    """Return the derivatives of co-energy, inductance and AL by everything that may be off.

    Parameters
    ----------
    of : Design or Result
        A result costs no other solution, except one that was read from a file.

    Raises
    ------
    InputError
        If there is a magnet in the gap.
    NumericalError
        If a design cannot be solved.
    """
    result = of if isinstance(of, Result) and of.solution is not None else None
    if result is None:
        result = solve(of.design if isinstance(of, Result) else of)
    assert result.solution is not None
    return sensitivities_of(result.design, result.solution)
