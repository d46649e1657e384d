from dataclasses import replace
from functools import cache

import mpmath
import numpy as np
import pytest
from scipy.optimize import brentq

from femag.errors import InputError
from femag.hand import FORMULAS, Formula, GapShape, block_permeance
from femag.hand import fringing as forms
from femag.units import MU_0

POST = GapShape(0.5e-3, 5.75e-3, 0.0, 5.5e-3)
HOLED = replace(POST, inner_radius=2.75e-3)
RING = GapShape(0.5e-3, 12.75e-3, 10.6e-3, 5.75e-3, "ring")
BY_NAME = {formula.name: formula for formula in FORMULAS}

formulas = pytest.mark.parametrize("formula", FORMULAS, ids=lambda formula: formula.name)

# Benchmark between two round posts of ideal iron, plates at h = a, winding uniform over the
# height: computed for this project with corner-adapted mode matching, upper and lower bounds
# 2e-9 apart. Return wall at a/b, gap g/a, F_w (inductance of a sheet on the post), F_root (flux
# of the post at the plate).
BENCHMARK = np.array(
    [
        (0.4, 0.02, 1.056824170, 1.06720543),
        (0.4, 0.05, 1.112630415, 1.13857274),
        (0.4, 0.1, 1.180302087, 1.23210911),
        (0.4, 0.2, 1.269361987, 1.37235133),
        (0.4, 0.5, 1.365894956, 1.61224970),
        (0.55, 0.02, 1.056976215, 1.06750867),
        (0.55, 0.05, 1.113009720, 1.13932962),
        (0.55, 0.1, 1.181054940, 1.23361430),
        (0.55, 0.2, 1.270822157, 1.37529351),
        (0.55, 0.5, 1.368819900, 1.61848551),
    ]
)

# Excess flux of a block's corner at distance s over the mirror plane, face and side up to l, per
# length over mu0 times the potential between corner and plane: computed for this project with
# the Schwarz-Christoffel map. Columns l/s, flux.
CORNER = (
    (0.5, 0.6722303809),
    (1.0, 0.8887116125),
    (2.0, 1.167328103),
    (5.0, 1.6198869407),
    (10.0, 2.0083134387),
    (20.0, 2.4207454772),
)


def corner_excess(side: float) -> float:
    """The same by the map itself: l/s = (2/pi)(t - atan t), flux = (2 + ln((1 + t^2)/4))/pi."""
    t = brentq(lambda t: 2 / np.pi * (t - np.arctan(t)) - side, 0.0, 10.0 + 4 * side, rtol=1e-14)
    return float((2.0 + np.log((1.0 + t**2) / 4)) / np.pi)


def block_edges(ratio: float) -> float:
    """Edge term of the block formula over mu0 for h/l = ratio."""
    width = 7.0
    return block_permeance(width, 1.0, ratio) / MU_0 - width / 2


@cache
def disc_factor(separation: float) -> float:
    """Permeance of two thin discs over their block's, by Love's integral equation."""
    node, weight = np.polynomial.legendre.leggauss(300)
    x, weight = (1 + node) / 2, weight / 2
    distances = x[:, None] - x, x[:, None] + x
    kernel = sum(separation / (separation**2 + distance**2) for distance in distances)
    density = np.linalg.solve(np.eye(x.size) - kernel * weight / np.pi, np.ones_like(x))
    return float(4 * (weight @ density) * separation / np.pi)


@pytest.mark.parametrize(("side", "flux"), CORNER)
def test_map_of_the_corner_gives_the_reference(side: float, flux: float) -> None:
    assert corner_excess(side) == pytest.approx(flux, abs=1e-9)


@pytest.mark.parametrize(("ratio", "error"), [(1.5, "10"), (3.0, "1.3"), (10.0, ".07")])
def test_block_formula_against_the_exact_corner(ratio: float, error: str) -> None:
    """Per cent of the edge term to the digits in the project's notes."""
    found = 100 * (block_edges(ratio) / corner_excess(ratio - 1.0) - 1.0)
    decimals = len(error.partition(".")[2])
    assert round(found, decimals) == float(error)


def test_block_formula_is_asymptotically_exact() -> None:
    assert block_edges(1000.0) == pytest.approx(corner_excess(999.0), rel=1e-6)


