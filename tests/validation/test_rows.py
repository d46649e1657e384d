"""Every row of the validation table, and that the table can fail."""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from functools import cache
from pathlib import Path

import pytest

import validation
from femag.field.bounds import Bounds
from validation.__main__ import FOLDERS, folder_rows, main
from validation.core_loss import run as core_loss
from validation.nonlinear_pot import run as nonlinear_pot
from validation.round_leg_3d import run as round_leg_3d
from validation.round_post_fringing import run as round_post_fringing
from validation.rows import Digits, Row, bounded_row, plain_row, printed, table_of
from validation.sphere import run as sphere
from validation.table import row_line

ROOT = Path(validation.__file__).parent
BOUNDED = (
    "air_coils",
    "coupled_coils",
    "nonlinear_pot",
    "round_post_fringing",
    "finite_post",
    "pot_core_26_16",
)
LINE_BY_LINE: dict[str, Callable[[dict[str, str]], Iterable[Row]]] = {
    "core_loss": core_loss.rows_of,
    "nonlinear_pot": nonlinear_pot.rows_of,
    "round_leg_3d": round_leg_3d.rows_of,
    "round_post_fringing": round_post_fringing.rows_of,
    "sphere": sphere.rows_of,
}
"""Their problems are solved one at a time, to keep each test short."""
LONG = {("core_loss", number) for number in (0, 2, 3)} | {("sphere", 2)}
LONG |= {
    ("round_leg_3d", number)
    for number, line in enumerate(table_of("round_leg_3d"))
    if line["outline"] in ("RM-like", "ETD-like") and line["gap_mm"] != "0.5"
}
WHOLE = tuple(folder for folder in FOLDERS if folder not in LINE_BY_LINE)


@cache
def rows_of(folder: str) -> tuple[Row, ...]:
    return folder_rows(folder)


def check(rows: Sequence[Row], folder: str) -> None:
    assert rows
    for row in rows:
        assert row.passed, row
        assert len(row_line(row)) <= 80, row
    if folder in BOUNDED:
        assert any(row.contained for row in rows)


@pytest.mark.parametrize("folder", WHOLE)
def test_every_row_passes(folder: str) -> None:
    check(rows_of(folder), folder)


@pytest.mark.parametrize(
    ("folder", "number"),
    [
        pytest.param(folder, number, marks=[pytest.mark.slow] if (folder, number) in LONG else [])
        for folder in LINE_BY_LINE
        for number in range(len(table_of(folder)))
    ],
)
def test_every_row_of_a_line_passes(folder: str, number: int) -> None:
    check(tuple(LINE_BY_LINE[folder](table_of(folder)[number])), folder)


def test_every_row_of_the_saturating_core_with_straight_legs_passes() -> None:
    check(tuple(round_leg_3d.saturating_rows()), "round_leg_3d")


@pytest.mark.parametrize(
    ("folder", "case"),
    [("air_coils", "10-20 x 10 mm"), ("pot_core_26_16", "tolerance 0.0001")],
)
def test_a_moved_reference_fails(folder: str, case: str) -> None:
    row = next(row for row in rows_of(folder) if row.case == case)
    assert row.passed
    for factor in (0.999, 1.001):
        moved = Digits(row.reference * factor, 1e-12)
        assert row.lower is not None
        assert row.upper is not None
        bounds = Bounds(row.lower, row.upper, row.unit)
        again = bounded_row(row.case, row.quantity, moved, bounds, row.allowed, row.source)
        assert again.contained is False
        assert not again.passed
        assert not replace(row, reference=moved.value).passed


@pytest.mark.parametrize(
    ("text", "value", "rounding"),
    [
        ("1.056824170", 1.05682417, 0.5e-9 / 1.05682417),
        ("2.5e-8", 2.5e-8, 0.02),
        ("39", 39.0, 0.5 / 39),
    ],
)
def test_printed_digits_carry_their_rounding(text: str, value: float, rounding: float) -> None:
    digits = printed(text)
    assert digits.value == value
    assert digits.rounding == pytest.approx(rounding, rel=1e-12)


@pytest.mark.parametrize(
    ("lower", "upper", "contained"),
    [(0.9, 1.1, True), (1.0 + 9e-7, 1.1, True), (0.9, 1.0 - 9e-7, True),
     (1.0 + 1.1e-6, 1.1, False), (0.9, 1.0 - 1.1e-6, False)],
)  # fmt: skip
def test_bounds_may_miss_the_reference_by_its_rounding_only(
    lower: float, upper: float, contained: bool
) -> None:
    row = bounded_row("c", "q", Digits(1.0, 1e-6), Bounds(lower, upper, "H"), 1.0, "s")
    assert row.contained is contained
    assert row.passed is contained


def test_a_midpoint_farther_than_allowed_fails_even_when_the_bounds_hold_the_reference() -> None:
    row = bounded_row("c", "q", Digits(1.0, 0.0), Bounds(0.5, 1.7, "H"), 0.05, "s")
    assert row.contained
    assert not row.passed


def test_the_table_returns_1_when_a_row_fails(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    good = plain_row("good", "L", Digits(1.0, 0.0), 1.0, "H", 1e-3, "s")
    bad = plain_row("bad", "L", Digits(1.0, 0.0), 1.002, "H", 1e-3, "s")
    monkeypatch.setattr("validation.__main__.FOLDERS", ("somewhere",))
    for rows, code in (((good,), 0), ((good, bad), 1)):
        monkeypatch.setattr("validation.__main__.folder_rows", lambda _, rows=rows: rows)
        assert main() == code
    printed_text = capsys.readouterr().out
    assert "FAIL" in printed_text
    assert "2 rows, 1 failed\n  bad, L" in printed_text
    assert max(len(line) for line in printed_text.splitlines()) <= 80


@pytest.mark.parametrize("folder", FOLDERS)
def test_every_folder_says_where_its_numbers_come_from(folder: str) -> None:
    text = (ROOT / folder / "README.md").read_text(encoding="utf-8")
    source = text.partition("## Source")[2].partition("##")[0].lower()
    for heading in ("## Source", "## Uncertainty", "## Result", "## Run"):
        assert heading in text
    marks = ("computed", "closed form", "published", "from memory")
    assert any(mark in source for mark in marks)
    assert (ROOT / folder / "reference.csv").is_file()


def test_no_folder_is_left_out_of_the_table() -> None:
    folders = {path.parent.name for path in ROOT.glob("*/run.py")}
    assert folders == set(FOLDERS)
