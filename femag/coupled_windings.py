"""Several windings: inductance matrix, coupling, leakage and turns ratios, between bounds.

The windings are excited per ampere turn, the first by itself and each other one against it. Leakage
is then an energy of its own instead of a small difference of large ones, with bounds as narrow as
the mesh makes them for that field.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from femag.design import Design, design_hash, turns_per_area
from femag.errors import InputError, NumericalError
from femag.field.adapt import MAXIMUM_UNKNOWNS, adapted_solution
from femag.field.bounds import Bounds, both_sides
from femag.field.design_problem import field_problem
from femag.field.response import Excitation, Response, refined_response, response
from femag.geometry import PotCore
from femag.mesh import coarse_mesh
from femag.quantities.bounded_form import BoundedForm, over
from femag.result import library_versions

Array = NDArray[np.float64]

MOST_WINDINGS = 20
STRAIGHT_LEGS = (
    "Leakage in cores with straight legs has not been compared with three dimensions: beside their "
    "openings the windings lie in open space, which the core of revolution closes."
)


@dataclass(frozen=True)
class WindingPair:
    """Two windings, the others open.

    Parameters
    ----------
    first, second : str
        Names.
    coupling : Bounds
        Coupling factor M / sqrt(L1 L2).
    leakage_of_first, leakage_of_second : Bounds
        Inductance in H of one winding with the other short-circuited.
    opposed_inductance : Bounds
        Inductance in H referred to the first winding with opposed ampere turns, N1 I1 = -N2 I2. It
        is never below the leakage of the first.
    nominal_ratio : float
        N2/N1.
    forward_ratio, backward_ratio : Bounds
        Open-circuit voltage of the second over that of the first when the first is driven, and of
        the first over that of the second when the second is.
    magnetising_inductance : Bounds
        M N1/N2, H: across the first winding in the T-equivalent with the nominal ratio.
    series_of_first, series_of_second : Bounds
        L1 - M N1/N2 and L2 - M N2/N1, H: in series with each winding in that equivalent. One may be
        negative.
    """

    first: str
    second: str
    coupling: Bounds
    leakage_of_first: Bounds
    leakage_of_second: Bounds
    opposed_inductance: Bounds
    nominal_ratio: float
    forward_ratio: Bounds
    backward_ratio: Bounds
    magnetising_inductance: Bounds
    series_of_first: Bounds
    series_of_second: Bounds


@dataclass(frozen=True)
class WindingMatrix:
    """Inductances of all windings of a design at small signal.

    Parameters
    ----------
    design : Design
        The design, with the tolerance that was used. Saturating materials are linearised at its
        current in its driven windings.
    inductance : tuple of tuple of Bounds
        Matrix in H, in the order of the design's windings. Rigorous for linear materials; for
        saturating ones they bound the problem that is linearised at the computed bias.
    pairs : tuple of WindingPair
        Every two windings.
    reciprocity : tuple of float
        Largest distance of M12 from M21 over sqrt(L1 L2), of the flux linkages of the flux side and
        of the potential side: rounding.
    unknowns, refinements : int
        Unknowns of both sides on the last mesh; number of refinements.
    seconds : float
        Wall time.
    versions : dict of str to str
        Versions of this package, Python and the libraries behind the numbers.
    design_hash : str
        Digest of everything in the design that can move a result.
    """

    design: Design
    inductance: tuple[tuple[Bounds, ...], ...]
    pairs: tuple[WindingPair, ...]
    reciprocity: tuple[float, float]
    unknowns: int
    refinements: int
    seconds: float
    versions: dict[str, str] = field(repr=False)
    design_hash: str

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the windings, in the order of the matrix."""
        return tuple(winding.name for winding in self.design.windings)

    @property
    def note(self) -> str:
        """What the model leaves out of these numbers; empty where that is nothing."""
        core = self.design.core
        return "" if isinstance(core, PotCore) else f"{core.model_note} {STRAIGHT_LEGS}"

    @property
    def turns(self) -> tuple[int, ...]:
        """Turns of the windings, in the order of the matrix."""
        return tuple(winding.turns for winding in self.design.windings)


