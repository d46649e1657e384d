from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

import femag as fm
from femag.design import meshed_section, whole_section
from femag.design_file import design_from_toml
from femag.geometry import (
    core_cuts,
    gap_faces,
    gap_permeabilities,
    gap_remanences,
    is_mirror_symmetric,
    polygon_area,
    region_areas,
)
from femag.geometry.gap_faces import FaceShape, area_over_length
from femag.geometry.gaps import post_pieces
from femag.mesh import coarse_mesh

R0, R1 = 2.75e-3, 5.75e-3
"""Hole and post of the pot core 26/16, m."""

SHAPES = [
    fm.Gap(0.5e-3, rim_length=1e-3),
    fm.Gap(0.5e-3, rim_length=0.1e-3),
    fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.1e-3)),
    fm.Gap(0.5e-3, step=fm.Step(8e-3, 1e-3)),
    fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0)),
    fm.Gap(0.5e-3, chamfer=0.3e-3),
    fm.Gap(0.5e-3, edge_radius=0.3e-3),
    fm.Gap(0.5e-3, rim_length=1e-3, chamfer=0.3e-3),
    fm.Gap(0.5e-3, rim_length=1e-3, edge_radius=0.3e-3),
    fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0), edge_radius=0.3e-3),
]
PLACES = [{}, {"pieces": 2}, {"pieces": 3}, {"offset": 2e-3}, {"offset": 5.25e-3}]


def with_gaps(design: fm.Design, *gaps: fm.Gap) -> fm.Design:
    return replace(design, gaps=gaps)


def outline(design: fm.Design, name: str) -> list[tuple[float, float]]:
    """Corners of a region in mm."""
    (region,) = [r for r in whole_section(design).regions if r.name == name]
    return [(round(1e3 * r, 9), round(1e3 * z, 9)) for r, z in region.polygon]


@pytest.mark.parametrize(
    ("gap", "corners"),
    [
        (SHAPES[0], [(2.75, -0.25), (5.75, -0.5), (5.75, 0.5), (2.75, 0.25)]),
        (
            SHAPES[2],
            [
                (2.75, -0.05),
                (4, -0.05),
                (4, -0.25),
                (5.75, -0.25),
                (5.75, 0.25),
                (4, 0.25),
                (4, 0.05),
                (2.75, 0.05),
            ],
        ),
        (SHAPES[4], [(4, 0), (4, -0.25), (5.75, -0.25), (5.75, 0.25), (4, 0.25)]),
        (
            SHAPES[5],
            [(2.75, -0.25), (5.45, -0.25), (5.75, -0.55), (5.75, 0.55), (5.45, 0.25), (2.75, 0.25)],
        ),
    ],
    ids=["taper", "step", "closed step", "chamfer"],
)
def test_both_faces_are_alike(
    pot_26_16: fm.Design, gap: fm.Gap, corners: list[tuple[float, float]]
) -> None:
    assert outline(with_gaps(pot_26_16, gap), "post gap") == corners


def test_at_a_plate_the_plate_stays_flat_and_the_post_takes_the_whole_shape(
    pot_26_16: fm.Design,
) -> None:
    step = fm.Gap(0.5e-3, offset=5.25e-3, step=fm.Step(8e-3, 0.0))
    design = with_gaps(pot_26_16, step)
    assert outline(design, "post gap") == [(4, 5.5), (4, 5), (5.75, 5), (5.75, 5.5)]
    taper = fm.Gap(0.5e-3, offset=-5.25e-3, rim_length=1e-3)
    assert outline(with_gaps(pot_26_16, taper), "post gap") == [
        (2.75, -5.5),
        (5.75, -5.5),
        (5.75, -4.5),
        (2.75, -5.0),
    ]


