"""What a design review looks at: the result, a row of meshes, a curve with fields, checks."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from femag.current_curve import InductanceCurve, inductance_curve
from femag.design import Design
from femag.errors import InputError
from femag.field.adapt import inductance_bounds, refinements
from femag.field.bounds import Bounds, FieldSolution
from femag.field.design_problem import field_problem
from femag.measured_inductance import MeasuredPoints, residuals
from femag.mesh import coarse_mesh
from femag.requirement_checks import RequirementCheck, checked_requirements
from femag.result import Result, solve
from femag.tolerance_budget import ToleranceBudget, tolerance_budget

STEPS = 6
BEYOND = 9
"""Currents of a review by default: 1/6, 2/6 ... 9/6 of the peak."""
CURVE_TOLERANCE = 1e-3
"""Of the curve and the fields along it, unless the design's own is wider."""
FARTHER = 0.3
"""Share of the tolerance down to which the row of meshes goes."""
MOST_UNKNOWNS = 40_000
"""Unknowns at which the row of meshes ends anyway."""
MESH_ACCURACY = 1e-7
"""Of Newton's method along the row of meshes; the bounds hold at any."""


@dataclass(frozen=True)
class MeshStep:
    """The bounds on one mesh of a row.

    Parameters
    ----------
    unknowns : int
        Of both sides.
    inductance : Bounds
        Energy inductance, H.
    """

    unknowns: int
    inductance: Bounds


@dataclass(frozen=True)
class Review:
    """What a review sheet shows.

    Parameters
    ----------
    result : Result
        At the peak current, with its fields.
    meshes : tuple of MeshStep
        The bounds on a row of meshes, from a coarse one to beyond the tolerance.
    finest : FieldSolution
        Fields on the finest mesh that was solved at the peak current.
    curve : InductanceCurve
        With the fields at every current.
    checks : tuple of RequirementCheck
        The design's requirements.
    tolerances : ToleranceBudget or None
        What part tolerances do to the inductance: the design's, or customary ones; None with a
        magnet in a gap.
    measured : MeasuredPoints or None
        What the bench says of the inductance.
    residuals : tuple of float
        Solved over measured inductance less 1 at each measured point.
    """

    result: Result
    meshes: tuple[MeshStep, ...]
    finest: FieldSolution
    curve: InductanceCurve
    checks: tuple[RequirementCheck, ...]
    tolerances: ToleranceBudget | None
    measured: MeasuredPoints | None = None
    residuals: tuple[float, ...] = ()

    @property
    def design(self) -> Design:
        """The design."""
        return self.result.design

    @property
    def drawn(self) -> Result:
        """The result with the fields of the finest mesh, which draw more smoothly."""
        return replace(self.result, solution=self.finest)


def design_review(
    design: Design,
    currents: Sequence[float] = (),
    measured: MeasuredPoints | None = None,
    progress: Callable[[str], None] | None = None,
) -> Review:
    """Return everything that a review sheet shows.

    Parameters
    ----------
    design : Design
        What is reviewed, at its own current and tolerance.
    currents : sequence of float, optional
        A, of the curve; the peak current joins them. A sixth of the peak to one and a half times
        when left out.
    measured : MeasuredPoints, optional
        Measured inductance; its currents join the curve.
    progress : callable, optional
        Called with what is being done, in words.

    Raises
    ------
    InputError
        If the currents make no curve, or one has another sign than the peak.
    ToleranceError
        If the tolerance is out of reach.
    NumericalError
        If a mesh or a system fails.
    """
    said = progress or (lambda _: None)
    asked = _asked(design.current, currents, measured)
    said("peak current")
    result = solve(design)
    said("row of meshes")
    meshes, finest = mesh_row(design)
    said("curve")
    tolerance = max(CURVE_TOLERANCE, design.tolerance)
    curve = inductance_curve(design, asked, tolerance, keep_fields=True)
    return Review(
        result=result,
        meshes=meshes,
        finest=max(finest, _fields(result), key=lambda solution: solution.unknowns),
        curve=curve,
        checks=checked_requirements(result),
        tolerances=_tolerances(result),
        measured=measured,
        residuals=() if measured is None else tuple(residuals(measured, curve).tolist()),
    )


def _asked(peak: float, currents: Sequence[float], measured: MeasuredPoints | None) -> list[float]:
    """Return the currents of the curve in A, by rising magnitude, each once."""
    asked = {
        *(currents or [peak * step / STEPS for step in range(1, BEYOND + 1)]),
        peak,
        *(measured.current if measured is not None else ()),
    }
    for current in asked:
        if current * peak < 0.0:
            raise InputError(
                "of the other sign than the peak current", key="currents", value=current,
                accepted=f"measured and other currents with the sign of the design's {peak:g} A",
            )  # fmt: skip
    return sorted(asked, key=abs)


def _fields(result: Result) -> FieldSolution:
    assert result.solution is not None  # it was just solved
    return result.solution


def _tolerances(result: Result) -> ToleranceBudget | None:
    """Return the budget of a result that was just solved, with customary tolerances if need be."""
    if any(gap.magnet is not None for gap in result.design.gaps):
        return None
    return result.tolerance_budget or tolerance_budget(result.design, _fields(result))


def mesh_row(design: Design) -> tuple[tuple[MeshStep, ...], FieldSolution]:
    """Return the bounds at the design's current on ever finer meshes, and the last fields."""
    problem = field_problem(design)
    mesh = coarse_mesh(problem.section, corner_rounds=0)
    steps: list[MeshStep] = []
    for solution in refinements(problem, design.current, MESH_ACCURACY, mesh):
        steps.append(MeshStep(solution.unknowns, inductance_bounds(solution)))
        reached = steps[-1].inductance.relative_half_width <= FARTHER * design.tolerance
        if reached or solution.unknowns > MOST_UNKNOWNS:
            return tuple(steps), solution
    raise AssertionError("refinements never end")
