import json
from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag.current_curve import CurvePoint, Saturation
from femag.export.curve_file import MeasuredBeside, curve_json
from femag.measured_inductance import Fit, MeasuredPoints


@pytest.fixture(scope="module")
def design() -> fm.Design:
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11e-3, 5.5e-3)
    material = fm.FroehlichCurve(2000, 0.45, 2)
    return fm.Design(core, fm.Winding(50), material, fm.Gap(0.5e-3), tolerance=2e-2)


@pytest.fixture(scope="module")
def curve(design: fm.Design) -> fm.InductanceCurve:
    solved = fm.inductance_curve(design, [6.0, 2.0])
    return replace(solved, saturation=(*solved.saturation, Saturation(0.99, None)))


@pytest.fixture
def measured(design: fm.Design) -> MeasuredBeside:
    points = MeasuredPoints((2.0, 6.0), (640e-6, 500e-6), "incremental", "bench.csv", ("a note",))
    fit = Fit(design, 0.5e-3, 1e-5, 1.1, None, None, (0.01, -0.01), (0.0, 0.001), 7)
    return MeasuredBeside(points, (0.01, -0.01), fit)


def test_json_out_and_in_is_the_same_curve(
    tmp_path: Path, curve: fm.InductanceCurve, measured: MeasuredBeside
) -> None:
    fm.write_curve(curve, tmp_path / "curve.json")
    assert fm.read_curve(tmp_path / "curve.json") == curve
    fm.write_curve(curve, tmp_path / "beside.json", measured)
    assert fm.read_curve(tmp_path / "beside.json") == curve


def test_json_has_the_keys_that_other_tools_read(
    curve: fm.InductanceCurve, measured: MeasuredBeside
) -> None:
    document = json.loads(curve_json(curve))
    for entry, point in zip(document["points"], curve.points, strict=True):
        for key in (
            "current",
            "flux_linkage",
            "apparent_inductance",
            "incremental_inductance",
        ):
            assert entry[key] == getattr(point, key)
        assert set(entry["coenergy"]) == {"lower", "value", "upper"}
        assert entry["coenergy"]["lower"] == point.coenergy.lower
    assert [entry["current"] for entry in document["points"]] == [6.0, 2.0]
    assert [entry["drop"] for entry in document["saturation"]] == [0.1, 0.2, 0.3, 0.99]
    assert document["saturation"][-1]["current"] is None
    assert document["design_hash"] == curve.design_hash
    assert document["measured"] is None
    beside = json.loads(curve_json(curve, measured))["measured"]
    assert beside["points"][1] == {"current": 6.0, "inductance": 500e-6, "residual": -0.01}
    assert beside["fit"]["residuals"] == [0.0, 0.001]
    assert beside["kind"] == "incremental"


def test_a_magnet_is_in_the_file(tmp_path: Path, curve: fm.InductanceCurve) -> None:
    points = tuple(
        CurvePoint(p.current, p.coenergy, p.flux_linkage_of_sides, (3e-4, 4e-4), 1e-3)
        for p in curve.points
    )
    fm.write_curve(replace(curve, points=points), tmp_path / "curve.json")
    again = fm.read_curve(tmp_path / "curve.json")
    assert [point.magnet_flux_linkage for point in again.points] == [1e-3, 1e-3]
    assert again.points[0].apparent_inductance == points[0].apparent_inductance


def changed(text: str, place: tuple[str | int, ...], value: object) -> str:
    document = json.loads(text)
    inner = document
    for key in place[:-1]:
        inner = inner[key]
    inner[place[-1]] = value
    return json.dumps(document)


@pytest.mark.parametrize(
    ("place", "value", "said"),
    [
        (("tolerance",), 0.5, "tolerance = 0.5: does not belong"),
        (("design_hash",), "0" * 64, "design_hash"),
        (("points", 1, "coenergy", "lower"), 1.0, "points.1.coenergy: bounds out of order"),
        (("points", 0, "flux_linkage"), 1.0, "points.0.flux_linkage = 1.0: does not follow"),
        (("points", 0, "apparent_inductance"), 1.0, "points.0.apparent_inductance"),
        (("points", 0, "current"), 0.0, "points.0.apparent_inductance = "),
        (("points", 0, "current"), 2.0, "each current once"),
        (("points",), [], "two points or more"),
        (("unheard_of",), 1.0, "unheard_of"),
        (("format",), "gapfield result 1", "no curve of this program"),
    ],
)
def test_a_curve_that_was_changed_is_refused(
    tmp_path: Path,
    curve: fm.InductanceCurve,
    place: tuple[str | int, ...],
    value: object,
    said: str,
) -> None:
    (tmp_path / "c.json").write_text(changed(curve_json(curve), place, value))
    with pytest.raises(fm.InputError) as caught:
        fm.read_curve(tmp_path / "c.json")
    assert said in str(caught.value)
    assert str(caught.value).startswith(str(tmp_path / "c.json"))
    assert "\n" not in str(caught.value)


def test_a_file_that_is_not_there_is_named(tmp_path: Path, curve: fm.InductanceCurve) -> None:
    with pytest.raises(fm.InputError, match=r"none\.json: cannot be read"):
        fm.read_curve(tmp_path / "none.json")
    with pytest.raises(fm.InputError, match="cannot be written"):
        fm.write_curve(curve, tmp_path / "none" / "curve.json")
