from dataclasses import replace
from pathlib import Path

import matplotlib.image
import pytest
from matplotlib.figure import Figure

import femag as fm


@pytest.mark.parametrize("draw", [fm.plot.flux_map, fm.plot.gap_map])
def test_a_map_has_labels_units_and_flux_lines(pot_26_16: fm.Design, draw) -> None:
    result = fm.solve(pot_26_16, tolerance=1e-2)
    figure = Figure()
    ax = draw(result, figure.add_subplot())
    assert (ax.get_xlabel(), ax.get_ylabel()) == ("r, mm", "z, mm")
    assert "1 A" in ax.get_title()
    (colourbar,) = [other for other in figure.axes if other is not ax]
    assert "|B|, T" in colourbar.get_ylabel()
    assert "winding main" in [text.get_text() for text in ax.texts]
    (low, high), (bottom, top) = ax.get_xlim(), ax.get_ylim()
    assert low < 5.75 < high
    assert bottom == pytest.approx(-top)


def test_every_kind_of_gap_draws(tmp_path: Path, pot_26_16: fm.Design) -> None:
    for gaps in ((), (fm.Gap(0.3e-3, "all"),), (fm.Gap(9e-3),)):
        result = fm.solve(replace(pot_26_16, gaps=gaps), tolerance=1e-2)
        fm.plot.write_figure(lambda ax, r=result: fm.plot.gap_map(r, ax), tmp_path / "gap.png")
        picture = matplotlib.image.imread(tmp_path / "gap.png")
        assert picture.shape[0] > 500
        assert picture[..., :3].std() > 0.05
    assert [file.name for file in tmp_path.iterdir()] == ["gap.png"]