def winding_matrix(
    design: Design,
    tolerance: float | None = None,
    progress: Callable[[Response], None] | None = None,
) -> WindingMatrix:
    """Return the inductance matrix of a design's windings and what follows from it.

    One mesh serves all windings. It is refined until the inductance of each winding, and the
    leakage of each pair seen from either side, are within the tolerance.

    Parameters
    ----------
    design : Design
        Two windings or more.
    tolerance : float, optional
        Wanted half width of these over their values; the design's own when left out.
    progress : callable, optional
        Called with the fields on every mesh.

    Raises
    ------
    InputError
        If there is one winding only, or the tolerance cannot be used.
    NumericalError
        If the tolerance is out of reach, or a mesh or a system fails.
    """
    started = time.perf_counter()
    if tolerance is not None:
        design = replace(design, tolerance=tolerance)
    _check_number(len(design.windings))
    refinements = 0
    for found in _responses(design):
        if progress is not None:
            progress(found)
        form = BoundedForm(found.lower, found.upper, "H")
        if not _wide_mixes(form, design.tolerance):
            break
        refinements += 1
    return WindingMatrix(
        design=design,
        inductance=_inductances(form, design),
        pairs=tuple(
            _pair(form, design, *two) for two in combinations(range(len(design.windings)), 2)
        ),
        reciprocity=_reciprocity(found),
        unknowns=found.sides.unknowns,
        refinements=refinements,
        seconds=time.perf_counter() - started,
        versions=library_versions(),
        design_hash=design_hash(design),
    )


def _check_number(windings: int) -> None:
    if windings < 2:
        raise InputError(
            "one winding couples to none", key="winding", accepted="two [[winding]] or more"
        )
    if windings > MOST_WINDINGS:
        raise InputError(
            f"{windings} windings are too many", key="winding", accepted=f"at most {MOST_WINDINGS}"
        )


def _responses(design: Design) -> Iterator[Response]:
    """Yield the fields of the excitations on ever finer meshes."""
    found = _first_response(design, _excitations(design))
    while True:
        yield found
        if found.sides.unknowns > MAXIMUM_UNKNOWNS:
            raise NumericalError(
                f"tolerance {design.tolerance:g} not reached with {found.sides.unknowns} unknowns"
            )
        form = BoundedForm(found.lower, found.upper, "H")
        found = refined_response(found, _wide_mixes(form, design.tolerance))


def _first_response(design: Design, excitations: tuple[Excitation, ...]) -> Response:
    """Return the fields on a coarse mesh, or at a bias on a mesh that is fine enough for it."""
    problem = field_problem(design)
    sides = both_sides(problem, coarse_mesh(problem.section))
    if not sides.laws.saturating:
        return response(sides, excitations)
    bias, _ = adapted_solution(problem, design.current, design.tolerance)
    return response(bias.sides, excitations, bias)


def _excitations(design: Design) -> tuple[Excitation, ...]:
    """Return the first winding per ampere turn, and each other one less it."""
    each = []
    for winding in design.windings:
        own = turns_per_area(replace(design, driven=(winding.name,)))
        each.append({region: density / winding.turns for region, density in own.items()})
    less_first = {region: -density for region, density in each[0].items()}
    return (each[0], *(other | less_first for other in each[1:]))


def _ampere_turns(windings: int) -> Array:
    """Return one ampere turn of each winding (rows) as mixes of the excitations (columns).

    Differences of two rows have no part of the first excitation, exactly.
    """
    mixes = np.eye(windings)
    mixes[:, 0] = 1.0
    return mixes


