from dataclasses import replace

import numpy as np
import pytest
from matplotlib.figure import Figure

import femag as fm

LOSS = fm.Steinmetz(1.5, 1.45, 2.6, (25e3, 300e3), (0.03, 0.3))


def test_the_map_has_labels_units_and_the_scale_of_the_loss(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, material=fm.LinearCurve(2000.0, LOSS), ripple=fm.Ripple(0.8, 1e5))
    result = fm.solve(design, tolerance=1e-2)
    loss = result.core_loss
    assert loss is not None
    figure = Figure()
    ax = fm.plot.core_loss_map(result, figure.add_subplot())
    assert (ax.get_xlabel(), ax.get_ylabel()) == ("r, mm", "z, mm")
    assert f"{loss.total:.3g} W" in ax.get_title()
    (bar,) = [other for other in figure.axes if other is not ax]
    assert "kW/m" in bar.get_ylabel()
    assert bar.get_yscale() == "log"
    drawn = np.asarray(ax.collections[0].get_array())
    high = [share.loss_density for share in loss.volume_shares][-1]
    assert bar.get_ylim()[1] == pytest.approx(1e-3 * high)
    assert np.median(drawn) < 1e-3 * high < drawn.max()


def test_a_result_without_loss_is_refused(pot_26_16: fm.Design) -> None:
    with pytest.raises(ValueError, match="no core loss"):
        fm.plot.core_loss_map(fm.solve(pot_26_16, tolerance=1e-2), Figure().add_subplot())