def test_every_length_is_a_total_over_the_pieces(pot_26_16: fm.Design) -> None:
    """Three pieces of 0.2 mm, 0.4 mm at the rim; a chamfer is cut off every face."""
    gap = fm.Gap(0.6e-3, pieces=3, rim_length=1.2e-3)
    corners = outline(with_gaps(pot_26_16, gap), "post gap 2")
    assert corners == [(2.75, -0.1), (5.75, -0.2), (5.75, 0.2), (2.75, 0.1)]
    chamfered = region_areas(whole_section(with_gaps(pot_26_16, replace(SHAPES[5], pieces=3))))
    plain = region_areas(whole_section(with_gaps(pot_26_16, fm.Gap(0.5e-3, pieces=3))))
    for place in (1, 2, 3):
        more = chamfered[f"post gap {place}"] - plain[f"post gap {place}"]
        assert more == pytest.approx(0.3e-3**2, rel=1e-9)


@pytest.mark.parametrize("place", PLACES, ids=str)
@pytest.mark.parametrize("gap", SHAPES, ids=str)
def test_parts_and_gaps_fill_the_post_without_overlap(
    pot_26_16: fm.Design, gap: fm.Gap, place: dict[str, float]
) -> None:
    """Areas by the polygons, and meshed: the mesh refuses overlaps and wrong areas."""
    design = with_gaps(pot_26_16, replace(gap, **place))
    section = whole_section(design)
    post = sum(polygon_area(r.polygon) for r in section.regions if "post" in r.name)
    assert post == pytest.approx((R1 - R0) * 11e-3, rel=1e-12)
    assert is_mirror_symmetric(section) == ("offset" not in place)
    coarse_mesh(meshed_section(design))


def test_zero_slope_and_zero_edges_are_the_flat_gap(pot_26_16: fm.Design) -> None:
    flat = whole_section(pot_26_16)
    for gap in (fm.Gap(0.5e-3, rim_length=0.5e-3), fm.Gap(0.5e-3, chamfer=0.0, edge_radius=0)):
        assert whole_section(with_gaps(pot_26_16, gap)) == flat


@pytest.mark.parametrize("slope", [0.0, 0.3, -0.5])
@pytest.mark.parametrize("facets", [2, 3, 8])
def test_a_rounded_edge_keeps_the_area_that_a_circle_leaves(
    monkeypatch: pytest.MonkeyPatch, slope: float, facets: int
) -> None:
    """Corner of opening angle a: kite R^2 cot(a/2) less sector R^2 (pi - a)/2 is cut off."""
    monkeypatch.setattr(gap_faces, "EDGE_FACETS", facets)
    radius, width = 1e-3, 4e-3
    face = FaceShape(taper=slope * width, edge_radius=radius).depths(1e-3, 5e-3, 1.0)
    corner = np.pi / 2 + np.arctan(slope)
    cut = radius**2 * (1 / np.tan(corner / 2) - (np.pi - corner) / 2)
    below = polygon_area((*face, (5e-3, 9e-3), (1e-3, 9e-3)))
    sharp = 4e-3 * 9e-3 - slope * width**2 / 2
    assert sharp - below == pytest.approx(cut, rel=1e-9)


def test_area_over_length_is_its_integral() -> None:
    """Cone of a solid post in closed form, 2 pi [R/b - (a/b^2) ln(1 + b R/a)] for l = a + b r."""
    a, b, radius = 0.5e-3, 0.1, 5e-3

    def faces(length: float, rim: float) -> tuple[tuple, tuple]:
        return ((0.0, 0.0), (radius, 0.0)), ((0.0, length), (radius, rim))

    exact = 2 * np.pi * (radius / b - a / b**2 * np.log1p(b * radius / a))
    assert area_over_length(*faces(a, a + b * radius)) == pytest.approx(exact, rel=1e-12)
    for rim in (a, a * (1 + 3e-6), a * (1 + 3e-5), 100 * a):
        integral, _ = quad(lambda r, rim=rim: 2 * np.pi * r / (a + (rim - a) * r / radius), 0, 5e-3)
        assert area_over_length(*faces(a, rim)) == pytest.approx(integral, rel=1e-9)


