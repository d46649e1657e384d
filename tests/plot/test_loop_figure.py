import numpy as np
import pytest
from matplotlib.figure import Figure

import femag as fm
from femag.bench.synthetic import DEMO_CORE, InventedMaterial, Recording, invented_capture


@pytest.fixture(scope="module")
def loops() -> list[fm.Loop]:
    recording = Recording(periods=5.3, samples=300, noise=0.002)
    return [
        fm.loop_of(invented_capture(InventedMaterial().loop(peak), DEMO_CORE, recording), DEMO_CORE)
        for peak in (20.0, 60.0, 150.0)
    ]


def test_loops_are_drawn_closed_with_the_curve_over_them(loops: list[fm.Loop]) -> None:
    curve = fm.normal_curve(loops)
    ax = fm.plot.loop_figure(loops, Figure().add_subplot(), curve)
    for loop, line in zip(loops, ax.get_lines(), strict=False):
        h, b = line.get_data()
        assert (h[0], b[0]) == (h[-1], b[-1])
        assert np.ptp(b) == pytest.approx(2.0 * loop.readings.peak_flux_density)
    (drawn,) = [line for line in ax.get_lines() if line.get_label() == "normal curve"]
    assert np.array(drawn.get_data()).T[1:] == pytest.approx(np.array(curve.points))
    assert "A/m" in ax.get_xlabel()
    assert "T" in ax.get_ylabel()


def test_a_single_loop_has_its_readings_marked(loops: list[fm.Loop]) -> None:
    ax = fm.plot.loop_figure(loops[2:], Figure().add_subplot())
    marks = {
        line.get_marker(): line.get_data() for line in ax.get_lines() if len(line.get_xdata()) == 1
    }
    assert marks["s"][1] == pytest.approx(loops[2].readings.remanence)
    assert marks["^"][0] == pytest.approx(loops[2].readings.coercive_field)


def test_current_and_flux_share_a_time_axis_with_its_unit(loops: list[fm.Loop]) -> None:
    figure = Figure()
    ax = fm.plot.waveform_figure(loops[0], figure.add_subplot())
    assert ax.get_xlabel() == "time, us"
    assert ax.get_xlim()[1] == pytest.approx(100.0, rel=1e-3)
    (twin,) = [other for other in figure.axes if other is not ax]
    (flux,) = [line for line in twin.get_lines() if len(line.get_xdata()) > 2]
    assert flux.get_linestyle() != "-"
    assert np.max(flux.get_ydata()) == pytest.approx(loops[0].readings.peak_flux_density)
