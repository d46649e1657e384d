from pathlib import Path

import pytest
from matplotlib.figure import Figure

import femag as fm


@pytest.mark.parametrize("size", ["P 9/5", "P 42/29"])
def test_a_drawing_shows_every_dimension(size: str) -> None:
    core = fm.catalogue_core(size).core()
    ax = fm.plot.core_drawing(core, Figure().add_subplot())
    shown = {text.get_text() for text in ax.texts}
    for diameter in (
        core.outer_diameter,
        core.window_diameter,
        core.post_diameter,
        core.hole_diameter,
    ):
        assert f"Ø {1e3 * diameter:.4g}" in shown
    for height in (core.height, core.window_height):
        assert f"{1e3 * height:.4g}" in shown
    assert "dimensions in mm" in ax.get_title()
    assert size in ax.get_title()


def test_a_solid_post_has_no_hole_to_show() -> None:
    core = fm.PotCore(26e-3, 21e-3, 11e-3, 16e-3, 11e-3)
    ax = fm.plot.core_drawing(core, Figure().add_subplot())
    assert len([text for text in ax.texts if "Ø" in text.get_text()]) == 3


@pytest.mark.parametrize("name", ["core", "core.xyz"])
def test_a_file_without_a_known_ending_is_refused(tmp_path: Path, name: str) -> None:
    core = fm.catalogue_core("P 9/5").core()
    with pytest.raises(fm.InputError, match="no format of a figure") as caught:
        fm.plot.write_figure(lambda ax: fm.plot.core_drawing(core, ax), tmp_path / name)
    assert ".png" in caught.value.accepted
    assert not list(tmp_path.iterdir())
