"""Copper loss where the user meets it: printed, in result files, as a figure."""

from dataclasses import replace
from io import StringIO
from pathlib import Path

import pytest
from rich.console import Console

import femag as fm
from femag.answer import WIDTH, print_answer
from femag.cli import main
from femag.design_file import design_toml


@pytest.fixture(scope="module")
def design() -> fm.Design:
    former = fm.Former(wall=0.6e-3, flange=0.6e-3)
    return fm.Design(
        core=fm.catalogue_core("P 26/16").core(),
        gaps=(fm.Gap(0.5e-3),),
        windings=(
            fm.Winding(30, conductor=fm.RoundWire(0.5e-3, 0.03e-3), former=former),
            fm.Winding(4, fm.Block(9e-3, 9.5e-3, -1e-3, 1e-3), "sense"),
        ),
        material=fm.LinearCurve(2000.0),
        current=2.0,
        ripple=fm.Ripple(1.0, 1e5),
    )


@pytest.fixture(scope="module")
def result(design: fm.Design) -> fm.Result:
    return fm.solve(design)


def printed(result: fm.Result) -> str:
    text = StringIO()
    print_answer(result, Console(file=text, width=WIDTH))
    return text.getvalue()


def test_answer_has_layers_total_and_what_is_left_out(result: fm.Result) -> None:
    text = printed(result)
    assert max(map(len, text.splitlines())) <= WIDTH
    rows = {line[:16].strip(): line.split()[-1] for line in text.partition("loss of")[2].split("\n")
            if line.strip()}  # fmt: skip
    assert {"layer 1", "layer 2", "winding main", "winding sense"} <= set(rows)
    loss = result.copper_loss[0]
    assert f"{1e3 * (loss.total or 0):.1f} mW" in text
    assert "no conductor: the squared field only" in " ".join(text.split())
    (main_row,) = (line for line in text.splitlines() if line.startswith("winding main"))
    assert f"{1e3 * (loss.crossing or 0):.1f} mW" in main_row


def test_losses_are_in_the_budget_where_all_are_known(result: fm.Result, design: fm.Design) -> None:
    assert result.loss_budget is not None
    assert result.loss_budget.copper_ripple is None  # of the winding without conductor
    known = replace(result, copper_loss=result.copper_loss[:1])
    loss = known.copper_loss[0]
    assert known.loss_budget is not None
    assert known.loss_budget.copper_ripple == pytest.approx(
        (loss.ripple or 0.0) + (loss.crossing or 0.0)
    )
    assert known.loss_budget.copper_dc == pytest.approx(loss.dc)


def test_result_file_gives_the_losses_back(result: fm.Result, tmp_path: Path) -> None:
    fm.write_result(result, tmp_path / "r.json")
    assert fm.read_result(tmp_path / "r.json").copper_loss == result.copper_loss


def test_solve_writes_the_figures_of_losses_that_are_known(
    design: fm.Design, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file, folder = tmp_path / "design.toml", tmp_path / "out"
    lossy = fm.Steinmetz(1.5, 1.45, 2.6, (25e3, 300e3), (0.03, 0.3))
    text = design_toml(replace(design, material=fm.LinearCurve(2000.0, lossy), tolerance=1e-2))
    file.write_text(text, encoding="utf-8")
    assert main(["solve", str(file), "--out", str(folder)]) == 0
    assert "gap.png, copper.png, core-loss.png\n" in capsys.readouterr().out
    for name in ("copper.png", "core-loss.png"):
        assert (folder / name).stat().st_size > 10_000
