from dataclasses import replace
from itertools import combinations, pairwise
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text
from matplotlib.transforms import Bbox

import femag as fm
from femag import cli
from femag.field.bounds import Bounds
from femag.quantities import point_fields
from femag.review import MeshStep, mesh_row

FILES = ["convergence.svg", "drawing.svg", "gap.png", "layer.svg", "material.svg",
         "post-face.svg", "section.png"]  # fmt: skip


@pytest.fixture(scope="module")
def result() -> fm.Result:
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11.0e-3, 5.5e-3)
    design = fm.Design(
        core=core,
        gaps=fm.Gap(0.5e-3),
        windings=fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3)),
        material=fm.FroehlichCurve(2000.0, 0.45, 2.0),
        current=4.0,
        tolerance=2e-2,
    )
    return fm.solve(design)


def axes() -> Axes:
    return Figure().add_subplot()


def drawn_line(ax: Axes, label: str) -> np.ndarray:
    (found,) = [line for line in ax.get_lines() if line.get_label() == label]
    return np.array(found.get_data())


def test_a_section_shows_the_dimensions_that_the_field_depends_on(pot_26_16: fm.Design) -> None:
    ax = fm.plot.section_drawing(pot_26_16, axes())
    shown = {text.get_text() for text in ax.texts}
    for text in ("Ø 5.5", "Ø 11.5", "Ø 21.2", "Ø 25.5", "Ø 12.8", "Ø 20", "11", "16.1", "gap 0.5"):
        assert text in shown
    assert "main\n50 turns" in shown
    pieces = replace(pot_26_16, gaps=fm.Gap(0.6e-3, pieces=3))
    texts = {text.get_text() for text in fm.plot.section_drawing(pieces, axes()).texts}
    assert "3 x gap 0.2" in texts


def boxes(ax: Axes, wanted: set[str]) -> list[Bbox]:
    """Return where the texts of an Axes that contain one of `wanted` come out."""
    figure = ax.get_figure()
    assert isinstance(figure, Figure)
    FigureCanvasAgg(figure).draw()
    texts = [text for text in ax.texts if any(name in text.get_text() for name in wanted)]
    return [Text.get_window_extent(text) for text in texts]  # without the line of a label


def test_names_of_thin_windings_stand_clear_of_each_other_and_of_the_copper(
    pot_26_16: fm.Design,
) -> None:
    names = {"primary", "secondary", "third"}
    thin = [
        fm.Winding(5, fm.Block(r, r + 0.3e-3, -4e-3, 4e-3), name=name)
        for name, r in zip(sorted(names), (6.4e-3, 6.9e-3, 7.4e-3), strict=True)
    ]
    ax = fm.plot.section_drawing(replace(pot_26_16, windings=thin), axes())
    found = boxes(ax, {*names, "gap 0.5"})
    assert len(found) == 4
    assert not any(one.overlaps(other) for one, other in combinations(found, 2))
    left = ax.transData.transform((-12.75, 0.0))[0]
    assert all(box.x1 <= left for box in found)


def test_a_map_names_windings_only_where_they_are_wide_enough(result: fm.Result) -> None:
    def names(*edges: float) -> list[str]:
        windings = [
            fm.Winding(1, fm.Block(r0, r1, -4e-3, 4e-3), name=f"{number}")
            for number, (r0, r1) in enumerate(pairwise(edges))
        ]
        shown = replace(result, design=replace(result.design, windings=windings))
        return [text.get_text() for text in fm.plot.flux_map(shown, axes()).texts]

    assert names(6.4e-3, 10e-3) == ["winding 0"]
    assert names(6.4e-3, 6.6e-3, 10e-3) == ["winding 1"]
    assert names(6.4e-3, 6.6e-3, 6.8e-3) == []


def test_the_corners_of_the_window_do_not_set_the_scale_along_a_layer() -> None:
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11.0e-3)
    design = fm.Design(
        core=core, windings=fm.Winding(20), material=fm.FroehlichCurve(2000.0, 0.45, 2.0),
        current=0.5, tolerance=2e-2,
    )  # fmt: skip
    ax = fm.plot.layer_field(fm.solve(design), axes())
    size = drawn_line(ax, "size")[1]
    assert size[20:-20].max() <= ax.get_ylim()[1] < 1.3 * size[20:-20].max()


