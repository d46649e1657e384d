from dataclasses import replace
from pathlib import Path

import pytest
from matplotlib.figure import Figure

import femag as fm
from femag.study.charts import (
    al_series,
    al_table,
    error_plane,
    formulas,
    fringing_series,
    fringing_table,
    hand_error_table,
)
from femag.study.table import Axis, StudyTable

FORMULAS = ("no fringing", "round edge")
HEIGHTS = (5e-3, 10e-3)
GAPS = (2e-3, 0.5e-3, 1e-3, 0.0)
POST = 10e-3


def table(heights: tuple[float, ...] = HEIGHTS) -> StudyTable:
    """Cases with numbers by rule: fringing factor 1 + gap/post + height, errors by place."""
    holes = (0.0, 5e-3)
    rows = [(h, d, g) for h in heights for d in holes for g in GAPS]
    columns: dict[str, list] = {
        "case": list(range(len(rows))),
        "state": ["done"] * len(rows),
        "reason": [None] * len(rows),
        "core.dimensions.window_height": [h for h, _, _ in rows],
        "core.dimensions.hole_diameter": [d for _, d, _ in rows],
        "gap.length": [g for _, _, g in rows],
        "shape.gap": [g for _, _, g in rows],
        "shape.post_diameter": [POST] * len(rows),
        "shape.window_height": [h for h, _, _ in rows],
        "al_value": [1e-9 / (g or 1.0) for _, _, g in rows],
        "fringing_factor": [1.0 + g / POST + h for h, _, g in rows],
        "hand.error.no fringing": [-g - d for _, d, g in rows],
        "hand.error.round edge": [g for _, _, g in rows],
        "hand.in_range.no fringing": [d == 0.0 for _, d, _ in rows],
        "hand.in_range.round edge": [True] * len(rows),
    }
    lengths = [name for name in columns if name.startswith(("core", "gap", "shape"))]
    units = dict.fromkeys(columns, "") | dict.fromkeys(lengths, "m") | {"al_value": "H"}
    axes = [("core.dimensions.window_height", len(heights)),
            ("core.dimensions.hole_diameter", len(holes)), ("gap.length", len(GAPS))]  # fmt: skip
    return StudyTable(columns, units, tuple(Axis(name, (name,), size) for name, size in axes))


def test_fringing_is_shown_for_each_window_height_in_order_of_the_gap() -> None:
    series = fringing_series(table())
    assert [(one.label, one.group) for one in series] == [("0.5", 0)] * 2 + [("1", 1)] * 2
    for one in series:
        assert one.x.tolist() == pytest.approx([0.05, 0.1, 0.2])
        assert one.y == pytest.approx(1.0 + one.x + HEIGHTS[one.group])


def test_many_window_heights_become_classes() -> None:
    heights = tuple(5e-3 + 1e-4 * n for n in range(20))
    series = fringing_series(table(heights))
    assert {one.group for one in series} == set(range(6))
    assert {one.label for one in series if one.group == 0} == {"0.5 to 0.52"}
    assert sum(one.x.size for one in series) == 20 * 2 * 3


def test_al_has_a_line_for_all_that_share_the_rest() -> None:
    series = al_series(table())
    assert len(series) == 4
    assert series[1].label == (
        "core.dimensions.window_height 5 mm, core.dimensions.hole_diameter 5 mm"
    )
    assert series[0].x.tolist() == [0.5, 1.0, 2.0]
    assert series[0].y == pytest.approx([2000.0, 1000.0, 500.0])


def test_a_cell_holds_the_largest_error_and_whether_all_are_in_range() -> None:
    plane = error_plane(table(), "no fringing")
    assert plane.gaps.tolist() == [0.05, 0.1, 0.2]
    assert plane.heights.tolist() == [0.5, 1.0]
    assert plane.error[0] == pytest.approx([-0.0055, -0.006, -0.007])
    assert not plane.in_range.any()
    solid = table().where("core.dimensions.hole_diameter", 0.0)
    assert error_plane(solid, "no fringing").in_range.all()
    assert error_plane(solid, "no fringing").error[1] == pytest.approx([-0.5e-3, -1e-3, -2e-3])


