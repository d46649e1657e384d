import json
import re
from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag import cli
from femag.design_file import design_from_toml
from femag.target_gap import TargetGap, gap_for, with_gap


@pytest.fixture(scope="module")
def of_650_uh(pot_26_16: fm.Design) -> TargetGap:
    return gap_for(pot_26_16, 650e-6)


@pytest.mark.parametrize("target", [180e-6, 650e-6, 3e-3])
@pytest.mark.parametrize("saturation", [None, pytest.param(0.45, marks=pytest.mark.slow)])
def test_the_gap_solved_again_gives_the_target(
    pot_26_16: fm.Design, target: float, saturation: float | None
) -> None:
    material = fm.FroehlichCurve(2000, saturation, 2) if saturation else fm.LinearCurve(2000)
    design = replace(pot_26_16, material=material, current=0.5)
    found = gap_for(design, target)
    assert found.solutions <= 6
    again = fm.solve(design_from_toml(fm.design_toml(found.design)), tolerance=2e-4)
    assert again.inductance.value == pytest.approx(target, rel=design.tolerance)
    assert found.inductance.lower <= again.inductance.upper
    assert found.inductance.upper >= again.inductance.lower


@pytest.mark.parametrize(
    "gap",
    [fm.Gap(0.3e-3, "all"), fm.Gap(1e-3, pieces=3), fm.Gap(0.4e-3, permeability=3.0)],
    ids=["spacer", "pieces", "filled"],
)
def test_the_kind_of_gap_is_kept(pot_26_16: fm.Design, gap: fm.Gap) -> None:
    found = gap_for(replace(pot_26_16, gaps=gap), 500e-6)
    assert replace(found.design.gaps[0], length=gap.length) == gap
    assert found.inductance.value == pytest.approx(500e-6, rel=1e-3)


def test_an_ungapped_design_gets_a_gap_in_the_post(pot_26_16: fm.Design) -> None:
    found = gap_for(replace(pot_26_16, gaps=()), 650.1885e-6)
    assert found.gap == pytest.approx(0.5e-3, rel=1e-3)  # validation/pot_core_26_16


def test_the_slope_is_that_of_neighbouring_gaps(pot_26_16: fm.Design, of_650_uh: TargetGap) -> None:
    found = of_650_uh
    low, high = (
        fm.solve(with_gap(pot_26_16, found.gap * share), tolerance=1e-4).inductance.value
        for share in (0.99, 1.01)
    )
    assert found.slope == pytest.approx((high - low) / (0.02 * found.gap), rel=1e-2)


def test_every_hand_gap_gives_the_target_by_its_formula(
    pot_26_16: fm.Design, of_650_uh: TargetGap
) -> None:
    for entry in of_650_uh.hand:
        assert entry.gap is not None
        result = fm.solve(with_gap(pot_26_16, entry.gap), tolerance=1e-2)
        (row,) = [row for row in result.hand if row.estimate.name == entry.name]
        assert row.estimate.inductance == pytest.approx(650e-6, rel=3e-3)


@pytest.mark.parametrize(
    ("target", "line"),
    [
        (50e-3, "more than this core gives; accepted: less than"),
        (1e-6, "less than this core gives with the longest gap"),
        (-1.0, "not usable; accepted: an inductance above 0"),
        (float("nan"), "not usable"),
    ],
)
def test_targets_out_of_reach_are_explained(pot_26_16: fm.Design, target: float, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        gap_for(pot_26_16, target)
    assert str(caught.value).startswith("inductance = ")
    assert line in str(caught.value)


def test_saturation_limits_what_can_be_reached(pot_26_16: fm.Design) -> None:
    """At 10 A the ungapped core is far into saturation; without current it gives 25 mH."""
    design = replace(pot_26_16, material=fm.FroehlichCurve(2000, 0.45, 2), current=10.0)
    with pytest.raises(fm.InputError, match="at 10 A, without gap"):
        gap_for(design, 5e-3)


def test_the_command_writes_a_design_that_meets_the_target(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "design.toml"
    file.write_text("# board 7\n" + fm.design_toml(pot_26_16))
    out, answer = tmp_path / "gapped.toml", tmp_path / "gap.json"
    arguments = ["gap", str(file), "--inductance", "250 uH", "--at", "3 A"]
    assert cli.main([*arguments, "--json", str(answer), "--write", str(out)]) == 0
    printed = capsys.readouterr().out
    assert all(len(line) <= 80 for line in printed.splitlines() if str(tmp_path) not in line)
    document = json.loads(answer.read_text())
    assert document["solutions"] <= 6
    assert document["inductance"]["lower"] < document["inductance"]["value"]
    assert {entry["name"] for entry in document["hand"]} >= {"no fringing", "round edge"}
    result = fm.solve(fm.read_design(out))
    assert result.current == 3.0
    assert result.design.gaps[0].length == document["gap"] == round(document["gap"], 7)
    (shown,) = re.findall(r"^ *gap +([\d.]+ mm) +for", printed, re.MULTILINE)
    kept = file.read_text().replace('length = "0.5 mm"', f'length = "{shown}"')
    assert out.read_text() == kept.replace('current = "1 A"', 'current = "3 A"')
    assert result.inductance.value == pytest.approx(250e-6, rel=2e-3)


@pytest.mark.parametrize(
    ("options", "line"),
    [
        (["--inductance", "250"], "--inductance = '250': "),
        (["--inductance", "250 uH", "--at", "3"], "--at = '3': "),
        (["--inductance", "9 H"], "--inductance = '9 H': more than this core gives"),
        (
            ["--inductance", "1 mH", "--write", "nowhere/found.toml"],
            "--write = 'nowhere/found.toml'",
        ),
        (["--inductance", "1 mH", "--json", "{design}"], "--json = "),
    ],
)
def test_bad_options_get_one_line(
    tmp_path: Path,
    pot_26_16: fm.Design,
    capsys: pytest.CaptureFixture[str],
    options: list[str],
    line: str,
) -> None:
    file = tmp_path / "design.toml"
    file.write_text(fm.design_toml(pot_26_16))
    assert cli.main(["gap", str(file), *(o.format(design=file) for o in options)]) == 2
    error = capsys.readouterr().err
    assert error.startswith("gapfield: ")
    assert line in error
    assert error.count("\n") == 1
