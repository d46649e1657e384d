import json
from dataclasses import replace
from importlib.resources import files
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag import cli
from femag.design import design_hash
from femag.design_file import design_from_toml
from femag.quantities import copper_clearance
from femag.requirement_checks import all_kept, checked_requirements
from femag.requirements import KINDS, Requirements
from femag.tolerance_budget import Contribution, ToleranceBudget

DEMO = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")
ALL = """
[require]
inductance_least = "380 uH"
inductance_most = "420 uH"
incremental_inductance = "300 uH"
flux_density = "0.4 T"
core_flux_density = "0.41 T"
loss = "3 W"
force = "90 N"
copper_clearance = "1 mm"
temperature = "60 C"
fit = true
"""
COARSE = DEMO.replace("tolerance = 1e-3", "tolerance = 1e-2")


@pytest.fixture(scope="module")
def result() -> fm.Result:
    return fm.solve(design_from_toml(COARSE))


def checked(result: fm.Result, **limits: float | bool) -> list[tuple[str, float | None]]:
    design = replace(result.design, requirements=Requirements(**limits))
    checks = checked_requirements(replace(result, design=design))
    return [(check.verdict, check.margin) for check in checks]


def test_requirements_are_read_and_written_and_leave_the_hash_alone() -> None:
    design = design_from_toml(DEMO + ALL)
    assert {limit.key for limit in design.requirements.limits()} == set(KINDS)
    assert design.requirements.force == 90.0
    assert design_from_toml(fm.design_toml(design)) == design
    assert design_hash(design) == design_hash(design_from_toml(DEMO))
    assert not design_from_toml(DEMO).requirements