def test_area_over_length_of_a_step_is_the_sum_of_both_rings(pot_26_16: fm.Design) -> None:
    inside, outside = np.pi * (4e-3**2 - R0**2), np.pi * (R1**2 - 4e-3**2)
    for length, wanted in ((0.1e-3, inside / 0.1e-3), (0.0, 0.0)):
        (piece,) = post_pieces((fm.Gap(0.5e-3, step=fm.Step(8e-3, length)),), 11e-3)
        found = piece.area_over_length(R0, R1)
        assert found == pytest.approx(outside / 0.5e-3 + wanted, rel=1e-12)


@pytest.mark.parametrize(
    ("gap", "height"),
    [
        (SHAPES[0], 0.5),
        (SHAPES[1], 0.25),
        (SHAPES[3], 0.5),
        (SHAPES[5], 0.55),
        (replace(SHAPES[2], pieces=2), 2.875),
        (replace(SHAPES[5], offset=-5.25e-3), -4.7),
    ],
    ids=str,
)
def test_the_cut_at_the_gap_goes_through_the_whole_post(
    pot_26_16: fm.Design, gap: fm.Gap, height: float
) -> None:
    cut = core_cuts(pot_26_16.core, (gap,))[0]
    assert (1e3 * cut.start[1], 1e3 * cut.end[1]) == pytest.approx((height, height))
    assert cut.area == pytest.approx(np.pi * (R1**2 - R0**2))


def test_a_magnet_fills_every_piece_and_both_legs(pot_26_16: fm.Design) -> None:
    """The flux of a positive current rises in the post and falls in the ring."""
    magnet = fm.Magnet(0.4, 1.1)

    def found(*gaps: fm.Gap) -> tuple[dict[str, float], dict[str, float]]:
        core = pot_26_16.core
        return dict(gap_permeabilities(core, gaps)), dict(gap_remanences(core, gaps))

    names = ("post gap 1", "post gap 2")
    assert found(fm.Gap(0.5e-3, pieces=2, magnet=magnet)) == (
        dict.fromkeys(names, 1.1),
        dict.fromkeys(names, 0.4),
    )
    spacer = fm.Gap(0.4e-3, "all", magnet=magnet)
    assert found(spacer)[1] == {"post gap": 0.4, "ring gap": -0.4}
    assert found(spacer, fm.Gap(0.5e-3, offset=2e-3))[1] == {"post gap 1": 0.4, "ring gap": -0.4}
    assert found(spacer, fm.Gap(0.5e-3, magnet=magnet))[1] == {"post gap": 0.4, "ring gap": -0.4}


@pytest.mark.parametrize(
    ("make", "key"),
    [
        (lambda: fm.Gap(1e-3, rim_length=0.0), "gap.rim_length"),
        (lambda: fm.Gap(1e-3, rim_length="2 mm"), "gap.rim_length"),
        (lambda: fm.Gap(1e-3, rim_length=np.inf), "gap.rim_length"),
        (lambda: fm.Step(0.0, 1e-3), "gap.step.diameter"),
        (lambda: fm.Step(6e-3, -1e-3), "gap.step.length"),
        (lambda: fm.Step(6e-3, np.nan), "gap.step.length"),
        (lambda: fm.Gap(1e-3, step=(6e-3, 1e-3)), "gap.step"),
        (lambda: fm.Gap(1e-3, chamfer=-1e-3), "gap.chamfer"),
        (lambda: fm.Gap(1e-3, edge_radius=np.nan), "gap.edge_radius"),
        (lambda: fm.Gap(1e-3, rim_length=2e-3, step=fm.Step(6e-3, 0.0)), "gap.step"),
        (lambda: fm.Gap(1e-3, chamfer=1e-4, edge_radius=1e-4), "gap.edge_radius"),
        (lambda: fm.Gap(1e-3, "all", rim_length=2e-3), "gap.rim_length"),
        (lambda: fm.Gap(1e-3, "all", step=fm.Step(6e-3, 0.0)), "gap.step"),
        (lambda: fm.Gap(1e-3, "all", chamfer=1e-4), "gap.chamfer"),
        (lambda: fm.Gap(1e-3, "all", edge_radius=1e-4), "gap.edge_radius"),
        (lambda: fm.Magnet(0.0), "gap.magnet.remanence"),
        (lambda: fm.Magnet(2.5), "gap.magnet.remanence"),
        (lambda: fm.Magnet("0.4 T"), "gap.magnet.remanence"),
        (lambda: fm.Magnet(0.4, 0.9), "gap.magnet.recoil_permeability"),
        (lambda: fm.Gap(1e-3, magnet=0.4), "gap.magnet"),
        (lambda: fm.Gap(1e-3, permeability=2.0, magnet=fm.Magnet(0.4)), "gap.permeability"),
    ],
)
def test_shapes_and_magnets_that_make_no_sense_are_refused(
    make: Callable[[], object], key: str
) -> None:
    with pytest.raises(fm.InputError) as caught:
        make()
    assert caught.value.key == key
    assert caught.value.accepted


