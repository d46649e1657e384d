"""The door: a design in, a result out."""

from __future__ import annotations

import platform
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from importlib.metadata import version

from femag.design import Design, design_hash
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import Bounds, FieldSolution
from femag.field.design_problem import field_problem
from femag.hand import HandEstimate, hand_estimates, plain_inductance
from femag.mesh import SectionMesh
from femag.quantities import (
    CoreLoss,
    Force,
    LossBudget,
    SectionMean,
    VolumeShare,
    WindingLoss,
    WoundCopper,
    copper_loss,
    core_loss,
    force_of,
    gap_factor,
    incremental_inductance_of_sides,
    section_means,
    volume_shares,
    wound_copper,
)
from femag.tolerance_budget import ToleranceBudget, tolerance_budget

LIBRARIES = ("gapfield", "numpy", "scipy", "scikit-fem", "gmsh")


@dataclass(frozen=True)
class Comparison:
    """A hand estimate beside the field.

    Parameters
    ----------
    estimate : HandEstimate
        Name, inductance (H), range and source of the formula.
    error : float
        Its inductance over the field's midpoint, less 1.
    """

    estimate: HandEstimate
    error: float


@dataclass(frozen=True)
class Result:
    """What the field says about a design at one current, with all that it rests on.

    Parameters
    ----------
    design : Design
        The design, with the current and the tolerance that were used.
    inductance : Bounds
        Energy inductance 2 W'/I^2, H; rigorous for linear materials, else up to quadrature. With
        magnets 2/I^2 times what the current adds to W'; of a saturating core that rests on
        estimates of the magnets' flux linkage too.
    coenergy : Bounds
        Co-energy W', J; that of the magnets included.
    flux_linkage_of_sides : tuple of float
        Flux linkage in Wb from the flux side and from the potential side; the difference
        estimates the error and bounds nothing.
    incremental_inductance_of_sides : tuple of float
        d(flux linkage)/dI in H at the current from the tangent problem of either side; estimates.
    plain_inductance : float
        Reluctance network without fringing, H (energy inductance).
    gap_factor : float or None
        Plain gap reluctance over the reluctance that the field leaves to the gap; None without gap.
    hand : tuple of Comparison
        Every hand formula beside the field.
    section_means : tuple of SectionMean
        Mean flux density through cuts of the core, T, from the flux side.
    volume_shares : tuple of VolumeShare
        Flux density, T, that half, 90 % and 99 % of the core's volume stay below.
    copper : tuple of WoundCopper
        Layers, wire and resistance of every winding that has a conductor.
    force : Force
        Pull of the halves and of the faces of every gap, N; estimates.
    unknowns, refinements : int
        Unknowns of both sides on the last mesh; number of refinements.
    seconds : float
        Wall time of the solution.
    versions : dict of str to str
        Versions of this package, Python and the libraries behind the numbers.
    design_hash : str
        Digest of everything in the design that can move the result.
    magnet_flux_linkage_of_sides : tuple of float or None
        Flux linkage in Wb without current from either side; None without magnets.
    magnet_coenergy : Bounds or None
        Co-energy without current, J, which is below 0; None without magnets.
    copper_loss : tuple of WindingLoss
        Loss of every winding, W; none without a ripple.
    core_loss : CoreLoss or None
        Loss of the core under the ripple; None without a ripple or without loss parameters.
    tolerance_budget : ToleranceBudget or None
        What the design's tolerances do to the inductance; None where it gives none.
    solution : FieldSolution or None
        The fields; None when the result was read from a file.
    """

    design: Design
    inductance: Bounds
    coenergy: Bounds
    flux_linkage_of_sides: tuple[float, float]
    incremental_inductance_of_sides: tuple[float, float]
    plain_inductance: float
    gap_factor: float | None
    hand: tuple[Comparison, ...]
    section_means: tuple[SectionMean, ...]
    volume_shares: tuple[VolumeShare, ...]
    copper: tuple[WoundCopper, ...]
    force: Force
    unknowns: int
    refinements: int
    seconds: float
    versions: dict[str, str]
    design_hash: str
    magnet_flux_linkage_of_sides: tuple[float, float] | None = None
    magnet_coenergy: Bounds | None = None
    copper_loss: tuple[WindingLoss, ...] = ()
    core_loss: CoreLoss | None = None
    tolerance_budget: ToleranceBudget | None = None
    solution: FieldSolution | None = field(default=None, repr=False, compare=False)

    @property
    def current(self) -> float:
        """Current in the driven windings, A."""
        return self.design.current

    @property
    def flux_linkage(self) -> float:
        """Flux linkage, Wb: mean of both sides."""
        return sum(self.flux_linkage_of_sides) / 2

    @property
    def magnet_flux_linkage(self) -> float | None:
        """Flux linkage without current, Wb: mean of both sides; None without magnets."""
        sides = self.magnet_flux_linkage_of_sides
        return None if sides is None else sum(sides) / 2

    @property
    def incremental_inductance(self) -> float:
        """Incremental inductance, H: mean of both sides."""
        return sum(self.incremental_inductance_of_sides) / 2

    @property
    def apparent_inductance(self) -> float:
        """Flux linkage over current, H; with magnets what the current adds to it."""
        return (self.flux_linkage - (self.magnet_flux_linkage or 0.0)) / self.current

    @property
    def stored_energy(self) -> float:
        """Energy in the field, J: current times flux linkage less the co-energy.

        With magnets what the current has put into it, which is what comes out when it is cut.
        """
        idle = self.magnet_coenergy.value if self.magnet_coenergy else 0.0
        return self.current * self.flux_linkage - (self.coenergy.value - idle)

    @property
    def al_value(self) -> float:
        """Inductance over turns squared, H."""
        return self.inductance.value / self.design.turns**2

    @property
    def loss_budget(self) -> LossBudget | None:
        """Losses under current and ripple, added up; without a ripple those of a constant current.

        None without a ripple where a winding that carries current has no conductor.
        """
        if self.design.ripple is None:
            return self._loss_of_constant_current
        copper = self.copper_loss
        by_ripple = [part for loss in copper for part in (loss.ripple, loss.crossing)]
        return LossBudget(
            core=self.core_loss.total if self.core_loss else None,
            copper_dc=_sum_if_known([loss.dc for loss in copper]),
            copper_ripple=_sum_if_known(by_ripple),
        )

    @property
    def _loss_of_constant_current(self) -> LossBudget | None:
        resistances = {copper.name: copper.resistance for copper in self.copper}
        names = [winding.name for winding in self.design.driven_windings]
        if not resistances.keys() >= set(names):
            return None
        resistance = sum(resistances[name] for name in names)
        return LossBudget(core=0.0, copper_dc=self.current**2 * resistance, copper_ripple=0.0)

    @property
    def fringing_factor(self) -> float:
        """Inductance of the field over that of the network without fringing."""
        return self.inductance.value / self.plain_inductance


