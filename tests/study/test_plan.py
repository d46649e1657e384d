import json
from dataclasses import replace
from itertools import product
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design_file import design_from_document, with_key
from femag.study import Plan
from femag.study.plan import Factor

BASE = """
[core]
size = "P 26/16"
material = { permeability = 2000 }
[[gap]]
length = "0.5 mm"
[[winding]]
turns = 50
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "base.toml").write_text(BASE)
    return tmp_path


def study_of(folder: Path, text: str) -> fm.Study:
    file = folder / "study.toml"
    file.write_text('base = "base.toml"\n' + text)
    return fm.read_study(file)


def test_cases_are_all_combinations_with_the_last_axis_fastest(pot_26_16: fm.Design) -> None:
    gaps, currents = (0.1e-3, 0.2e-3, 0.4e-3), (1.0, 2.0)
    study = fm.Study(pot_26_16, {"gap.length": gaps, "drive.current": currents})
    designs = [design_from_document(case.document) for case in study.plan.cases()]
    assert [(d.gaps[0].length, d.current) for d in designs] == list(product(gaps, currents))
    assert [study.plan.case(number) for number in range(6)] == list(study.plan.cases())


def test_a_case_is_the_design_that_the_file_would_give(folder: Path) -> None:
    study = study_of(
        folder,
        """[axes]
        "core.size" = ["P 22/13", "RM 8"]
        "core.limit" = ["minimum"]
        "core.material" = ["mnzn-power"]
        "core.material.temperature" = ["60 C"]
        "gap.length" = ["12 mil"]
        "winding.former.wall" = ["0.5 mm"]
        "winding.conductor.round" = ["0.3 mm"]
        "winding.1.turns" = [3]
        "winding.1.name" = ["second"]
        "winding.1.conductor.round" = ["0.3 mm"]
        "solve.tolerance" = [0.01]
        """,
    )
    written = BASE.replace('"P 26/16"', '"RM 8"\nlimit = "minimum"').replace(
        "{ permeability = 2000 }", '{ name = "mnzn-power", temperature = "60 C" }'
    ).replace("0.5 mm", "12 mil") + """
        conductor = { round = "0.3 mm" }
        former = { wall = "0.5 mm" }
        [[winding]]
        name = "second"
        turns = 3
        conductor = { round = "0.3 mm" }
        [solve]
        tolerance = 0.01
        """  # fmt: skip
    file = folder / "written.toml"
    file.write_text(written)
    assert design_from_document(study.plan.case(1).document) == fm.read_design(file)


def test_setting_a_key_leaves_the_document_alone() -> None:
    document = {"gap": [{"length": "1 mm"}], "drive": {"current": "1 A"}}
    before = json.dumps(document)
    changed = with_key(with_key(document, "gap.length", "2 mm"), "drive.current", "3 A")
    assert json.dumps(document) == before
    assert changed == {"gap": [{"length": "2 mm"}], "drive": {"current": "3 A"}}


def test_keys_change_together_and_cases_are_listed(folder: Path) -> None:
    study = study_of(
        folder,
        """[axes]
        "drive.current" = "1 A:3 A:3"
        [[together]]
        "core.size" = ["P 22/13", "P 30/19"]
        "winding.turns" = [20, 30]
        [[case]]
        "gap.length" = "0.1 mm"
        "gap.leg" = "post"
        [[case]]
        "gap.length" = "0.3 mm"
        "gap.leg" = "all"
        """,
    )
    assert len(study) == 3 * 2 * 2
    last = study.plan.case(11).settings
    assert last == {
        "drive.current": "3 A", "core.size": "P 30/19", "winding.turns": 30,
        "gap.length": "0.3 mm", "gap.leg": "all",
    }  # fmt: skip


@pytest.mark.parametrize("method", ["sobol", "latin hypercube"])
def test_samples_fill_the_box_evenly_and_repeat_with_their_seed(
    pot_26_16: fm.Design, method: str
) -> None:
    ranges = {
        "gap.length": (0.1e-3, 2e-3, "log"),
        "winding.turns": (1, 32),
        "drive.current": ("1 A", "3 A"),
    }

    def points(seed: int) -> np.ndarray:
        sample = fm.Sample(ranges, 64, method, seed)
        designs = [
            design_from_document(case.document)
            for case in fm.Study(pot_26_16, sample=sample).plan.cases()
        ]
        return np.array([(d.gaps[0].length, d.turns, d.current) for d in designs])

    found = points(1)
    shares = np.column_stack([
        np.log(found[:, 0] / 0.1e-3) / np.log(20.0), (found[:, 1] - 0.5) / 32, found[:, 2] / 2 - 0.5
    ])  # fmt: skip
    assert np.all((shares >= 0.0) & (shares <= 1.0))
    for column in (0, 2):  # one point in each of 64 (Latin) or of 32 (Sobol) equal layers
        layers = 64 if method != "sobol" else 32
        counts = np.bincount((shares[:, column] * layers).astype(int).clip(max=layers - 1))
        assert counts.tolist() == [64 // layers] * layers
    assert np.bincount(found[:, 1].astype(int), minlength=33)[1:].tolist() == [2] * 32
    assert np.array_equal(found, points(1))
    assert not np.array_equal(found, points(2))


def test_a_case_is_known_by_design_files_and_versions(folder: Path) -> None:
    (folder / "m.csv").write_text("H [A/m],B [T]\n25,0.09\n100,0.28\n500,0.43\n")
    text = """[axes]\n"core.material" = ["m.csv", "mnzn-power-25C"]\n"gap.length" = ["1 mm"]\n"""
    here = {"gapfield": "1"}

    def keys(versions: dict[str, str]) -> list[str]:
        plan = study_of(folder, text).plan
        return [plan.key(case, versions) for case in plan.cases()]

    first, identity = keys(here), study_of(folder, text).plan.identity
    assert keys(here) == first
    assert len(set(first)) == 2
    assert not set(keys({"gapfield": "2"})) & set(first)
    (folder / "m.csv").write_text("H [A/m],B [T]\n25,0.09\n100,0.28\n500,0.44\n")
    assert [a == b for a, b in zip(keys(here), first, strict=True)] == [False, True]
    assert study_of(folder, text).plan.identity != identity


def test_a_waveform_that_changes_makes_other_cases(folder: Path) -> None:
    period = "t [us];I [mA]\n2;500\n6;1500\n12;500\n"
    (folder / "p.csv").write_text(period)
    text = """[axes]\n"drive.waveform" = ["p.csv"]\n"""

    def key() -> str:
        plan = study_of(folder, text).plan
        return plan.key(plan.case(0), {"gapfield": "1"})

    first, identity = key(), study_of(folder, text).plan.identity
    (folder / "p.csv").write_text(period.replace("1500", "1600"))
    assert key() != first
    assert study_of(folder, text).plan.identity != identity


@pytest.mark.parametrize(
    ("text", "problem"),
    [
        (
            '[axes]\n"gap.lenght" = ["1 mm"]',
            "gap.lenght: unknown key; accepted: nearest known key: 'gap.length'",
        ),
        ('[axes]\n"gap.length" = []', "gap.length: empty"),
        (
            '[axes]\n"gap.length" = ["1 mm", "2 A"]',
            "gap.length = '2 A': 'A' is not a unit of this quantity",
        ),
        ('[axes]\n"gap.length" = [0.5]', "gap.length = 0.5: the unit is missing"),
        ('[axes]\n"gap.length" = ["1 mm", "1 mm"]', "stands there twice"),
        (
            '[axes]\n"gap.length" = ["20 mm", "30 mm"]',
            "none of the 2 cases is a design; the first: ",
        ),
        (
            '[axes]\n"winding.turns" = [10, 2.5]',
            "winding.turns = 2.5: not usable; accepted: a whole number",
        ),
        ('[axes]\n"gap.2.length" = ["1 mm"]', "gap.2.length: the base has 1 entries of this list"),
        ('[axes]\n"gap.length" = "1 mm:2 mm"', "not a row of steps"),
        ('[axes]\n"gap.length" = "1 mm:2 mm:0"', "0 steps"),
        ('[axes]\n"gap.length" = "0 mm:2 mm:5:log"', "not a range"),
        ("", "nothing is varied"),
        (
            'axis = 1\n[axes]\n"gap.length" = ["1 mm"]',
            "axis: unknown key; accepted: nearest known key: 'axes'",
        ),
        ('keep = ["inductanse"]\n[axes]\n"gap.length" = ["1 mm"]', "nearest known: 'inductance'"),
        (
            '[axes]\n"gap.length" = ["1 mm"]\n[[case]]\n"gap.length" = "2 mm"',
            "gap.length: is set already",
        ),
        (
            '[axes]\n"core.material.temperature" = ["60 C"]\n"core.material" = ["mnzn-power"]',
            "core.material: is set already",
        ),
        (
            '[[case]]\n"gap.length" = "2 mm"\n[[case]]\n"winding.turns" = 2',
            "stands in some cases only",
        ),
        (
            '[[together]]\n"gap.length" = ["2 mm"]\n"winding.turns" = [2, 3]',
            "lists of different lengths",
        ),
        ('[sample]\ncases = 100\n[ranges]\n"gap.length" = ["1 mm", "2 mm"]', "no power of 2"),
        (
            '[sample]\ncases = 4\n[ranges]\n"gap.length" = ["1 mm", "2 A"]',
            "is not a unit of this quantity",
        ),
        ("[sample]\ncases = 4", "sample: stands alone"),
        ('[ranges]\n"gap.length" = ["1 mm", "2 mm"]', "ranges: stands alone"),
        (
            '[sample]\nmethod = "grid"\ncases = 4\n[ranges]\n"gap.length" = ["1 mm", "2 mm"]',
            "'sobol' or 'latin hypercube'",
        ),
        ('[axes]\ngap.length = ["1 mm"]', 'axes.gap: a table; accepted: "gap.length" in quotes'),
        ('[[together]]\ngap.length = ["1 mm"]', 'together.gap: a table; accepted: "gap.length"'),
        ('[[case]]\ngap.length = "1 mm"', 'case.gap: a table; accepted: "gap.length" in quotes'),
        ('[ranges]\ngap.length = ["1 mm", "2 mm"]', 'ranges.gap: a table; accepted: "gap.length"'),
        ('[axes]\n"gap.length" = 3', "axes.gap.length = 3: not usable; accepted: a table of"),
        ('[axes]\n"gap.length" = ["1 mm"]\n[axes.x]\n', "axes.x = {}: not usable"),
        ("axes = 3", "axes = 3: not usable; accepted: a table of design keys"),
    ],
)
def test_bad_plans_are_one_line_each(folder: Path, text: str, problem: str) -> None:
    with pytest.raises(fm.InputError) as refused:
        study_of(folder, text).plan.check()
    assert problem in str(refused.value)
    assert "\n" not in str(refused.value)
    assert ".toml" in str(refused.value)


def test_a_base_that_is_not_there_is_said(folder: Path) -> None:
    (folder / "base.toml").unlink()
    with pytest.raises(fm.InputError, match=r"base.toml: cannot be read"):
        study_of(folder, '[axes]\n"gap.length" = ["1 mm"]')


def test_a_base_may_lack_what_every_case_sets(folder: Path) -> None:
    (folder / "base.toml").write_text(BASE.replace('length = "0.5 mm"', ""))
    assert len(study_of(folder, '[axes]\n"gap.length" = ["1 mm"]').plan) == 1


def test_an_axis_that_is_a_single_number_is_refused(pot_26_16: fm.Design) -> None:
    with pytest.raises(fm.InputError, match=r"gap.length = 0.001: no list"):
        _ = fm.Study(pot_26_16, {"gap.length": 1e-3}).plan  # type: ignore[dict-item]


def test_a_plan_is_a_value(pot_26_16: fm.Design) -> None:
    one, other = (fm.Study(pot_26_16, {"gap.length": [1e-3, 2e-3]}).plan for _ in range(2))
    assert one == other
    assert one.identity == other.identity
    wider = replace(one, factors=(Factor("gap.length", ("gap.length",), (("1 mm",),)),))
    assert isinstance(wider, Plan)
    assert wider.identity != one.identity
