"""Core loss of the one-dimensional pot, against the published equation summed over time."""

from __future__ import annotations

from collections.abc import Iterator

from femag.field.adapt import adapted_solution
from femag.materials import Steinmetz
from femag.quantities import core_loss
from femag.ripple import Ripple
from validation.core_loss.regenerate import ALPHA, BETA, FREQUENCY, LOOPS, K
from validation.nonlinear_pot.run import pot
from validation.rows import Row, plain_row, printed, table_of
from validation.table import print_rows

TOLERANCE = 1e-5
ALLOWED = 2e-4
FOLLOWED_ALLOWED = 5e-3
"""What the last halving of the steps of current may move."""
"""Loss has no bounds; the swing at 1000 A is a small difference of two fields."""
SOURCE = "computed for this project: published equation over one-dimensional fields"
MATERIAL = Steinmetz(K, ALPHA, BETA, (1e3, 1e6), (1e-3, 1.0))


def rows() -> tuple[Row, ...]:
    """Return the rows of each waveform and current."""
    return tuple(row for line in table_of("core_loss") for row in rows_of(line))


def ripple_of(waveform: str, height: float) -> Ripple:
    """Return a waveform of reference.csv, its height in A."""
    if waveform == "sine":
        return Ripple(height, FREQUENCY, "sine")
    if waveform == "triangle":
        return Ripple(height, FREQUENCY, rise=LOOPS[waveform][0][0][2])
    corners = ((0.0, 0.0), (0.3, 0.6), (0.4, 0.4), (0.5, 0.6), (0.7, 1.0), (0.76, 0.7), (0.8, 0.8))
    closing = ((0.825, 0.7), (1.0, 0.0))
    return Ripple.of_samples([(s, height * level) for s, level in corners + closing], FREQUENCY)


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    peak, height = float(line["peak"]), float(line["ripple"])
    solution, _ = adapted_solution(pot(), peak, TOLERANCE)
    loss = core_loss(solution, ripple_of(line["waveform"], height), MATERIAL)
    straight = loss.total / (1.0 + loss.bend)
    case = f"{line['waveform']}, {peak:g} A"
    reference = printed(line["proportional"])
    yield plain_row(case, "in proportion", reference, straight, "W", ALLOWED, SOURCE)
    followed = printed(line["followed"])
    yield plain_row(case, "followed", followed, loss.total, "W", FOLLOWED_ALLOWED, SOURCE)


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