@pytest.mark.parametrize(
    ("side", "error"), [(2.0, 4.5), (5.0, 2.5), (10.0, 1.9), (20.0, 1.5), (100.0, 1.1)]
)
def test_probable_paths_of_a_straight_edge_against_the_exact_corner(
    side: float, error: float
) -> None:
    """As measured, in per cent of the edge term."""
    gap = GapShape(2.0, 1e7, 0.0, 1.0 + side)
    edge = (forms.probable_flux_paths(gap) - 1.0) * gap.area / (gap.length * gap.perimeter)
    assert 100 * (edge / (corner_excess(side) / 2) - 1) == pytest.approx(error, abs=0.05)


@pytest.mark.parametrize(
    ("gap_over_radius", "excess_error"),
    [(0.02, 1.4), (0.05, 1.9), (0.1, 2.6), (0.2, 4.3), (0.5, 11.0)],
)
def test_round_edge_against_the_flux_of_a_post(gap_over_radius: float, excess_error: float) -> None:
    """Root flux of the benchmark, whose edge has the winding's potential instead of a constant.

    F - 1 as measured, in per cent, the mean of both walls.
    """
    factor = forms.round_edge(GapShape(gap_over_radius, 1.0, 0.0, 1.0))
    for _, _, _, root in BENCHMARK[BENCHMARK[:, 1] == gap_over_radius]:
        assert 100 * ((factor - 1.0) / (root - 1.0) - 1.0) == pytest.approx(excess_error, abs=0.65)


@pytest.mark.parametrize(
    ("gap_over_radius", "error"),
    [(0.02, 1.1), (0.05, 2.6), (0.1, 4.9), (0.2, 9.4), (0.5, 23.1)],
)
def test_round_edge_overstates_the_inductance_of_a_sheet_on_the_post(
    gap_over_radius: float, error: float
) -> None:
    """F over F_w as measured, in per cent."""
    factor = forms.round_edge(GapShape(gap_over_radius, 1.0, 0.0, 1.0))
    for _, _, sheet, _ in BENCHMARK[BENCHMARK[:, 1] == gap_over_radius]:
        assert 100 * (factor / sheet - 1.0) == pytest.approx(error, abs=0.2)


@pytest.mark.parametrize("row", BENCHMARK[BENCHMARK[:, 1] == 0.02], ids=lambda row: f"{row[0]}")
def test_gap_of_a_hundredth_of_the_post_fringes_under_six_per_cent(row: np.ndarray) -> None:
    """The limit of the estimate without fringing: gap = leg/100 is g/a = 0.02."""
    assert 0.05 < row[2] - 1.0 < 0.06


@pytest.mark.parametrize(
    ("separation", "error"), [(0.02, 0.06), (0.05, 0.27), (0.1, 0.80), (0.2, 2.26)]
)
def test_disc_edge_against_loves_integral_equation(separation: float, error: float) -> None:
    """The shortfall as measured, in per cent."""
    factor = forms.disc_edge(GapShape(separation, 1.0, 0.0, 1.0))
    assert 100 * (1 - factor / disc_factor(separation)) == pytest.approx(error, abs=0.006)


@pytest.mark.parametrize("separation", [0.02, 0.05, 0.1])
def test_disc_edge_lacks_the_next_term_of_the_discs_expansion(separation: float) -> None:
    """Leppington and Levine 1970, from memory: (l/(2 pi r))^2 (ln^2(16 pi r/l) - 2) in F."""
    factor = forms.disc_edge(GapShape(separation, 1.0, 0.0, 1.0))
    term = (separation / (2 * np.pi)) ** 2 * (np.log(16 * np.pi / separation) ** 2 - 2.0)
    assert disc_factor(separation) - factor == pytest.approx(term, rel=0.02)


# Gap columns of one maker's published data sheets, which follow from the formula with the
# catalogue's A_e, l_e and initial permeability; values as recorded in the project's notes.
# mm2, mm, mu_i, window height in mm; then gap in mm and AL in nH.
POT_22_13 = (63.4, 31.5, 750.0, 9.4)
RM_12 = (146.0, 56.6, 2300.0, 17.1)


