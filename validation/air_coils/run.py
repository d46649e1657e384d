"""Self and mutual inductance of thick coils in open space, against Bessel integrals."""

from __future__ import annotations

from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import Bounds
from femag.field.problem import FieldProblem
from femag.geometry import Region, is_mirror_symmetric, open_section, rectangle, upper_half
from validation.rows import Row, bounded_row, printed, table_of
from validation.table import print_rows

FAR_RADIUS = 60.0
"""Radius of the meshed space over the coils' largest extent; what it cuts off is in the bounds."""
TOLERANCE = 1e-4
PAIR_TOLERANCE = 1e-5
"""Each of the two inductances whose difference is 4 M; 4 M is a fifth of either."""
SOURCE = "computed for this project: Bessel integral"

Lengths = tuple[float, float, float, float]
"""Inner radius, outer radius, height and middle, m."""


def rows() -> tuple[Row, ...]:
    """Return one row for each inductance."""
    return tuple(_row_of(line) for line in table_of("air_coils"))


def self_inductance(coil: Lengths) -> Bounds:
    """Return the bounds of the inductance of one turn, H."""
    return _series_inductance((coil,), (1.0,), TOLERANCE)


def mutual_inductance(one: Lengths, other: Lengths) -> Bounds:
    """Return the bounds of M from both coils in series, aided and opposed: 4 M apart, H."""
    aided = _series_inductance((one, other), (1.0, 1.0), PAIR_TOLERANCE)
    opposed = _series_inductance((one, other), (1.0, -1.0), PAIR_TOLERANCE)
    lower, upper = aided.lower - opposed.upper, aided.upper - opposed.lower
    return Bounds(lower / 4.0, upper / 4.0, "H")


def _series_inductance(
    coils: tuple[Lengths, ...], turns: tuple[float, ...], tolerance: float
) -> Bounds:
    regions, density = [], {}
    for index, ((inner, outer, height, middle), count) in enumerate(zip(coils, turns, strict=True)):
        low, high = middle - height / 2.0, middle + height / 2.0
        name = f"coil {index + 1}"
        regions.append(Region(name, "winding", rectangle(inner, outer, low, high)))
        density[name] = count / ((outer - inner) * height)
    extent = max(max(outer, abs(middle) + height / 2.0) for _, outer, height, middle in coils)
    section = open_section(tuple(regions), FAR_RADIUS * extent)
    if is_mirror_symmetric(section):
        section = upper_half(section)
    solution, _ = adapted_solution(FieldProblem(section, {}, density), 1.0, tolerance)
    return inductance_bounds(solution)


def _row_of(line: dict[str, str]) -> Row:
    coil = _lengths(line["coil_mm"])
    reference = printed(line["inductance"])
    if line["quantity"] == "L":
        r1, r2, height = (1e3 * length for length in coil[:3])
        case = f"{r1:g}-{r2:g} x {height:g} mm"
        return bounded_row(case, "L", reference, self_inductance(coil), TOLERANCE, SOURCE)
    bounds = mutual_inductance(coil, _lengths(line["other_coil_mm"]))
    return bounded_row(
        "two coils, 10 mm apart", "M", reference, bounds, 10 * PAIR_TOLERANCE, SOURCE
    )


def _lengths(text: str) -> Lengths:
    inner, outer, height, middle = (1e-3 * float(part) for part in text.split())
    return inner, outer, height, middle


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