@pytest.mark.parametrize(
    ("line", "text"),
    [
        ('inductance_least = "3 mm"', "inductance_least = '3 mm': 'mm' is not a unit of this"),
        ("inductance_least = 3", "inductance_least = 3: the unit is missing"),
        ('inductance_leest = "3 mH"', "nearest known key: 'inductance_least'"),
        ('loss = "-2 W"', "loss = '-2 W': out of range; accepted: a power"),
        ('temperature = "-300 C"', "accepted: a temperature in degrees Celsius"),
        ('fit = "yes"', "fit = 'yes': not usable; accepted: true or false"),
        (
            'inductance_least = "3 H"\ninductance_most = "2 H"',
            "inductance_most = '2 H': no inductance is left between the limits",
        ),
    ],
)
def test_bad_requirements_get_one_line(line: str, text: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(f"{DEMO}\n[require]\n{line}\n", "d.toml")
    assert str(caught.value).startswith("d.toml: require.")
    assert text in str(caught.value)


def test_an_inductance_is_judged_by_its_worse_bound(result: fm.Result) -> None:
    lower, upper = result.inductance.lower, result.inductance.upper
    ((verdict, margin),) = checked(result, inductance_least=0.95 * lower)
    assert (verdict, margin) == ("kept", pytest.approx(1 / 0.95 - 1.0))
    ((verdict, margin),) = checked(result, inductance_most=1.05 * upper)
    assert (verdict, margin) == ("kept", pytest.approx(1.0 - 1 / 1.05))
    assert checked(result, inductance_least=1.01 * upper)[0][0] == "missed"
    assert checked(result, inductance_most=0.99 * lower)[0][0] == "missed"


def test_a_limit_between_the_bounds_is_not_shown_and_not_kept(result: fm.Result) -> None:
    middle = result.inductance.value
    for key in ("inductance_least", "inductance_most"):
        design = replace(result.design, requirements=Requirements(**{key: middle}))
        checks = checked_requirements(replace(result, design=design))
        assert [check.verdict for check in checks] == ["not shown"]
        assert not all_kept(checks)
    assert all_kept(())


def test_flux_densities_are_the_largest_means(result: fm.Result) -> None:
    means = {mean.name: mean.flux_density for mean in result.section_means}
    post = max(value for name, value in means.items() if name.startswith("post"))
    everywhere = max(means.values())
    for key, value in (("flux_density", post), ("core_flux_density", everywhere)):
        assert checked(result, **{key: 2.0 * value}) == [("kept", pytest.approx(0.5))]
        assert checked(result, **{key: 0.9 * value})[0][0] == "missed"


def test_what_has_no_value_is_not_shown_with_its_reason(result: fm.Result) -> None:
    design = replace(result.design, requirements=Requirements(temperature=60.0, fit=True))
    checks = checked_requirements(replace(result, design=design))
    assert [check.verdict for check in checks] == ["not shown"] * 2
    assert [check.known.basis for check in checks] == [
        "no winding has a conductor",
        "winding main has no conductor",
    ]


def test_a_force_is_judged_by_the_largest_of_its_estimates(result: fm.Result) -> None:
    pull = result.force.halves
    largest = max(*pull.stress_of_sides, *pull.work_of_sides)
    assert checked(result, force=2.0 * largest) == [("kept", pytest.approx(0.5))]
    assert checked(result, force=0.5 * pull.force)[0][0] == "missed"


def test_part_tolerances_can_miss_what_nominal_parts_keep(result: fm.Result) -> None:
    budget = ToleranceBudget(result.inductance.value, (Contribution("gap", 1e-5, -8e-6),))
    off = replace(result, tolerance_budget=budget)
    limit = result.inductance.lower - 5e-6
    design = replace(result.design, requirements=Requirements(inductance_least=limit))
    (check,) = checked_requirements(replace(off, design=design))
    assert (check.verdict, check.is_missed_by_tolerance) == ("missed", True)
    assert check.margin == pytest.approx(-3e-6 / limit)
    assert checked(off, inductance_least=limit - 5e-6)[0][0] == "kept"
    assert checked(off, inductance_most=result.inductance.upper + 9e-6)[0][0] == "kept"
    assert checked(off, inductance_most=result.inductance.upper + 7e-6)[0][0] == "missed"
    (check,) = checked_requirements(
        replace(off, design=replace(design, requirements=Requirements(inductance_least=1.0)))
    )
    assert (check.verdict, check.is_missed_by_tolerance) == ("missed", False)


def test_losses_need_a_ripple_and_have_all_their_parts(pot_26_16: fm.Design) -> None:
    winding = fm.Winding(50, conductor=fm.RoundWire(0.3e-3, 0.03e-3), temperature=80.0)
    design = replace(
        pot_26_16, windings=(winding,), material=fm.material("mnzn-power-100C"),
        ripple=fm.Ripple(0.2, 100e3),
    )  # fmt: skip
    solved = fm.solve(design, tolerance=2e-2)
    assert solved.loss_budget is not None
    total = solved.loss_budget.total
    assert checked(solved, loss=2.0 * total) == [("kept", pytest.approx(0.5))]
    assert checked(solved, loss=0.9 * total)[0][0] == "missed"
    without = replace(solved, core_loss=None)
    assert checked(without, loss=2.0 * total) == [("not shown", None)]


def test_wound_conductors_fit_at_their_temperature(pot_26_16: fm.Design) -> None:
    winding = fm.Winding(50, conductor=fm.RoundWire(0.5e-3, 0.03e-3), temperature=80.0)
    design = replace(pot_26_16, windings=(winding,))
    result = fm.solve(design, tolerance=2e-2)
    assert checked(result, temperature=60.0, fit=True) == [("kept", 20.0), ("kept", None)]
    assert checked(result, temperature=100.0) == [("missed", -20.0)]


def test_clearance_is_the_distance_of_metal_from_the_opening(pot_26_16: fm.Design) -> None:
    found = copper_clearance(pot_26_16)
    assert found is not None
    assert (found.distance, found.gap) == (pytest.approx(0.65e-3), pytest.approx(0.5e-3))
    wire = fm.RoundWire(0.5e-3, 0.03e-3)
    former = fm.Former(wall=0.6e-3, flange=0.6e-3)
    wound = replace(pot_26_16, windings=(fm.Winding(16, conductor=wire, former=former),))
    found = copper_clearance(wound)
    assert found is not None
    centre, half_pitch = 0.6e-3 + 0.28e-3, 0.28e-3  # no turn of 16 lies at z = 0
    expected = np.hypot(centre, max(half_pitch - 0.25e-3, 0.0)) - 0.25e-3
    assert found.distance == pytest.approx(expected)
    pm = fm.catalogue_core("PM 114/93").core()
    wire = fm.LitzWire(600, 0.1e-3)
    touching = fm.Design(
        core=pm, gaps=fm.Gap(3e-3, "all"), windings=fm.Winding(30, conductor=wire),
        material=fm.LinearCurve(2000.0),
    )  # fmt: skip
    found = copper_clearance(touching)
    assert found is not None
    assert found.distance == 0.0
    assert copper_clearance(replace(pot_26_16, gaps=())) is None


def test_clearance_counts_from_the_legs_too_with_a_spacer(pot_26_16: fm.Design) -> None:
    block = fm.Block(8e-3, 10.3e-3, -4.8e-3, 4.8e-3)
    design = replace(pot_26_16, windings=(fm.Winding(50, block),), gaps=fm.Gap(0.2e-3, "all"))
    found = copper_clearance(design)
    assert found is not None
    assert found.distance == pytest.approx(0.3e-3)


@pytest.mark.parametrize(
    ("limit", "code", "word"), [("380 uH", 0, "kept"), ("500 uH", 1, "missed")]
)
def test_solve_prints_the_table_and_leaves_with_1_on_a_miss(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], limit: str, code: int, word: str
) -> None:
    file = tmp_path / "d.toml"
    file.write_text(f'{COARSE}\n[require]\ninductance_least = "{limit}"\n')
    assert cli.main(["solve", str(file), "--json", str(tmp_path / "r.json")]) == code
    out = capsys.readouterr().out
    (line,) = [line for line in out.splitlines() if f"at least {limit}" in line]
    assert line.split()[-1] == word
    (entry,) = json.loads((tmp_path / "r.json").read_text())["requirements"]
    assert (entry["key"], entry["verdict"]) == ("inductance_least", word)
    assert entry["lower"] < entry["value"] < entry["upper"]
    assert fm.read_result(tmp_path / "r.json").design.requirements.inductance_least