def test_the_field_across_the_gap_is_the_solvers(result: fm.Result) -> None:
    ax = fm.plot.post_face_field(result, axes())
    radius, b = drawn_line(ax, "middle of the gap")
    assert result.solution is not None
    points = np.stack([1e-3 * radius, np.zeros_like(radius)])
    assert b == pytest.approx(point_fields(result.solution, points).flux_density[1])
    (face,) = [m for m in result.section_means if m.name == "post, at the gap"]
    inside = (radius > 3.5) & (radius < 5.0)
    assert b[inside].mean() == pytest.approx(face.flux_density, rel=0.05)
    assert b[-1] < 0.05 * b[inside].mean()


def test_the_field_along_the_layer_is_symmetric_about_the_gap(result: fm.Result) -> None:
    ax = fm.plot.layer_field(result, axes())
    z, size = drawn_line(ax, "size")
    assert (z[0], z[-1]) == pytest.approx((-4.8, 4.8))
    assert size == pytest.approx(size[::-1], rel=1e-6)
    radial = drawn_line(ax, "radial part")[1]
    assert radial == pytest.approx(-radial[::-1], abs=1e-6 * size.max())
    assert abs(z[np.argmax(size)]) < 0.5
    assert "r = 6.4 mm" in ax.get_ylabel()


def test_the_material_is_marked_where_the_sections_stand(result: fm.Result) -> None:
    ax = fm.plot.material_curve(result, axes())
    for mean in result.section_means:
        (h,), (b,) = drawn_line(ax, f"{mean.name}, {mean.flux_density:.3f} T")
        assert b == mean.flux_density
        assert result.design.material.flux_density(np.array([h])) == pytest.approx(b)
        assert h < ax.get_xlim()[1]


def test_both_bounds_are_drawn_off_the_last_middle() -> None:
    meshes = [MeshStep(100, Bounds(0.9, 1.2)), MeshStep(400, Bounds(0.99, 1.01))]
    ax = fm.plot.convergence(meshes, axes(), 0.01)
    assert drawn_line(ax, "lower bound")[1] == pytest.approx([-10.0, -1.0])
    assert drawn_line(ax, "upper bound")[1] == pytest.approx([20.0, 1.0])
    assert drawn_line(ax, "middle")[1] == pytest.approx([5.0, 0.0])


def test_the_bounds_close_along_the_row_of_meshes(result: fm.Result) -> None:
    meshes, finest = mesh_row(result.design)
    lower, upper = np.array([(s.inductance.lower, s.inductance.upper) for s in meshes]).T
    assert np.all(np.diff(lower) > 0.0)
    assert np.all(np.diff(upper) < 0.0)
    assert meshes[-1].inductance.relative_half_width <= 0.3 * result.design.tolerance
    assert finest.unknowns == meshes[-1].unknowns


def test_figures_need_fields(result: fm.Result) -> None:
    for draw in (fm.plot.post_face_field, fm.plot.layer_field):
        with pytest.raises(ValueError, match="holds no fields"):
            draw(replace(result, solution=None), axes())


@pytest.mark.slow
def test_solve_writes_every_figure_into_a_folder(
    result: fm.Result, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    design = tmp_path / "d.toml"
    design.write_text(fm.design_toml(result.design))
    assert cli.main(["solve", str(design), "--figures", str(tmp_path / "figures")]) == 0
    found = sorted((tmp_path / "figures").iterdir())
    assert [file.name for file in found] == FILES
    for file in found:
        content = file.read_bytes()
        if file.suffix == ".png":
            assert content.startswith(b"\x89PNG")
        else:
            assert ElementTree.fromstring(content).tag.endswith("svg")
    assert cli.main(["solve", str(design), "--figures", str(design)]) == 2
    assert "--figures" in capsys.readouterr().err


def test_equal_figures_give_equal_bytes(result: fm.Result) -> None:
    one, other = (
        fm.plot.figure_bytes(lambda ax: fm.plot.material_curve(result, ax), "svg", (4.0, 3.0))
        for _ in range(2)
    )
    assert one == other
    assert b"post, at the gap" in one