def _wide_mixes(form: BoundedForm, tolerance: float) -> list[Array]:
    """Return the mixes of currents whose brackets are wider than the tolerance."""
    each = _ampere_turns(len(form.lower))
    wide = [mix for mix in each if form.value(mix).relative_half_width > tolerance]
    for one, other in combinations(each, 2):
        for shorted in (one, other):
            leakage = form.least(one - other, shorted)
            if leakage.relative_half_width > tolerance:
                wide.append(form.lowest(one - other, shorted))
    return wide


def _inductances(form: BoundedForm, design: Design) -> tuple[tuple[Bounds, ...], ...]:
    """Return the matrix in H: bounds of forms on the diagonal, of products off it."""
    each = _ampere_turns(len(form.lower))
    counts = [winding.turns for winding in design.windings]
    return tuple(
        tuple(
            (form.value(v) if i == j else form.product(v, w)).scaled(counts[i] * counts[j], "H")
            for j, w in enumerate(each)
        )
        for i, v in enumerate(each)
    )


def _pair(form: BoundedForm, design: Design, i: int, j: int) -> WindingPair:
    """Return what two windings do together, from energies per ampere turn."""
    v, w = _ampere_turns(len(form.lower))[[i, j]]
    first, second = design.windings[i], design.windings[j]
    own, other, mutual = float(first.turns) ** 2, float(second.turns) ** 2, form.product(v, w)
    leakage = form.least(v - w, w)
    ratio = second.turns / first.turns
    return WindingPair(
        first=first.name,
        second=second.name,
        coupling=_coupling(mutual, form.value(v), form.value(w), leakage),
        leakage_of_first=leakage.scaled(own, "H"),
        leakage_of_second=form.least(v - w, v).scaled(other, "H"),
        opposed_inductance=form.value(v - w).scaled(own, "H"),
        nominal_ratio=ratio,
        forward_ratio=_voltage_ratio(form, v, w, ratio),
        backward_ratio=_voltage_ratio(form, w, v, 1.0 / ratio),
        magnetising_inductance=mutual.scaled(own, "H"),
        series_of_first=form.product(v, v - w).scaled(own, "H"),
        series_of_second=form.product(w, w - v).scaled(other, "H"),
    )


def _voltage_ratio(form: BoundedForm, driven: Array, open_: Array, nominal: float) -> Bounds:
    """Return the open-circuit voltage ratio M/L, as its distance from the nominal one."""
    excess = over(form.product(driven, open_ - driven), form.value(driven))
    return Bounds(nominal * (1.0 + excess.lower), nominal * (1.0 + excess.upper))


def _coupling(mutual: Bounds, one: Bounds, other: Bounds, leakage: Bounds) -> Bounds:
    """Return the bounds of M / sqrt(L1 L2).

    They are those of M over those of the root, cut to what the leakage leaves: the square is
    1 - leakage/L1, which is by far the sharper of the two where the coupling is close.
    """
    root = Bounds(np.sqrt(one.lower * other.lower), np.sqrt(one.upper * other.upper))
    plain, lost = over(mutual, root), over(leakage, one)
    most = float(np.sqrt(max(1.0 - lost.lower, 0.0)))
    least = float(np.sqrt(max(1.0 - lost.upper, 0.0)))
    lower, upper = max(plain.lower, -most), min(plain.upper, most)
    if plain.lower > 0.0:
        lower = max(lower, least)
    elif plain.upper < 0.0:
        upper = min(upper, -least)
    return Bounds(float(lower), float(upper))


def _reciprocity(found: Response) -> tuple[float, float]:
    """Return the largest |M12 - M21| / sqrt(L1 L2) of the linkages of either side."""
    each = _ampere_turns(len(found.lower))
    worst = []
    for linkages in found.linkages_of_sides:
        matrix = each @ linkages @ each.T
        scale = np.sqrt(np.outer(np.diag(matrix), np.diag(matrix)))
        worst.append(float(np.max(np.abs(matrix - matrix.T) / scale)))
    return worst[0], worst[1]
