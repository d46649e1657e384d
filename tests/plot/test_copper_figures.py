"""Map and bars of the copper loss show the numbers of the result."""

from dataclasses import replace

import numpy as np
import pytest
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure

import femag as fm
from femag.plot import copper_map, layer_bars


@pytest.fixture(scope="module")
def result() -> fm.Result:
    core = fm.catalogue_core("P 26/16").core()
    former = fm.Former(wall=0.6e-3, flange=0.6e-3)
    design = fm.Design(
        core=core,
        gaps=(fm.Gap(0.5e-3),),
        windings=(
            fm.Winding(30, conductor=fm.RoundWire(0.5e-3, 0.03e-3), former=former),
            fm.Winding(6, conductor=fm.LitzWire(30, 0.1e-3), name="aux"),
        ),
        material=fm.LinearCurve(2000.0),
        current=2.0,
        ripple=fm.Ripple(1.0, 1e5),
    )
    return fm.solve(design)


def test_bars_stack_to_the_loss_of_each_layer(result: fm.Result) -> None:
    ax = layer_bars(result, Figure().subplots())
    rows = [layer for loss in result.copper_loss for layer in loss.layers]
    stacks = zip(*ax.containers, strict=True)
    tops = [max(bar.get_y() + bar.get_height() for bar in stack) for stack in stacks]
    expected = [layer.dc + (layer.ripple or 0) + (layer.crossing or 0) for layer in rows]
    np.testing.assert_allclose(tops, expected)
    assert [text.get_text() for text in ax.get_xticklabels()] == ["main 1", "main 2", "aux 1"]


def test_bars_mark_what_is_out_of_range(result: fm.Result) -> None:
    loss = result.copper_loss[0]
    unknown = tuple(replace(layer, crossing=None) for layer in loss.layers)
    marked = replace(result, copper_loss=(replace(loss, layers=unknown, crossing=None),))
    ax = layer_bars(marked, Figure().subplots())
    assert [text.get_text() for text in ax.texts] == ["+ ?"] * len(unknown)
    assert "out of range" in ax.get_title()


def test_map_shades_every_turn_by_its_loss_per_length(result: fm.Result) -> None:
    ax = copper_map(result, Figure().subplots())
    shades = next(c for c in ax.collections if c.get_array() is not None)
    assert isinstance(shades, PolyCollection)
    values = shades.get_array()
    assert len(values) == len(shades.get_paths()) == 36
    radii = [np.mean(path.vertices[:-1, 0]) * 1e-3 for path in shades.get_paths()]
    total = sum(loss.crossing or 0.0 for loss in result.copper_loss)
    assert np.sum(values * 2 * np.pi * radii) == pytest.approx(total, rel=1e-6)


def test_without_ripple_there_is_nothing_to_draw(result: fm.Result) -> None:
    bare = replace(result, copper_loss=())
    for draw in (copper_map, layer_bars):
        with pytest.raises(ValueError, match="no loss"):
            draw(bare, Figure().subplots())