SPACER = fm.Gap(0.4e-3, "all")


@pytest.mark.parametrize(
    ("gaps", "key", "problem"),
    [
        ((fm.Gap(0.5e-3, step=fm.Step(5e-3, 0.1e-3)),), "gap.step.diameter", "outside of the face"),
        ((fm.Gap(0.5e-3, step=fm.Step(12e-3, 0.1e-3)),), "gap.step.diameter", "outside of the"),
        (
            (fm.Gap(0.5e-3, step=fm.Step(11.2e-3, 0.1e-3), chamfer=0.2e-3),),
            "gap.step.diameter",
            "outside of the face",
        ),
        ((fm.Gap(0.5e-3, chamfer=3e-3),), "gap.chamfer", "nothing of the face is left"),
        ((fm.Gap(0.5e-3, edge_radius=3.1e-3),), "gap.edge_radius", "nothing of the face is left"),
        ((fm.Gap(0.5e-3, rim_length=7e-3, chamfer=1e-4),), "gap.chamfer", "steeper"),
        ((fm.Gap(0.5e-3, rim_length=11e-3),), "gap.rim_length", "leave no post"),
        ((fm.Gap(0.5e-3, step=fm.Step(8e-3, 11e-3)),), "gap.step.length", "leave no post"),
        ((fm.Gap(0.5e-3, offset=5e-3, chamfer=0.3e-3),), "gap.chamfer", "leave no post"),
        ((fm.Gap(8e-3, pieces=4, edge_radius=0.5e-3),), "gap.edge_radius", "leave no post"),
        ((SPACER, fm.Gap(0.5e-3, rim_length=1e-3)), "gap.1.rim_length", "faces are flat"),
        ((SPACER, fm.Gap(0.5e-3, chamfer=1e-4)), "gap.1.chamfer", "faces are flat"),
        ((SPACER, fm.Gap(0.5e-3, offset=1e-3, chamfer=0.6e-3)), "gap.1.chamfer", "leave no post"),
        ((SPACER, fm.Gap(0.5e-3, magnet=fm.Magnet(0.4))), "gap.1.magnet", "one gap in the post"),
    ],
)
def test_shapes_that_do_not_fit_are_refused(
    pot_26_16: fm.Design, gaps: tuple[fm.Gap, ...], key: str, problem: str
) -> None:
    with pytest.raises(fm.InputError, match=problem) as caught:
        with_gaps(pot_26_16, *gaps)
    assert caught.value.key == key
    assert caught.value.accepted
    assert "\n" not in str(caught.value)


