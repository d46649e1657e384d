"""Fields of single turns against closed forms, and against the same turns as blocks.

A core of permeability 1 is air, so that classical formulas for coils in open space hold.
"""

from collections.abc import Callable
from dataclasses import replace
from math import gamma, log, pi

import numpy as np
import pytest
from scipy.special import ellipe, ellipk

import femag as fm
from femag.design import MOST_SINGLE_TURNS, meshed_section, turns_per_area, wound_coils
from femag.geometry import region_areas

MU_0 = 4e-7 * pi
AIR = fm.LinearCurve(1.0)
SLOW = pytest.mark.slow

ROSA = 0.13806
"""ln of the mean geometric distances of a square of side 1 and a circle of diameter 1, 0.44705 and
exp(-1/4)/2: Rosa's constant for the self-inductance of a turn; Rosa and Grover 1912, from memory.
"""

LATTICE = log(2) + 1 / 4 + pi / 6 - log(2 * pi * (gamma(1 / 4) / (2 * pi**0.75)) ** 2)
"""The same with all neighbours of a turn in an endless square lattice, 0.15621.

Derived here. A unit line current at each point of a square lattice of pitch p in a uniform counter
current has, without its own logarithm, the potential -ln(2 pi eta(i)^2) in units of p at each
point, with Dedekind's eta(i) = gamma(1/4)/(2 pi^(3/4)); wires of radius a add 1/4 + pi a^2/(2 p^2)
for their thickness. A block's own potential is higher at a wire than its mean over the wire's
square by pi/6 - pi a^2/(2 p^2).
"""


@pytest.fixture
def large_ring() -> fm.Design:
    """A winding of 3.5 mm by 3.5 mm round a post of 60 mm: nearly straight wires. Invented."""
    core = fm.PotCore(
        outer_diameter=90e-3, window_diameter=70e-3, post_diameter=60e-3, height=8e-3,
        window_height=4.4e-3,
    )  # fmt: skip
    return fm.Design(core=core, windings=fm.Winding(1), material=AIR, detail="turn")


def with_wire(design: fm.Design, turns: int, conductor: object, **former: float) -> fm.Design:
    winding = fm.Winding(turns, conductor=conductor, former=fm.Former(**former))
    return replace(design, windings=winding)


def difference(design: fm.Design, tolerance: float) -> tuple[float, float]:
    """Return L by turns less L by blocks in H, and what the bounds leave open of it."""
    turn, block = (
        fm.solve(replace(design, detail=detail), tolerance=tolerance).inductance
        for detail in ("turn", "block")
    )
    return turn.value - block.value, turn.half_width + block.half_width


def classical_difference(design: fm.Design, constant: float) -> float:
    """Return Rosa's correction in H: mu0/(2 pi) of length times ln(pitch/diameter) + constant."""
    coil = wound_coils(design)[0]
    wire = coil.winding.conductor
    log_ratio = log(wire.radial_size / wire.diameter)
    return MU_0 / (2 * pi) * coil.wire_length * (log_ratio + constant)


