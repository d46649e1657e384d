import json
from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag.export.result_file import result_json
from femag.export.whole_file import whole_file


@pytest.fixture(scope="module")
def result() -> fm.Result:
    core = fm.PotCore(
        outer_diameter=25.5e-3,
        window_diameter=21.2e-3,
        post_diameter=11.5e-3,
        hole_diameter=5.5e-3,
        height=16.1e-3,
        window_height=11.0e-3,
    )
    design = fm.Design(
        core=core,
        gaps=(fm.Gap(0.5e-3),),
        windings=(fm.Winding(50),),
        material=fm.FroehlichCurve(2000, 0.45, 2),
        current=3,
        title='a <title> with "quotes" and ümlauts',
    )
    return fm.solve(design)


def test_json_out_and_in_is_the_same_result(tmp_path: Path, result: fm.Result) -> None:
    fm.write_result(result, tmp_path / "result.json")
    again = fm.read_result(tmp_path / "result.json")
    assert again == result
    assert again.solution is None
    assert str(again.inductance) == str(result.inductance)
    assert again.fringing_factor == result.fringing_factor


def test_json_has_the_keys_that_other_tools_read(result: fm.Result) -> None:
    document = json.loads(result_json(result))
    assert set(document["inductance"]) == set(document["coenergy"]) == {"lower", "value", "upper"}
    for key in (
        "apparent_inductance",
        "incremental_inductance",
        "flux_linkage",
        "fringing_factor",
        "plain_inductance",
        "unknowns",
        "refinements",
        "seconds",
        "versions",
        "design_hash",
    ):
        assert key in document
    assert set(document["hand"][0]) >= {"name", "inductance", "error", "in_range"}
    assert document["inductance"]["value"] == result.inductance.value
    assert document["inductance"]["lower"] < document["inductance"]["upper"] < 1e-2


@pytest.mark.parametrize(
    "text", ["", "[]", "{}", "not json", '{"format": "gapfield result 9"}'], ids=repr
)
def test_another_file_is_no_result(tmp_path: Path, text: str) -> None:
    file = tmp_path / "other.json"
    file.write_text(text)
    with pytest.raises(fm.InputError, match="no result of this program") as caught:
        fm.read_result(file)
    assert str(caught.value).startswith(str(file))
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("current", 5.0),
        ("tolerance", 0.5),
        ("design_hash", "0" * 64),
        ("inductance", {"lower": 2.0, "value": 1.5, "upper": 1.0}),
        ("plain_inductance", 0.0),
        ("unheard_of", 1.0),
        ("unknowns", "many"),
    ],
)
def test_a_result_that_was_changed_is_refused(
    tmp_path: Path, result: fm.Result, key: str, value: object
) -> None:
    document = json.loads(result_json(result)) | {key: value}
    (tmp_path / "changed.json").write_text(json.dumps(document))
    with pytest.raises(fm.InputError) as caught:
        fm.read_result(tmp_path / "changed.json")
    assert key in str(caught.value)


def test_a_result_without_fields_cannot_be_drawn(tmp_path: Path, result: fm.Result) -> None:
    from matplotlib.figure import Figure

    with pytest.raises(ValueError, match="holds no fields"):
        fm.plot.flux_map(replace(result, solution=None), Figure().add_subplot())


def test_a_file_is_whole_or_not_there(tmp_path: Path) -> None:
    target = tmp_path / "file.txt"
    target.write_text("old")

    def stop_halfway() -> None:
        with whole_file(target) as temporary:
            temporary.write_text("half of the ne")
            raise RuntimeError

    with pytest.raises(RuntimeError):
        stop_halfway()
    assert target.read_text() == "old"
    assert list(tmp_path.iterdir()) == [target]
    with whole_file(target) as temporary:
        temporary.write_text("new")
    assert target.read_text() == "new"
    assert list(tmp_path.iterdir()) == [target]


def test_a_folder_that_is_not_there_is_named(tmp_path: Path, result: fm.Result) -> None:
    with pytest.raises(fm.InputError, match="cannot be written") as caught:
        fm.write_result(result, tmp_path / "none" / "result.json")
    assert str(tmp_path / "none" / "result.json") in str(caught.value)
