"""How far copper must stay from the gap: against a Fourier series, single solutions, and rules."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.cli import main
from femag.copper_distance import KeepOutCurve
from femag.design_file import design_toml
from femag.field.adapt import adapted_solution
from femag.field.design_problem import field_problem
from femag.field.regional import agreeing_solution
from femag.plot import keep_out_chart, write_figure
from femag.quantities import ripple_field


def pot(
    post: float, depth: float, height: float, gap: float, mu: float = 2000.0, inner: float = 0.25e-3
) -> fm.Design:
    """A pot core with a winding over the height of its window; radii in m."""
    window = post + depth
    core = fm.PotCore(
        outer_diameter=2 * np.hypot(post, window), window_diameter=2 * window,
        post_diameter=2 * post, height=height + post, window_height=height,
    )  # fmt: skip
    block = fm.Block(post + inner, window, -height / 2, height / 2)
    return fm.Design(
        core=core, gaps=(fm.Gap(gap),), windings=(fm.Winding(50, block),),
        material=fm.LinearCurve(mu),
    )  # fmt: skip


def of_lines(distance: np.ndarray, pitch: float) -> np.ndarray:
    """Mean |B|^2 before a plane wall whose potential jumps at lines, over that without jumps.

    H_z = H0 (1 + 2 sum cos(2 pi n z/p) exp(-2 pi n x/p)) and its conjugate H_r give 1 + 4 q/(1 - q)
    with q = exp(-4 pi x/p). Derived here: ideal iron, short gaps, post much wider than the pitch.
    """
    q = np.exp(-4 * np.pi * distance / pitch)
    return 1 + 4 * q / (1 - q)


def test_layer_before_a_flat_post_is_the_fourier_series() -> None:
    design = pot(60e-3, 8e-3, 11e-3, 0.2e-3, mu=1e5)
    distances = np.array([0.5e-3, 1e-3, 1.5e-3, 2e-3])
    found = fm.keep_out(design, distances.tolist(), pieces=(1, 2))
    for curve in found.curves:
        excess = np.array(curve.layer) - 1
        expected = of_lines(distances, curve.pitch) - 1
        np.testing.assert_allclose(excess, expected, rtol=0.035, atol=5e-3)


def test_moved_winding_is_that_of_single_solutions(pot_26_16: fm.Design) -> None:
    """Strips on one mesh against a solution of each winding, with one gap and with a spread one."""
    distance, gap, height = 1.3e-3, 0.5e-3, 11e-3
    block = replace(pot_26_16.windings[0].block, inner_radius=5.75e-3 + distance)
    moved = replace(pot_26_16, windings=(fm.Winding(50, block),))
    filling = fm.Gap(0.998 * height, permeability=0.998 * height / (gap + 10.478e-3 / 2000))
    squares = []
    for gaps in ((fm.Gap(gap),), (filling,)):
        design = replace(moved, gaps=gaps)
        solution = adapted_solution(field_problem(design), 1.0, 1e-3)[0]
        close = agreeing_solution(solution, {"winding main"}, 0.01)
        squares.append(ripple_field(close, 1.0).squared_in(("winding main",)))
    found = fm.keep_out(pot_26_16, [distance], pieces=(1,))
    assert found.curves[0].winding[0] == pytest.approx(squares[0] / squares[1], rel=0.01)
    assert found.distance == pytest.approx(0.65e-3)


def test_distance_for_a_level_lies_between_its_neighbours() -> None:
    design = pot(6e-3, 5e-3, 11e-3, 0.5e-3)
    found = fm.keep_out(design, [0.5e-3, 1e-3, 2e-3, 3e-3], pieces=(1, 4))
    one, four = found.curves
    assert list(one.winding) == sorted(one.winding, reverse=True)
    assert all(b < a for a, b in zip(one.winding, four.winding, strict=True))
    for level in (one.winding[1], 1.4):
        place = found.distance_for(one, level)
        assert place is not None
        assert 0.99e-3 < place < 2e-3
    assert found.distance_for(one, one.winding[1]) == pytest.approx(1e-3)
    assert found.distance_for(one, 1.0001) is None
    assert found.distance_for(four, 9.0) == 0.5e-3


# Measured by this program (docs/copper.md): winding at 2 and 3 gap lengths, then the layer, over
# the level of a spread gap; post, depth and height of the window and gap in mm.
MEASURED = (
    ((6, 5, 11, 0.5), (1.79, 1.44), (2.60, 1.71)),
    ((6, 5, 11, 0.1), (3.67, 3.10), (14.2, 9.26)),
    ((6, 5, 11, 1.0), (1.26, 1.10), (1.34, 1.09)),
    ((3, 5, 11, 0.5), (1.68, 1.36), (2.52, 1.65)),
    ((12, 5, 11, 0.5), (1.86, 1.49), (2.67, 1.76)),
    ((6, 10, 11, 0.5), (1.30, 1.15), (2.60, 1.70)),
    ((6, 2.5, 11, 0.5), (3.38, 2.62), (2.78, 1.84)),
    ((6, 5, 5.5, 0.5), (1.10, 1.03), (1.36, 1.10)),
    ((6, 5, 22, 0.5), (4.82, 3.75), (5.79, 3.66)),
)


@pytest.mark.slow
@pytest.mark.parametrize(("sizes", "winding", "layer"), MEASURED)
def test_two_to_three_gap_lengths(
    sizes: tuple[float, ...], winding: tuple[float, ...], layer: tuple[float, ...]
) -> None:
    """The rule of the trade (common practice, no source) as docs/copper.md shows it: whether the
    loss is near its gap-free level there hangs on the height of the window, not on the gap."""
    post, depth, height, gap = (1e-3 * size for size in sizes)
    design = pot(post, depth, height, gap, inner=gap / 2)
    found = fm.keep_out(design, [2 * gap, 3 * gap], pieces=(1,))
    np.testing.assert_allclose(found.curves[0].winding, winding, rtol=0.015)
    np.testing.assert_allclose(found.curves[0].layer, layer, rtol=0.03)


@pytest.mark.slow
@pytest.mark.parametrize("pieces", [2, 3, 4, 6])
def test_pitch_under_four_distances_is_nearly_spread(pieces: int) -> None:
    """Hu and Sullivan 1998 (from memory): at pitch = 4 x distance several gaps act as one spread
    gap: here 1 to 4 % more in the winding, 14 to 16 % in the innermost layer."""
    design = pot(6e-3, 5e-3, 11e-3, 0.5e-3)
    (curve,) = fm.keep_out(design, [11e-3 / pieces / 4], pieces=(pieces,)).curves
    assert 1.005 < curve.winding[0] < 1.05
    assert 1.12 < curve.layer[0] < 1.17


def test_what_cannot_be_asked_is_refused_in_one_line(pot_26_16: fm.Design) -> None:
    spacer = fm.Gap(0.2e-3, leg="all")
    magnet = fm.Gap(0.5e-3, magnet=fm.Magnet(0.4))
    for gaps, problem in (((), "no gap"), ((spacer,), "no gap"), ((magnet,), "magnet")):
        with pytest.raises(fm.InputError, match=problem):
            fm.keep_out(replace(pot_26_16, gaps=gaps))
    with pytest.raises(fm.InputError, match="spacer"):
        fm.keep_out(replace(pot_26_16, gaps=(fm.Gap(0.5e-3), spacer)))
    for distances in ([], [1e-3, 0.5e-3], [0.0], [4e-3]):
        with pytest.raises(fm.InputError, match="distances"):
            fm.keep_out(pot_26_16, distances)


def test_command_prints_and_writes(
    pot_26_16: fm.Design, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "design.toml"
    file.write_text(design_toml(pot_26_16), encoding="utf-8")
    out = tmp_path / "out"
    options = ["--distances", "0.5 mm, 1 mm", "--pieces", "1, 3"]
    assert main(["keepout", str(file), *options, "--out", str(out)]) == 0
    printed = capsys.readouterr().out
    assert max(map(len, printed.partition("Written to")[0].splitlines())) <= 80
    assert "0.5 mm" in printed
    document = json.loads((out / "keepout.json").read_text(encoding="utf-8"))
    assert [curve["pieces"] for curve in document["curves"]] == [1, 3]
    assert document["distances"] == [0.5e-3, 1e-3]
    assert (out / "keepout.png").stat().st_size > 10_000
    assert main(["keepout", str(file), "--distances", "0.5"]) == 2
    assert "--distances" in capsys.readouterr().err
    for option, text in (("--pieces", "1, two"), ("--pieces", "0"), ("--distances", "50 mm")):
        assert main(["keepout", str(file), option, text]) == 2
        assert f"{option} = '{text}': not usable" in capsys.readouterr().err


def test_chart_draws_a_line_for_every_number_of_pieces(
    pot_26_16: fm.Design, tmp_path: Path
) -> None:
    curves = tuple(KeepOutCurve(n, 11e-3 / n, (2.0, 1.2), (3.0, 1.4)) for n in (1, 3))
    found = fm.KeepOut(pot_26_16, 0.5e-3, 0.65e-3, (1e-3, 2e-3), curves, 0.1, {}, "")
    drawn = []
    for what in ("winding", "layer"):
        write_figure(lambda ax, w=what: drawn.append(keep_out_chart(found, ax, w)) or drawn[-1],
                     tmp_path / f"{what}.png")  # fmt: skip
    for ax, what in zip(drawn, ("winding", "layer"), strict=True):
        lines = [line for line in ax.get_lines() if len(line.get_xdata()) == 2][:2]
        np.testing.assert_allclose(lines[1].get_ydata(), getattr(curves[1], what))
        np.testing.assert_allclose(lines[1].get_xdata(), [2.0, 4.0])
        assert "over the gap, 0.5 mm" in ax.get_xlabel()
