"""The fewest whole turns within a flux density, with the gap that goes with them."""

import json
from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag import cli
from femag.design_file import design_from_toml
from femag.target_turns import TargetTurns, turns_for, with_turns

SATURATING = fm.FroehlichCurve(2000, 0.45, 2)


@pytest.fixture(scope="module")
def within_300_mt(pot_26_16: fm.Design) -> TargetTurns:
    return turns_for(pot_26_16, 250e-6, 0.3, 3.0)


@pytest.mark.parametrize(
    "material", [fm.LinearCurve(2000), pytest.param(SATURATING, marks=pytest.mark.slow)]
)
@pytest.mark.parametrize("limit", [0.3, pytest.param(0.12, marks=pytest.mark.slow)])
def test_the_design_solved_again_keeps_both(
    pot_26_16: fm.Design, material: object, limit: float
) -> None:
    design = replace(pot_26_16, material=material)
    found = turns_for(design, 250e-6, limit, 3.0)
    again = fm.solve(design_from_toml(fm.design_toml(found.found.design)), tolerance=2e-4)
    assert again.design.turns == found.turns
    assert again.current == 3.0
    assert again.inductance.value == pytest.approx(250e-6, rel=1e-3)
    greatest = max(mean.flux_density for mean in again.section_means)
    assert greatest <= limit * (1 + 5e-4)
    assert greatest == pytest.approx(found.found.flux_density, rel=5e-4)


def test_one_turn_fewer_exceeds_the_limit(within_300_mt: TargetTurns) -> None:
    """And was solved: each number of turns costs few solutions, the later ones fewer."""
    found = within_300_mt
    trials = {trial.turns: trial for trial in found.trials}
    fewer = trials[found.turns - 1]
    assert fewer.flux_density is not None
    assert fewer.flux_density > 0.3
    assert len(found.trials) <= 4
    assert max(trial.solutions for trial in found.trials) <= 6
    assert max(trial.solutions for trial in found.trials[1:]) <= 2
    assert found.solutions == sum(trial.solutions for trial in found.trials)


def test_flux_density_falls_with_the_inverse_of_the_turns(
    pot_26_16: fm.Design, within_300_mt: TargetTurns
) -> None:
    """At one inductance and current the linkage is one; what leaks past the gap hardly changes."""
    found = [within_300_mt, turns_for(pot_26_16, 250e-6, 0.15, 3.0)]
    products = [one.turns * one.found.flux_density for one in found]
    assert products[1] == pytest.approx(products[0], rel=2e-2)
    assert found[1].turns > 1.9 * found[0].turns


def test_turns_that_do_not_reach_the_inductance_are_passed_over(pot_26_16: fm.Design) -> None:
    """A core of low permeability: the turns that the flux density asks for give too little."""
    design = replace(pot_26_16, material=fm.LinearCurve(20))
    found = turns_for(design, 250e-6, 5.0, 0.1)
    assert found.trials[0].flux_density is None
    fewer = next(trial for trial in found.trials if trial.turns == found.turns - 1)
    assert fewer.flux_density is None
    assert found.found.inductance.value == pytest.approx(250e-6, rel=1e-3)


def wound(pot_26_16: fm.Design) -> fm.Design:
    wire = fm.RoundWire(0.8e-3, 0.03e-3)
    winding = fm.Winding(20, conductor=wire, former=fm.Former(wall=0.6e-3, flange=0.6e-3))
    return replace(pot_26_16, windings=(winding,))


@pytest.mark.parametrize(
    ("limit", "line"),
    [
        (0.05, "turns are needed and do not fit"),
        (0.0, "not usable; accepted: a flux density above 0"),
        (float("nan"), "not usable"),
    ],
)
def test_what_cannot_be_is_explained(pot_26_16: fm.Design, limit: float, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        turns_for(wound(pot_26_16), 250e-6, limit, 3.0)
    assert str(caught.value).startswith("flux_density = ")
    assert line in str(caught.value)


def test_no_gap_is_long_enough_for_a_low_flux_density(pot_26_16: fm.Design) -> None:
    with pytest.raises(fm.InputError, match=r"no number of turns keeps it: .* longest gap"):
        turns_for(pot_26_16, 250e-6, 0.02, 3.0)


def test_two_driven_windings_cannot_be_told_apart(pot_26_16: fm.Design) -> None:
    windings = (
        fm.Winding(20, fm.Block(6.4e-3, 8e-3, -4.8e-3, 4.8e-3), "inner"),
        fm.Winding(30, fm.Block(8e-3, 1e-2, -4.8e-3, 4.8e-3), "outer"),
    )
    design = replace(pot_26_16, windings=windings, driven=("inner", "outer"))
    with pytest.raises(fm.InputError, match="several windings are driven"):
        with_turns(design, 40)


def test_the_command_finds_turns_and_gap(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file, out, answer = (tmp_path / name for name in ("a.toml", "b.toml", "b.json"))
    file.write_text(fm.design_toml(replace(pot_26_16, tolerance=4e-3)))
    arguments = ["gap", str(file), "--inductance", "250 uH", "--at", "3 A"]
    files = ["--json", str(answer), "--write", str(out)]
    assert cli.main([*arguments, "--flux-density", "0.2 T", *files]) == 0
    document = json.loads(answer.read_text())
    printed = capsys.readouterr().out
    assert f"{document['turns']} turns are the fewest within 0.2 T" in printed
    assert all(len(line) <= 80 for line in printed.splitlines() if str(tmp_path) not in line)
    assert document["flux_density"] <= document["flux_density_limit"] == 0.2
    assert sum(trial["solutions"] for trial in document["trials"]) == document["solutions"]
    assert fm.read_design(out).turns == document["turns"]
    assert cli.main([*arguments, "--turns", "60", "--json", "-"]) == 0
    other = json.loads(capsys.readouterr().out)
    assert other["turns"] == 60
    assert other["gap"] > 0.0
    assert (other["trials"], other["flux_density_limit"]) == ([], None)
    assert cli.main([*arguments, "--turns", "60", "--flux-density", "0.2 T"]) == 2
    assert "--flux-density = '0.2 T': stands beside --turns" in capsys.readouterr().err
