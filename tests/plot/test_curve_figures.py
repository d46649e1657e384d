"""Figures of curves. The curves are invented reluctance circuits, so that every mark is known."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure

import femag as fm
from femag.current_curve import CurvePoint, Saturation
from femag.materials import MagnetisationCurve
from femag.measured_inductance import MeasuredPoints
from femag.units import MU_0

TURNS = 50
CORE, GAP = 2e5, 3e6
"""Reluctances, A/Wb."""
CURRENTS = (0.5, 1.0, 2.0, 4.0)


@pytest.fixture(scope="module")
def design() -> fm.Design:
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11e-3, 5.5e-3)
    return fm.Design(core, fm.Winding(TURNS), fm.FroehlichCurve(2000, 0.45), fm.Gap(0.5e-3))


def circuit(
    design: fm.Design,
    reluctance: float,
    currents: Sequence[float] = CURRENTS,
    magnet: float = 0.0,
    saturation: tuple[Saturation, ...] = (),
) -> fm.InductanceCurve:
    """Return the curve of a linear reluctance in A/Wb, with the flux linkage of a magnet in Wb."""
    inductance = TURNS**2 / reluctance
    points = tuple(
        CurvePoint(
            current,
            fm.Bounds(0.5 * inductance * current**2, 0.5 * inductance * current**2, "J"),
            (magnet + inductance * current, magnet + inductance * current),
            (inductance, inductance),
            magnet,
        )
        for current in currents
    )
    return fm.InductanceCurve(design, points, inductance, saturation, 0, 0, 0.0, {}, "")


def axes() -> Axes:
    return Figure().add_subplot()


def line(ax: Axes, label: str) -> tuple[np.ndarray, np.ndarray]:
    (found,) = [line for line in ax.get_lines() if line.get_label() == label]
    x, y = found.get_data()
    return np.asarray(x), np.asarray(y)


def test_inductances_are_drawn_from_zero_current_with_saturation_marked(design: fm.Design) -> None:
    reached = (Saturation(0.1, 3.0), Saturation(0.2, 3.5), Saturation(0.3, None))
    ax = fm.plot.inductance_figure(circuit(design, GAP, saturation=reached), axes())
    initial = 1e6 * TURNS**2 / GAP
    x, y = line(ax, "apparent")
    assert x.tolist() == [0.0, *CURRENTS]
    assert y == pytest.approx(initial)
    x, y = line(ax, "incremental")
    assert x.tolist() == [0.0, 0.5, 1.0, 2.0, 3.0, 3.5, 4.0]
    assert y[4:6] == pytest.approx([0.9 * initial, 0.8 * initial])
    for label, current, share in (
        ("10 % less at 3 A", 3.0, 0.9),
        ("20 % less at 3.5 A", 3.5, 0.8),
    ):
        x, y = line(ax, label)
        assert (x[0], y[0]) == pytest.approx((current, share * initial))
    assert not [text for text in ax.get_legend_handles_labels()[1] if "30 %" in text]
    assert ax.get_ylabel() == "inductance, µH"
    assert ax.get_xlabel() == "current, A"
    assert ax.get_ylim()[0] == 0.0


def test_measured_points_lie_over_it_with_residuals_in_per_cent(design: fm.Design) -> None:
    points = MeasuredPoints((1.0, 3.0), (800e-6, 790e-6), "incremental")
    curve = circuit(design, GAP)
    ax = fm.plot.inductance_figure(curve, axes(), points, (0.05, -0.02))
    x, y = line(ax, "measured, incremental")
    assert x == pytest.approx([1.0, 3.0])
    assert y == pytest.approx([800.0, 790.0])
    (below,) = ax.child_axes
    marks = [line.get_data() for line in below.get_lines() if line.get_marker() == "x"]
    assert np.asarray(marks[0]) == pytest.approx(np.array([[1.0, 3.0], [5.0, -2.0]]))
    assert below.get_xlim() == ax.get_xlim()
    assert min(ax.get_yticks()) >= 0.0
    floor, top = ax.transAxes.inverted().transform(ax.transData.transform([(0, 0), (0, 1)]))[:, 1]
    assert floor == pytest.approx(below.get_position().height / ax.get_position().height, rel=1e-6)
    assert top > floor
    alone = fm.plot.inductance_figure(curve, axes(), points)
    assert not alone.child_axes


def test_a_magnet_has_its_flux_linkage_but_no_inductance_at_zero_current(
    design: fm.Design,
) -> None:
    curve = circuit(design, GAP, magnet=-1e-3)
    x, _ = line(fm.plot.inductance_figure(curve, axes()), "apparent")
    assert x.tolist() == list(CURRENTS)
    x, y = line(fm.plot.linkage_figure(curve, axes()), "with the gap and its magnet")
    assert (x[0], y[0]) == (0.0, -1.0)


def test_the_same_flux_takes_the_gaps_ampere_turns_more(design: fm.Design) -> None:
    """Closed form of a series circuit: NI = phi (R_core + R_gap): the gap takes phi R_gap."""
    gapped, ungapped = circuit(design, CORE + GAP), circuit(design, CORE)
    ax = fm.plot.core_flux_figure(gapped, axes(), ungapped)
    turns, flux = line(ax, "with the gap")
    assert turns == pytest.approx(TURNS * np.array([0.0, *CURRENTS]))
    assert 1e-6 * flux == pytest.approx(turns / (CORE + GAP))
    assert ax.get_ylabel() == "flux per turn, µWb"
    _, flux = line(ax, "without the gap")
    assert 1e-6 * flux == pytest.approx(turns / CORE)
    said = [text for text in ax.texts if "the gap takes" in text.get_text()]
    assert len(said) == 2
    for text in said:
        shown = float(text.get_text().split()[-2])
        assert shown == pytest.approx(1e-6 * text.xy[1] * GAP, rel=5e-3)


def test_a_negative_current_is_drawn_to_the_left(design: fm.Design) -> None:
    currents = tuple(-current for current in CURRENTS)
    gapped, ungapped = (circuit(design, r, currents) for r in (CORE + GAP, CORE))
    ax = fm.plot.core_flux_figure(gapped, axes(), ungapped)
    said = [text for text in ax.texts if "the gap takes" in text.get_text()]
    assert all(text.xy[0] < 0.0 and text.xy[1] < 0.0 for text in said)
    shown = [float(text.get_text().split()[-2]) for text in said]
    assert shown == pytest.approx([-1e-6 * text.xy[1] * GAP for text in said], rel=5e-3)


def test_flux_linkage_has_its_unit_and_both_curves(design: fm.Design) -> None:
    ax = fm.plot.linkage_figure(circuit(design, CORE + GAP), axes(), circuit(design, CORE))
    for label, reluctance in (("with the gap", CORE + GAP), ("without the gap", CORE)):
        x, y = line(ax, label)
        assert 1e-3 * y == pytest.approx(TURNS**2 / reluctance * x)
    assert ax.get_ylabel() == "flux linkage, mWb"
    closed = fm.plot.linkage_figure(circuit(replace(design, gaps=()), CORE), axes())
    assert line(closed, "no gap")[0].tolist() == [0.0, *CURRENTS]


def test_the_material_is_drawn_to_beyond_its_knee_whatever_the_gap(design: fm.Design) -> None:
    """Froehlich and Kennelly, from memory: B = mu0 H + Js H/(a + H), a = Js/(mu0 (mu_i - 1))."""
    ax = fm.plot.material_figure(circuit(design, GAP), axes())
    h, b = ax.get_lines()[0].get_data()
    knee = 0.45 / (MU_0 * 1999)
    assert b == pytest.approx(MU_0 * h + 0.45 * h / (knee + h))
    assert 0.8 * 0.45 < b[-1] < 0.45
    other = fm.plot.material_figure(replace(design, gaps=fm.Gap(2e-3)), axes())
    assert other.get_lines()[0].get_data()[1] == pytest.approx(b)


@pytest.mark.parametrize(
    "material",
    [
        fm.LinearCurve(60.0),
        fm.FroehlichCurve(10.0, 0.3, 20.0),
        fm.FroehlichCurve(1e5, 2.0, 6.0),
        fm.material("mnzn-power-100C"),
        fm.material("powder-26"),
        fm.material("silicon-steel"),
    ],
)
def test_every_material_rises_over_its_picture(
    design: fm.Design, material: MagnetisationCurve
) -> None:
    ax = fm.plot.material_figure(replace(design, material=material), axes())
    h, b = ax.get_lines()[0].get_data()
    assert (h[0], b[0]) == (0.0, 0.0)
    assert np.all(np.diff(b) > 0.0)
    if not material.is_linear:
        slopes = np.diff(b) / np.diff(h)
        assert slopes[-1] < 0.25 * slopes.max()
        assert b[-1] > 0.2


def test_markers_give_way_where_points_crowd(design: fm.Design) -> None:
    curve = circuit(design, GAP, np.linspace(0.1, 5.0, 60).tolist())
    ax = fm.plot.linkage_figure(curve, axes())
    assert ax.get_lines()[0].get_marker() in ("", "None", None)


def test_panels_stand_side_by_side(design: fm.Design) -> None:
    figure = Figure()
    gapped, ungapped = circuit(design, CORE + GAP), circuit(design, CORE)
    for draw, ax in zip(
        fm.plot.shearing_panels(gapped, ungapped), figure.subplots(1, 3), strict=True
    ):
        assert draw(ax) is ax
    titles = [ax.get_title() for ax in figure.axes]
    assert [title.split(":")[0] for title in titles] == ["the material", "the core", "the device"]