def filaments_mutual(r: np.ndarray, s: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Return Maxwell's mutual inductance in H of coaxial circles of radii r and s, z apart."""
    m = 4 * r * s / ((r + s) ** 2 + z**2)
    k = np.sqrt(m)
    return np.asarray(MU_0 * np.sqrt(r * s) * ((2 / k - k) * ellipk(m) - 2 / k * ellipe(m)))


def coaxial_rings_inductance(positions: np.ndarray, a: float) -> float:
    """Return the inductance in H of rings of round wire of radius a in series in open space.

    Self: uniform current, mu0 R ((1 + a^2/8R^2) ln(8 R/a) + a^2/24R^2 - 7/4), Rayleigh and Niven,
    in Rosa and Grover 1912, from memory. Mutual: Maxwell's elliptic integrals between the centres,
    and what the wires' thickness adds to second order: r A of a ring obeys
    (d2/dr2 + d2/dz2) rA = 1/r d/dr rA, so that its mean over a disc is rA + a^2/8 of that.
    """
    r, z = positions.T
    thick = (a / r) ** 2
    own = MU_0 * r * ((1 + thick / 8) * np.log(8 * r / a) + thick / 24 - 7 / 4)
    i, j = np.nonzero(~np.eye(len(r), dtype=bool))
    r, s, z = r[i], r[j], z[i] - z[j]
    h = 1e-4 * r
    slope = (filaments_mutual(r + h, s, z) - filaments_mutual(r - h, s, z)) / (2 * h)
    mutual = filaments_mutual(r, s, z) + 2 * a**2 / 8 * slope / r
    return float(own.sum() + mutual.sum())


def mean_log_distance(i: int, j: int) -> float:
    """Return the mean of ln |x - y| over two unit squares i and j squares apart."""
    nodes, weights = np.polynomial.legendre.leggauss(40)
    half, share = (nodes + 1) / 2, weights / 2
    offset = np.concatenate([-half[::-1], half])
    tent = np.concatenate([share[::-1], share]) * (1 - np.abs(offset))
    distance = np.hypot(i + offset[:, None], j + offset[None, :])
    return float(tent @ np.log(distance) @ tent)


def test_the_constants_are_sums_of_mean_distances() -> None:
    """A turn alone, then with all neighbours that are nearer than 15 pitches."""
    alone = mean_log_distance(0, 0) + log(2) + 1 / 4
    assert alone == pytest.approx(ROSA, abs=2e-5)
    reach = range(-15, 16)
    others = [(i, j) for i in reach for j in reach if (i, j) != (0, 0)]
    with_others = alone + sum(mean_log_distance(i, j) - log(np.hypot(i, j)) for i, j in others)
    assert with_others == pytest.approx(LATTICE, abs=2e-5)


@pytest.mark.parametrize("turns", [1, 4, 24])
def test_turns_in_air_are_coaxial_rings(pot_26_16: fm.Design, turns: int) -> None:
    """Wires of 0.6 mm round 6 to 9 mm, closed form to second order in their thickness."""
    air = replace(pot_26_16, material=AIR, detail="turn")
    design = with_wire(air, turns, fm.RoundWire(0.6e-3, 0.2e-3), wall=0.6e-3, flange=0.6e-3)
    bounds = fm.solve(design, tolerance=1e-4).inductance
    positions = wound_coils(design)[0].layers[0].positions
    assert bounds.value == pytest.approx(coaxial_rings_inductance(positions, 0.3e-3), rel=2e-4)


@pytest.mark.parametrize("diameter", [pytest.param(0.2e-3, marks=SLOW), 0.4e-3, 0.5e-3])
def test_turns_and_block_differ_by_rosas_correction(large_ring: fm.Design, diameter: float) -> None:
    """49 turns of pitch 0.5 mm in air: between a turn alone and an endless lattice."""
    wire = fm.RoundWire(diameter, (0.5e-3 - diameter) / 2)
    design = with_wire(large_ring, 49, wire, wall=0.5e-3, flange=0.45e-3)
    assert wound_coils(design)[0].layers[0].turns_in_layers == (7,) * 7
    measured, open_part = difference(design, 3e-5)
    assert open_part < 0.03 * measured
    assert classical_difference(design, ROSA) < measured < classical_difference(design, LATTICE)
    assert measured == pytest.approx(classical_difference(design, LATTICE), rel=0.02)


def test_the_correction_holds_in_a_gapped_core(large_ring: fm.Design) -> None:
    """Mirror images of the block in the core change it by a few per cent; 2.7 % are measured."""
    gapped = replace(large_ring, material=fm.LinearCurve(100), gaps=(fm.Gap(2e-3),))
    design = with_wire(gapped, 49, fm.RoundWire(0.4e-3, 0.05e-3), wall=0.5e-3, flange=0.45e-3)
    measured, _ = difference(design, 3e-5)
    assert measured == pytest.approx(classical_difference(design, LATTICE), rel=0.05)


@pytest.mark.parametrize(
    ("turns", "conductor", "former", "low", "high"),
    [
        (4, fm.RoundWire(1.8e-3, 0.05e-3), {"wall": 0.6e-3, "flange": 0.6e-3}, 1e-3, 2.5e-3),
        pytest.param(4, fm.RoundWire(1.8e-3), {}, 1e-3, 3e-3, marks=SLOW),
        (12, fm.LitzWire(60, 0.1e-3, insulation=0.05e-3), {"wall": 0.6e-3}, 3e-4, 1e-3),
        pytest.param(
            10, fm.Foil(0.1e-3, insulation=0.05e-3), {"wall": 0.6e-3}, -1e-4, 1e-4, marks=SLOW
        ),
        (10, fm.Foil(0.3e-3), {}, -1e-4, 1e-4),
        pytest.param(
            50,
            fm.RoundWire(0.5e-3, 0.03e-3),
            {"wall": 0.6e-3, "flange": 0.6e-3},
            1e-4,
            3e-4,
            marks=SLOW,
        ),
    ],
    ids=repr,
)
def test_turns_and_block_agree_within_what_is_documented(
    pot_26_16: fm.Design,
    turns: int,
    conductor: object,
    former: dict[str, float],
    low: float,
    high: float,
) -> None:
    design = replace(with_wire(pot_26_16, turns, conductor, **former), detail="turn")
    measured, open_part = difference(design, 2e-5)
    block = fm.solve(replace(design, detail="block"), tolerance=1e-3).inductance.value
    assert low * block < measured - open_part
    assert measured + open_part < high * block


@pytest.mark.parametrize("detail", ["block", "turn"])
def test_finer_bounds_lie_within_coarser_ones(saturating_26_16: fm.Design, detail: str) -> None:
    wire = fm.RoundWire(0.9e-3)
    design = replace(with_wire(saturating_26_16, 10, wire, wall=0.5e-3), detail=detail, current=9)
    coarse, fine = (fm.solve(design, tolerance=tol).inductance for tol in (1e-2, 5e-4))
    assert coarse.lower <= fine.lower < fine.upper <= coarse.upper
    assert fine.relative_half_width < 5e-4


@pytest.mark.parametrize("detail", ["block", "turn"])
@pytest.mark.parametrize("turns", [7, 8, 20])
@pytest.mark.parametrize(
    "conductor",
    [fm.RoundWire(1.0e-3), fm.LitzWire(60, 0.1e-3, insulation=0.05e-3), fm.Foil(0.1e-3)],
    ids=repr,
)
def test_the_upper_half_carries_half_of_the_current(
    pot_26_16: fm.Design, conductor: object, turns: int, detail: str
) -> None:
    """A turn in the middle is cut in two and keeps its turns per area."""
    design = replace(with_wire(pot_26_16, turns, conductor, wall=0.5e-3), detail=detail)
    half, density = meshed_section(design), turns_per_area(design)
    assert half.copies == 2
    areas = region_areas(half)
    carried = sum(density[name] * area for name, area in areas.items() if name in density)
    assert carried == pytest.approx(turns / 2, rel=1e-12)


@pytest.mark.parametrize("sections", [1, 2, pytest.param(3, marks=SLOW)])
def test_half_and_whole_section_agree(pot_26_16: fm.Design, sections: int) -> None:
    """The same design with its first turn moved by a hair has no mirror plane."""
    winding = fm.Winding(
        7, conductor=fm.RoundWire(1e-3), former=fm.Former(wall=0.5e-3), sections=sections,
        divider=0.3e-3 if sections > 1 else 0.0,
    )  # fmt: skip
    design = replace(pot_26_16, windings=winding, detail="turn")
    tilted = replace(design, gaps=(replace(design.gaps[0], offset=1e-7),))
    assert meshed_section(design).copies == (1 if sections == 2 else 2)  # 4 and 3 turns
    assert meshed_section(tilted).copies == 1
    one, other = (fm.solve(d, tolerance=5e-4).inductance for d in (design, tilted))
    assert max(one.lower, other.lower) < min(one.upper, other.upper)


def test_driven_turns_are_those_of_the_driven_windings(pot_26_16: fm.Design) -> None:
    wire = fm.RoundWire(0.8e-3)
    windings = (fm.Winding(5, name="in", conductor=wire), fm.Winding(4, name="out", conductor=wire))
    design = replace(pot_26_16, windings=windings, detail="turn", driven=("out",))
    assert set(turns_per_area(design)) == {f"winding out, turn {number}" for number in range(1, 5)}
    assert all(value > 0 for value in turns_per_area(design).values())


def test_windings_without_a_conductor_stay_blocks(pot_26_16: fm.Design) -> None:
    by_turn = replace(pot_26_16, detail="turn")
    assert meshed_section(by_turn) == meshed_section(pot_26_16)


@pytest.mark.parametrize(
    ("change", "key", "problem"),
    [
        (lambda d: replace(d, detail="wire"), "solve.detail", "not a level of detail"),
        (
            lambda d: replace(
                with_wire(d, MOST_SINGLE_TURNS + 1, fm.RoundWire(0.2e-3)), detail="turn"
            ),
            "solve.detail",
            "201 turns of conductors are too many",
        ),
    ],
)
def test_details_that_cannot_be_had_are_refused(
    pot_26_16: fm.Design, change: Callable[[fm.Design], fm.Design], key: str, problem: str
) -> None:
    with pytest.raises(fm.InputError, match=problem) as caught:
        change(pot_26_16)
    assert caught.value.key == key
    assert caught.value.accepted
    at_most = with_wire(pot_26_16, MOST_SINGLE_TURNS, fm.RoundWire(0.2e-3))
    assert replace(at_most, detail="turn").turns == MOST_SINGLE_TURNS


def test_a_figure_names_a_winding_once(pot_26_16: fm.Design) -> None:
    from matplotlib.figure import Figure

    design = with_wire(pot_26_16, 20, fm.RoundWire(0.8e-3), wall=0.5e-3)
    result = fm.solve(replace(design, detail="turn"), tolerance=1e-2)
    texts = fm.plot.flux_map(result, Figure().add_subplot()).texts
    assert [text.get_text() for text in texts] == ["winding main"]
