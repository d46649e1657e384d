"""Mutual inductance of thick coils, and leakage of concentric windings, from whole designs."""

from __future__ import annotations

from dataclasses import replace

from femag.coupled_windings import winding_matrix
from femag.design import Design
from femag.geometry import Block, PotCore, Winding
from femag.materials import LinearCurve
from validation.coupled_coils.regenerate import RADII
from validation.rows import Row, bounded_row, plain_row, printed, table_of
from validation.table import print_rows

MUTUAL_TOLERANCE = 1e-4
TOLERANCE = 1e-2
"""Of the self-inductances; the leakage field is smooth and comes out far closer."""
GUIDING = 1e5
"""Relative permeability of iron that stands for ideal iron."""
ENDS = 2e-3
"""Distance of a winding from either plate in the tall windows, m."""
ALLOWED = {"filled": 2e-5, "10": 1.6e-2, "40": 6e-3, "160": 3e-3}
"""Largest distance from the reference: what GUIDING and the textbook formula leave out."""


def rows() -> tuple[Row, ...]:
    """Return one row for each line of reference.csv."""
    return tuple(row_of(line) for line in table_of("coupled_coils"))


def row_of(line: dict[str, str]) -> Row:
    """Return the row of one line; this solves its problem."""
    reference = printed(line["inductance"])
    if line["case"] == "mutual":
        bounds = winding_matrix(_coils_in_air()).inductance[0][1]
        source = "computed for this project: Bessel integral"
        return bounded_row("two coils in air", "M", reference, bounds, MUTUAL_TOLERANCE, source)
    height = 1e-3 * float(line["height"])
    filled = line["case"] == "filled"
    (pair,) = winding_matrix(_concentric(height, 0.0 if filled else ENDS)).pairs
    leakage = pair.leakage_of_first
    allowed = ALLOWED["filled" if filled else line["height"]]
    source = "closed form" if filled else "textbook formula with Rogowski's factor, from memory"
    row = plain_row(
        f"{line['case']}, {line['height']} mm high", "leakage", reference, leakage.value, "H",
        allowed, source,
    )  # fmt: skip
    return replace(row, lower=leakage.lower, upper=leakage.upper)


def _coils_in_air() -> Design:
    """Return the coils in a core that is as permeable as air; one turn each."""
    core = PotCore(
        post_diameter=18e-3, window_diameter=42e-3, outer_diameter=48e-3, hole_diameter=0.0,
        height=46e-3, window_height=40e-3,
    )  # fmt: skip
    windings = (
        Winding(1, Block(10e-3, 20e-3, -15e-3, -5e-3), "low"),
        Winding(1, Block(10e-3, 15e-3, 5e-3, 15e-3), "high"),
    )
    return Design(core, windings, LinearCurve(1.0), tolerance=MUTUAL_TOLERANCE)


def _concentric(height: float, ends: float) -> Design:
    """Return two windings over each other in an ungapped core; one turn each."""
    window = height + 2.0 * ends
    core = PotCore(
        post_diameter=80e-3, window_diameter=91e-3, outer_diameter=111e-3, hole_diameter=0.0,
        height=window + 20e-3, window_height=window,
    )  # fmt: skip
    r1, r2, r3, r4 = RADII
    windings = (
        Winding(1, Block(r1, r2, -height / 2.0, height / 2.0), "inner"),
        Winding(1, Block(r3, r4, -height / 2.0, height / 2.0), "outer"),
    )
    return Design(core, windings, LinearCurve(GUIDING), tolerance=TOLERANCE)


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
