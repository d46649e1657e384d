"""The validation table as plain text of at most 80 columns."""

from __future__ import annotations

from collections.abc import Iterable

from validation.rows import Row

HEADER = (
    f"{'case':<22} {'quantity':<15} {'reference':>14} {'error':>7} {'half':>6} {'holds':<5} pass"
)
LEGEND = (
    "error: value (midpoint of the bounds) over reference, less 1, in ppm\n"
    "half: half width of the bounds over reference, in ppm\n"
    "holds: whether the bounds hold the reference; '-': there are none, or the meshed\n"
    "       body is not exactly the reference's\n"
    "pass: the bounds hold the reference where they must, and the error is allowed;\n"
    "      '-': shown and not judged, the folder's README says why"
)


def cells(row: Row) -> tuple[str, ...]:
    """Return case, quantity, reference, error, half width, whether it is held, and verdict."""
    half = row.relative_half_width
    return (
        row.case,
        row.quantity,
        f"{row.reference:.5e} {row.unit}".strip(),
        _ppm(row.error, "+"),
        "-" if half is None else _ppm(half),
        {True: "yes", False: "NO", None: "-"}[row.contained],
        ("yes" if row.passed else "FAIL") if row.is_judged else "-",
    )


def row_line(row: Row) -> str:
    """Return one row in at most 80 columns."""
    case, quantity, reference, error, half, holds, verdict = cells(row)
    return f"{case:<22} {quantity:<15} {reference:>14} {error:>7} {half:>6} {holds:<5} {verdict}"


def print_rows(rows: Iterable[Row]) -> int:
    """Print rows as they come and return the exit code: 0 if there are any and all pass, else 1."""
    print(HEADER)
    passed = []
    for row in rows:
        print(row_line(row), flush=True)
        passed.append(row.passed)
    return 0 if passed and all(passed) else 1


def _ppm(value: float, sign: str = "") -> str:
    ppm = value * 1e6
    if abs(ppm) < 1e-2:
        return f"{ppm:{sign}.0e}"
    return f"{ppm:{sign}.2f}" if abs(ppm) < 10 else f"{ppm:{sign}.0f}"