def test_a_shaped_gap_off_the_middle_beside_a_spacer_is_accepted(pot_26_16: fm.Design) -> None:
    design = with_gaps(pot_26_16, SPACER, fm.Gap(0.5e-3, offset=2e-3, rim_length=1e-3))
    assert outline(design, "post gap 1") == [(2.75, -0.2), (5.75, -0.2), (5.75, 0.2), (2.75, 0.2)]
    assert outline(design, "post gap 2")[1:3] == [(5.75, 1.5), (5.75, 2.5)]


FILE_GAPS = {
    """length = "0.5 mm"
rim_length = "1 mm"
chamfer = "0.3 mm"
""": fm.Gap(0.5e-3, rim_length=1e-3, chamfer=0.3e-3),
    """length = "0.5 mm"
step = { diameter = "8 mm", length = "0 mm" }
edge_radius = "12 mil"
""": fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0), edge_radius=0.3048e-3),
    """length = "0.5 mm"
magnet = { remanence = "-4000 G", recoil_permeability = 1.1 }
""": fm.Gap(0.5e-3, magnet=fm.Magnet(-0.4, 1.1)),
    """length = "0.5 mm"
leg = "all"
magnet = { remanence = "0.4 T" }
""": fm.Gap(0.5e-3, "all", magnet=fm.Magnet(0.4, 1.05)),
}


def file_with(design: fm.Design, table: str) -> str:
    return fm.design_toml(with_gaps(design)).replace("gap = []\n", "") + "[[gap]]\n" + table


@pytest.mark.parametrize(("table", "gap"), FILE_GAPS.items(), ids=range(len(FILE_GAPS)))
def test_shapes_and_magnets_are_read_and_written(
    pot_26_16: fm.Design, table: str, gap: fm.Gap
) -> None:
    design = with_gaps(pot_26_16, gap)
    assert design_from_toml(file_with(pot_26_16, table)) == design
    assert design_from_toml(fm.design_toml(design)) == design


def test_only_shapes_that_there_are_are_written(pot_26_16: fm.Design) -> None:
    plain = fm.design_toml(pot_26_16)
    for key in ("rim_length", "step", "chamfer", "edge_radius", "magnet"):
        assert f"{key} =" not in plain


@pytest.mark.parametrize(
    ("good", "bad", "line"),
    [
        ('rim_length = "1 mm"', 'rim_length = "0 mm"', "gap.rim_length = '0 mm': the rim_length"),
        ('rim_length = "1 mm"', "rim_length = 1", "gap.rim_length = 1: the unit is missing"),
        ('"0.3 mm"', '"4 mm"', "gap.chamfer = '4 mm': nothing of the face is left"),
        ('rim_length = "1 mm"', "step = 3", "gap.step = 3: not usable; accepted: a table such as"),
        (
            'rim_length = "1 mm"',
            'step = { diameter = "2 mm", length = "0 mm" }',
            "gap.step.diameter = '2 mm': the step lies outside of the face",
        ),
        (
            'rim_length = "1 mm"',
            'step = { diameter = "8 mm" }',
            "gap.step.length: missing; accepted: a length",
        ),
        (
            'rim_length = "1 mm"',
            'magnet = { remanence = "5 T" }',
            "gap.magnet.remanence = '5 T': remanence out of range",
        ),
        (
            'rim_length = "1 mm"',
            "magnet = { remanence = 0.4 }",
            "gap.magnet.remanence = 0.4: the unit is missing",
        ),
        (
            'rim_length = "1 mm"',
            'permeability = 1\nmagnet = { remanence = "0.4 T" }',
            "gap.permeability = 1: stands beside a magnet",
        ),
        ("rim_length", "rim_lenght", "gap.rim_lenght: unknown key; accepted: nearest known key"),
    ],
)
def test_bad_shapes_in_a_file_get_one_line(
    pot_26_16: fm.Design, good: str, bad: str, line: str
) -> None:
    table = next(iter(FILE_GAPS))
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(file_with(pot_26_16, table.replace(good, bad, 1)))
    assert str(caught.value).startswith(line)
    assert "\n" not in str(caught.value)