@pytest.mark.parametrize(
    ("core", "gap", "al"),
    [
        *((POT_22_13, gap, al) for gap, al in ((3.36, 40), (1.89, 63), (1.04, 100), (0.57, 160))),
        *((RM_12, *row) for row in ((1.57, 160), (0.9, 250), (0.68, 315), (0.51, 400), (0.3, 630))),
    ],
)
def test_logarithm_of_height_gives_a_published_gap_column(
    core: tuple[float, float, float, float], gap: float, al: float
) -> None:
    area, length, permeability, window = core
    shape = GapShape(gap * 1e-3, np.sqrt(area / np.pi) * 1e-3, 0.0, window / 2 * 1e-3)
    reluctance = gap / forms.logarithm_of_height(shape) + length / permeability
    assert MU_0 * area * 1e-3 / reluctance == pytest.approx(al * 1e-9, rel=0.01)


@pytest.mark.parametrize(
    ("name", "factor"),
    [
        ("no fringing", 1.0),
        ("gap added to diameter", 12.0**2 / 11.5**2),
        ("side path ratio (1, 2)", 1 + 4 * 0.5 * 12.0 / (2 * 11.5**2)),
        ("logarithm of height", 1 + 0.5 / (np.sqrt(np.pi) * 5.75) * np.log(44.0)),
        ("long block, squared", (1 + 2 / np.pi * (1 + np.log(5.5 * np.pi)) * 0.5 / 11.5) ** 2),
        ("round edge", 1 + 2 * 0.5 * (1 + np.log(5.5 * np.pi)) / (np.pi * 5.75)),
        ("disc in open space", 1 + 0.5 * (np.log(16 * np.pi * 11.5) - 1) / (np.pi * 5.75)),
        (
            "probable flux paths",
            1 + 1 / (np.pi * 5.75**2 * 2)
            * 2 * np.pi * (0.26 * 5.875 + np.log(22.0) / np.pi * (5.75 + 5.75 / 4)),
        ),
    ],
)  # fmt: skip
def test_solid_post_of_11_5_mm_by_the_written_formula(name: str, factor: float) -> None:
    """Gap 0.5 mm, window 11 mm; our arithmetic from the formulas as cited."""
    assert BY_NAME[name].factor(POST) == pytest.approx(factor, rel=1e-12)


@formulas
@pytest.mark.parametrize("shape", [POST, HOLED, RING], ids=["post", "holed", "ring"])
def test_a_vanishing_gap_has_no_fringing(formula: Formula, shape: GapShape) -> None:
    assert formula.factor(replace(shape, length=1e-12)) == pytest.approx(1.0, abs=1e-7)


@formulas
@pytest.mark.parametrize("length", [0.01e-3, 0.5e-3, 3e-3, 10.9e-3])
@pytest.mark.parametrize("shape", [POST, HOLED], ids=["post", "holed"])
def test_fringing_never_lowers_the_permeance(
    formula: Formula, shape: GapShape, length: float
) -> None:
    factor = formula.factor(replace(shape, length=length))
    assert factor == 1.0 if formula.name == "no fringing" else factor > 1.0


@formulas
def test_a_long_thin_post_still_has_a_factor_of_at_least_one(formula: Formula) -> None:
    assert formula.factor(GapShape(100.0, 1.0, 0.0, 50.1)) >= 1.0


@formulas
@pytest.mark.parametrize("shape", [POST, HOLED, RING], ids=["post", "holed", "ring"])
def test_factor_does_not_depend_on_the_scale(formula: Formula, shape: GapShape) -> None:
    scaled = GapShape(
        *(37.0 * size for size in (shape.length, shape.outer_radius, shape.inner_radius)),
        37.0 * shape.half_height,
        shape.leg,
    )
    assert formula.factor(scaled) == pytest.approx(formula.factor(shape), rel=1e-12)
    assert formula.in_range(scaled) == formula.in_range(shape)


@pytest.mark.parametrize(
    "name",
    [name for name in BY_NAME if name not in ("no fringing", "logarithm of height", "round edge")],
)
def test_a_hole_takes_from_the_block_and_leaves_the_outer_edge(name: str) -> None:
    formula = BY_NAME[name]
    excess = [(formula.factor(gap) - 1.0) * gap.area for gap in (POST, HOLED)]
    assert excess[1] == pytest.approx(excess[0], rel=1e-12)
    assert HOLED.area < POST.area


def test_reach_of_a_hole_is_that_of_its_fourier_bessel_field() -> None:
    """Reference library: mpmath, quadrature of the definition beside the constant."""

    def ratio(x: mpmath.mpf) -> mpmath.mpf:
        return mpmath.besseli(1, x) / (x * mpmath.besseli(0, x))

    near = mpmath.quad(ratio, [0, 1])
    far = mpmath.quad(lambda x: ratio(x) - 1 / x, [1, 10, 100, mpmath.inf])
    reach = float(mpmath.exp(near + far - mpmath.euler))
    assert reach == pytest.approx(forms.HOLE_REACH, rel=1e-5)