def solve(
    design: Design,
    current: float | None = None,
    tolerance: float | None = None,
    progress: Callable[[FieldSolution], None] | None = None,
    mesh: SectionMesh | None = None,
) -> Result:
    """Return inductance between bounds, and everything that goes with it, for one current.

    Parameters
    ----------
    design : Design
        What to solve.
    current : float, optional
        A; the design's own when left out.
    tolerance : float, optional
        Wanted half width between the bounds over the value; the design's own when left out.
    progress : callable, optional
        Called with the field solution of every refinement.
    mesh : SectionMesh, optional
        Mesh of the design's section to start from; a coarse one when left out.

    Raises
    ------
    InputError
        If current or tolerance cannot be used.
    ToleranceError
        If the tolerance is out of reach; it holds the bracket that was reached.
    NumericalError
        If a mesh or a system fails.
    """
    started = time.perf_counter()
    design = replace(
        design,
        current=design.current if current is None else current,
        tolerance=design.tolerance if tolerance is None else tolerance,
    )
    solution, refinements = adapted_solution(
        field_problem(design), design.current, design.tolerance, progress, mesh
    )
    result = _result_of_fields(design, solution, refinements)
    return replace(result, seconds=time.perf_counter() - started)


def _result_of_fields(design: Design, solution: FieldSolution, refinements: int) -> Result:
    """Return everything that is read off the fields; its wall time is 0."""
    inductance, idle = inductance_bounds(solution), solution.idle
    hand_input = (design.core, design.gaps, design.turns, design.current, design.material)
    return Result(
        design=design,
        inductance=inductance,
        coenergy=solution.coenergy,
        flux_linkage_of_sides=solution.flux_linkage_of_sides,
        incremental_inductance_of_sides=incremental_inductance_of_sides(solution),
        plain_inductance=plain_inductance(*hand_input),
        gap_factor=gap_factor(design, solution),
        hand=tuple(
            Comparison(estimate, estimate.inductance / inductance.value - 1.0)
            for estimate in hand_estimates(*hand_input)
        ),
        section_means=section_means(design, solution),
        volume_shares=volume_shares(solution),
        copper=wound_copper(design),
        copper_loss=copper_loss(design, solution),
        force=force_of(design, solution),
        unknowns=solution.unknowns,
        refinements=refinements,
        seconds=0.0,
        versions=library_versions(),
        design_hash=design_hash(design),
        magnet_flux_linkage_of_sides=idle.flux_linkage_of_sides if idle else None,
        magnet_coenergy=idle.coenergy if idle else None,
        core_loss=_core_loss(design, solution),
        tolerance_budget=tolerance_budget(design, solution) if design.part_tolerances else None,
        solution=solution,
    )


def _sum_if_known(losses: Sequence[float | None]) -> float | None:
    known = [loss for loss in losses if loss is not None]
    return sum(known) if len(known) == len(losses) else None


def _core_loss(design: Design, solution: FieldSolution) -> CoreLoss | None:
    if design.ripple is None or design.material.loss is None:
        return None
    return core_loss(solution, design.ripple, design.material.loss)


def library_versions() -> dict[str, str]:
    """Return the versions of Python and of the libraries behind the numbers."""
    return {"python": platform.python_version()} | {name: version(name) for name in LIBRARIES}