def test_tables_behind_charts_hold_every_case_with_a_gap() -> None:
    assert formulas(table()) == list(FORMULAS)
    errors = hand_error_table(table())
    assert len(errors.columns["case"]) == 2 * 12
    assert fringing_table(table()).columns["gap_over_post"][:3] == pytest.approx([0.2, 0.05, 0.1])
    assert al_table(table()).units["al_value"] == "H"
    assert al_table(table()).units["gap.length"] == "m"


def test_a_chart_without_its_numbers_is_refused() -> None:
    bare = table()
    without = {name: values for name, values in bare.columns.items() if "hand" not in name}
    with pytest.raises(fm.InputError, match="the study does not keep 'hand'"):
        error_plane(replace(bare, columns=without), "round edge")
    ungapped = bare.where("gap.length", 0.0)
    with pytest.raises(fm.InputError, match="no case with a gap is done"):
        fringing_series(ungapped)


def test_where_refuses_what_is_not_there() -> None:
    with pytest.raises(fm.InputError, match=r"gap.length = 7: no such case; accepted: 0.0, 0.0005"):
        table().where("gap.length", 7)
    with pytest.raises(fm.InputError, match="gap = 7: no such case"):
        table().where("gap", 7)


def test_charts_show_their_series_with_names_and_units() -> None:
    ax = fm.plot.fringing_chart(table(), Figure().add_subplot())
    labels = [text.get_text() for text in ax.get_legend().get_texts()]
    assert labels == ["0.5", "1"]
    assert (ax.get_xscale(), ax.get_xlabel()) == ("log", "gap over post diameter")
    assert ax.lines[0].get_ydata().tolist() == pytest.approx([1.055, 1.105, 1.205])
    ax = fm.plot.al_chart(table(), Figure().add_subplot())
    assert (ax.get_xscale(), ax.get_yscale()) == ("log", "log")
    assert (ax.get_xlabel(), ax.get_ylabel()) == ("gap, mm", "AL, nH")
    assert len({(line.get_linestyle(), line.get_marker()) for line in ax.lines}) == 4


def test_cells_show_errors_in_per_cent_darker_when_larger() -> None:
    errors = {2e-3: 0.31, 0.5e-3: -0.004, 1e-3: 0.06, 0.0: 0.0}
    columns = table().columns | {"hand.error.round edge": [errors[gap] for gap in GAPS] * 4}
    shown = replace(table(), columns=columns)
    ax = fm.plot.hand_error_chart(shown, "round edge", Figure().add_subplot())
    cells = sorted(
        zip(ax.texts, ax.collections, strict=True), key=lambda cell: cell[0].get_position()[0]
    )
    assert [text.get_text() for text, _ in cells] == ["-0.4"] * 2 + ["+6.0"] * 2 + ["+31"] * 2
    tones = [float(patch.get_facecolor()[0][0]) for _, patch in cells]
    assert tones[0] > tones[2] > tones[4]
    inks = [text.get_color() for text, _ in cells]
    assert (inks[0], inks[4]) == ("black", "white")
    ax = fm.plot.hand_error_chart(table(), "no fringing", Figure().add_subplot())
    assert all(text.get_text().startswith("(-") for text in ax.texts)


def test_charts_are_written_with_the_tables_behind_them(tmp_path: Path) -> None:
    from femag.export.study_table_file import write_chart_table, write_table

    write_chart_table(al_table(table()), tmp_path / "al.csv")
    head, first, *_ = (tmp_path / "al.csv").read_text().splitlines()
    assert head.startswith("case,gap [m],al_value [H],core.dimensions.window_height [m]")
    assert first.startswith("0,0.002,5e-07,0.005")
    write_table(table(), tmp_path / "t.csv")
    assert len((tmp_path / "t.csv").read_text().splitlines()) == 17
