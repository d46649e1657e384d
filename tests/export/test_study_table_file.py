import csv
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import femag as fm
from femag.export.study_table_file import write_table
from femag.study.table import Axis, StudyTable


@pytest.fixture
def table() -> StudyTable:
    """Two sizes that change with their turns, three gaps; one case failed, one open."""
    columns: dict[str, list[Any]] = {
        "case": list(range(6)),
        "state": ["done"] * 4 + ["failed", "open"],
        "reason": [None] * 4 + ["too, thin", None],
        "core.size": ["P 22/13"] * 3 + ["P 26/16"] * 3,
        "winding.turns": [10] * 3 + [20] * 3,
        "gap.length": [0.1e-3, 0.2e-3, 0.3e-3] * 2,
        "inductance.value": [1 / 3, 2 / 3, 4 / 3, 5 / 3, None, None],
        "hand.error.no fringing": [-0.1, -0.2, -0.3, -0.4, None, None],
        "hand.error.side path ratio (1, 2)": [0.1, 0.2, 0.3, 0.4, None, None],
        "hand.in_range.no fringing": [True, False, True, True, None, None],
        "hand.in_range.side path ratio (1, 2)": [True, True, True, False, None, None],
    }
    units = dict.fromkeys(columns, "") | {"gap.length": "m", "inductance.value": "H"}
    axes = (Axis("core.size", ("core.size", "winding.turns"), 2),
            Axis("gap.length", ("gap.length",), 3))  # fmt: skip
    return StudyTable(columns, units, axes, {"title": "three gaps", "versions": "{}"})


def test_csv_has_units_in_its_heading_and_exact_numbers(table: StudyTable, tmp_path: Path) -> None:
    write_table(table, tmp_path / "t.csv")
    with (tmp_path / "t.csv").open(encoding="utf-8", newline="") as file:
        head, *rows = csv.reader(file)
    assert head[3:7] == ["core.size", "winding.turns", "gap.length [m]", "inductance.value [H]"]
    assert head[8] == "hand.error.side path ratio (1, 2)"
    assert [float(row[6]) for row in rows[:4]] == [1 / 3, 2 / 3, 4 / 3, 5 / 3]
    assert rows[4][1:3] == ["failed", "too, thin"]
    assert rows[5][6:] == [""] * 5


def test_frame_carries_units_also_through_parquet(table: StudyTable, tmp_path: Path) -> None:
    pandas = pytest.importorskip("pandas")
    pytest.importorskip("pyarrow")
    write_table(table, tmp_path / "t.parquet")
    for frame in (table.frame(), pandas.read_parquet(tmp_path / "t.parquet")):
        assert frame.attrs["units"]["gap.length"] == "m"
        assert list(frame.columns) == list(table.columns)
        assert frame["inductance.value"][:4].tolist() == table.columns["inductance.value"][:4]
        assert frame["inductance.value"].isna().sum() == 2


def test_dataset_has_a_dimension_for_each_factor_also_through_netcdf(
    table: StudyTable, tmp_path: Path
) -> None:
    xarray = pytest.importorskip("xarray")
    write_table(table, tmp_path / "t.nc")
    with xarray.open_dataset(tmp_path / "t.nc", engine="scipy") as read:
        for dataset in (table.dataset(), read):
            assert dict(dataset.sizes) == {"core.size": 2, "gap.length": 3, "formula": 2}
            inductance = dataset["inductance.value"]
            assert inductance.dims == ("core.size", "gap.length")
            assert inductance.attrs["units"] == "H"
            np.testing.assert_array_equal(
                inductance.values, [[1 / 3, 2 / 3, 4 / 3], [5 / 3, np.nan, np.nan]]
            )
            assert dataset["winding.turns"].values.tolist() == [10, 20]
            assert dataset["winding.turns"].dims == ("core.size",)
            error = dataset["hand.error"].sel(formula="side path ratio (1, 2)")
            assert error.values[0].tolist() == [0.1, 0.2, 0.3]
            assert dataset["hand.in_range"].sel(formula="no fringing").values[0].tolist() == [
                1,
                0,
                1,
            ]
            assert str(dataset["reason"].values[1, 1]) == "too, thin"
            assert str(dataset["state"].values[1, 2]) == "open"
            assert dataset.attrs["title"] == "three gaps"


def test_listed_cases_have_one_dimension(table: StudyTable) -> None:
    pytest.importorskip("xarray")
    some = table.where("core.size", "P 26/16")
    dataset = some.dataset()
    assert dict(dataset.sizes) == {"case": 3, "formula": 2}
    assert dataset["gap.length"].dims == ("case",)


def test_a_file_without_a_known_ending_is_refused(table: StudyTable, tmp_path: Path) -> None:
    with pytest.raises(fm.InputError, match=r"accepted: an ending of .csv, .parquet, .nc"):
        write_table(table, tmp_path / "t.xlsx")
    assert not list(tmp_path.iterdir())