def test_a_hole_adds_its_own_edge_to_the_round_edge_form() -> None:
    excess = [(forms.round_edge(gap) - 1.0) * gap.area / gap.length for gap in (POST, HOLED)]
    edge = 1 + np.log(np.pi * forms.HOLE_REACH * 2.75 / (2 * 0.5))
    assert excess[1] - excess[0] == pytest.approx(2 * 2.75e-3 * edge, rel=1e-12)
    pinhole = replace(POST, inner_radius=0.1e-3)
    assert (forms.round_edge(pinhole) - 1.0) * pinhole.area == pytest.approx(
        excess[0] * POST.length, rel=1e-12
    )


@pytest.mark.parametrize(
    "name",
    ["gap added to diameter", "side path ratio (1, 2)", "round edge", "long block, squared"],
)
def test_a_wide_thin_ring_fringes_like_a_straight_bar(name: str) -> None:
    """Two straight edges on a bar as wide as the ring is thick; curvature cancels between them."""
    gap, width, half = 0.5, 2.0, 5.0
    bar = {
        "gap added to diameter": 1 + gap / width,
        "side path ratio (1, 2)": 1 + 2 * gap / (2 * width),
        "round edge": 1 + 2 * gap / width / np.pi * (1 + np.log(np.pi * half / (2 * gap))),
    }
    bar["long block, squared"] = bar["round edge"]
    ring = GapShape(gap, 1e6 + width / 2, 1e6 - width / 2, half, "ring")
    assert BY_NAME[name].factor(ring) == pytest.approx(bar[name], rel=1e-6)


@pytest.mark.parametrize("name", ["logarithm of height", "disc in open space"])
def test_formulas_for_posts_leave_a_ring_unfringed_and_out_of_range(name: str) -> None:
    assert BY_NAME[name].factor(RING) == 1.0
    assert not BY_NAME[name].in_range(RING)


@pytest.mark.parametrize(
    ("name", "inside", "outside"),
    [
        ("no fringing", replace(POST, length=0.11e-3), replace(POST, length=0.12e-3)),
        ("gap added to diameter", replace(POST, length=2.2e-3), replace(POST, length=2.4e-3)),
        ("side path ratio (1, 2)", replace(POST, length=2.2e-3), replace(POST, length=2.4e-3)),
        ("probable flux paths", replace(POST, length=2.2e-3), replace(POST, length=2.4e-3)),
        ("probable flux paths", replace(RING, length=0.4e-3), RING),
        ("long block, squared", replace(POST, length=3.6e-3), replace(POST, length=3.7e-3)),
        ("long block, squared", POST, HOLED),
        ("long block, squared", replace(RING, length=3.8e-3), replace(RING, length=3.9e-3)),
        ("round edge", replace(POST, length=1.1e-3), replace(POST, length=1.2e-3)),
        ("round edge", replace(POST, half_height=0.8e-3), replace(POST, half_height=0.7e-3)),
        ("disc in open space", replace(POST, half_height=6e-3), POST),
    ],
)
def test_range_ends_where_it_says(name: str, inside: GapShape, outside: GapShape) -> None:
    assert BY_NAME[name].in_range(inside)
    assert not BY_NAME[name].in_range(outside)


def test_names_and_ranges_fit_a_table() -> None:
    assert len(BY_NAME) == len(FORMULAS)
    for formula in FORMULAS:
        assert len(formula.name) <= 22
        assert len(formula.range) <= 26
        assert formula.source


@pytest.mark.parametrize(
    "sizes",
    [
        (0.0, 5.0, 0.0, 5.0),
        (-1.0, 5.0, 0.0, 5.0),
        (10.0, 5.0, 0.0, 5.0),
        (1.0, 5.0, 5.0, 5.0),
        (1.0, 5.0, -1.0, 5.0),
        (np.nan, 5.0, 0.0, 5.0),
        (1.0, 5.0, 0.0, np.inf),
    ],
)
def test_an_impossible_gap_is_refused(sizes: tuple[float, float, float, float]) -> None:
    with pytest.raises(InputError, match="not a gap"):
        GapShape(*sizes)
