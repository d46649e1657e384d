"""Loss in the copper: closed forms, other ways to the same number, scaling, and what is refused."""

from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.design import wound_coils
from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution, field_solution
from femag.field.design_problem import field_problem
from femag.field.regional import agreeing_solution, settled_solution
from femag.field.tangent import flux_tangent
from femag.quantities import copper_loss, wound_copper
from femag.quantities.ac_factors import foil_crossing_factor, round_crossing_factor, skin_depth
from femag.quantities.copper_loss import WindingLoss
from femag.quantities.inside_elements import nodal_values
from femag.quantities.ripple_field import ripple_field
from femag.quantities.turn_field import crossing_square, turn_field
from femag.units import MU_0

RHO = 1.7241e-8
SLOW = fm.Ripple(1.0, 1.0, "sine")
"""At 1 Hz a skin is 66 mm deep: every factor is 1."""


def solved(design: fm.Design, tolerance: float = 1e-3) -> FieldSolution:
    return adapted_solution(field_problem(design), design.current, tolerance)[0]


def losses(design: fm.Design, accuracy: float = 0.02) -> WindingLoss:
    return copper_loss(design, solved(design), accuracy)[0]


@pytest.fixture
def wound(pot_26_16: fm.Design) -> fm.Design:
    """Pot core 26/16 with 50 turns of wire beside its gap, slow ripple of 1 A about 1.5 A."""
    winding = fm.Winding(
        50,
        conductor=fm.RoundWire(0.5e-3, 0.03e-3),
        former=fm.Former(wall=0.6e-3, flange=0.6e-3),
    )
    return replace(pot_26_16, windings=(winding,), current=2.0, ripple=SLOW)


def solenoid(conductor: fm.RoundWire | fm.LitzWire | fm.Foil, turns: int) -> fm.Design:
    """A post of low permeability over its whole height between nearly ideal iron: B along the axis,
    mu0 n I at the post, falling in a straight line through a winding that fills the window."""
    core = fm.PotCore(
        outer_diameter=40e-3, window_diameter=20e-3, post_diameter=10e-3, hole_diameter=0.0,
        height=32e-3, window_height=12e-3,
    )  # fmt: skip
    return fm.Design(
        core=core,
        gaps=(fm.Gap(12e-3 * (1 - 4e-4), permeability=20.0),),
        windings=(fm.Winding(turns, conductor=conductor),),
        material=fm.LinearCurve(1e6),
        current=0.5,
        ripple=replace(SLOW, frequency=1e5),
    )


def slope_square(ripple: fm.Ripple) -> float:
    """Mean square of dI/dt of a sine."""
    return (2 * np.pi * ripple.frequency * ripple.peak_to_peak) ** 2 / 8


def test_layers_of_wire_in_a_straight_field() -> None:
    """Layer k of m carries the field of those outside of it and half of its own."""
    design = solenoid(fm.RoundWire(0.3e-3, 0.1e-3), 3 * 24)
    design = replace(design, core=replace(design.core, window_diameter=13e-3, outer_diameter=33e-3))
    loss = losses(design, 0.005)
    assert [layer.turns for layer in loss.layers] == [24, 24, 24]
    b = MU_0 * 24 / 12e-3 * np.array([2.5, 1.5, 0.5])
    factor = round_crossing_factor(0.3e-3 / skin_depth(1e5, RHO))
    per_length = np.pi * 0.3e-3**4 / (64 * RHO) * slope_square(design.ripple) * factor * b**2
    lengths = [24 * 2 * np.pi * layer.radius for layer in loss.layers]
    found = [layer.crossing for layer in loss.layers]
    scale = per_length[0] * lengths[0]
    np.testing.assert_allclose(found, per_length * lengths, rtol=4e-3, atol=1e-3 * scale)


def test_layers_of_foil_in_a_straight_field() -> None:
    """Dowell's sum: (k - 1/2)^2 for the field across, and its own field by the skin factor."""
    design = solenoid(fm.Foil(0.15e-3, insulation=0.1e-3), 20)
    loss = losses(design, 0.01)
    b = MU_0 / 12e-3 * (np.arange(20, 0, -1) - 0.5)
    factor = foil_crossing_factor(0.15e-3 / skin_depth(1e5, RHO))
    per_length = 12e-3 * 0.15e-3**3 / (12 * RHO) * slope_square(design.ripple) * factor * b**2
    lengths = 2 * np.pi * np.array([layer.radius for layer in loss.layers])
    np.testing.assert_allclose(loss.crossing_of_turns, per_length * lengths, rtol=4e-3, atol=5e-6)
    assert "0.000" in loss.note or "e-" in loss.note  # next to nothing passes through the foil


def test_litz_holds_the_field_of_its_own_bundle() -> None:
    """One layer: half of its field across, that of the neighbours growing across the bundle, and
    mean (mu0 J r/2)^2 inside of a round bundle."""
    litz = fm.LitzWire(50, 0.05e-3, outer_diameter=0.5e-3)
    design = solenoid(litz, 24)
    design = replace(design, core=replace(design.core, window_diameter=11e-3, outer_diameter=31e-3))
    turns = losses(design, 0.002).crossing_of_turns
    bundle = (MU_0 / (np.pi * 0.5e-3)) ** 2 / 2  # (mu0 J a)^2 / 8
    neighbours = (MU_0 * 24 / 12e-3 / 2 / 2) ** 2 / 2  # of a slab: half of its change is shear
    square = (MU_0 * 24 / 12e-3 / 2) ** 2 + neighbours + bundle
    factor = round_crossing_factor(0.05e-3 / skin_depth(1e5, RHO))
    expected = 50 * np.pi * 0.05e-3**4 / (64 * RHO) * slope_square(design.ripple) * factor * square
    lengths = 2 * np.pi * 5.25e-3
    np.testing.assert_allclose(turns, expected * lengths, rtol=6e-3)


def eddy_loss_of_turns(design: fm.Design, solution: FieldSolution) -> np.ndarray:
    """Loss of each turn above the mirror plane per ampere and second squared, to first order.

    E = -(dA/dt - c/r) with no net current: from the potential itself, own field included.
    """
    rate = flux_tangent(solution.flux).rate
    mesh, basis = solution.sides.mesh, solution.sides.discretisation.basis
    u = nodal_values(solution, rate)[basis.element_dofs]
    r = np.asarray(basis.global_coordinates())[0]
    found = []
    for number in range(1, design.turns + 1):
        name = f"winding main, turn {number}"
        if name not in mesh.names:
            continue
        elements = mesh.elements_of(name)
        a = r[elements] * sum(
            u[i, elements, None] * np.broadcast_to(np.asarray(basis.basis[i][0]), r.shape)[elements]
            for i in range(6)
        )
        area = basis.dx[elements]
        c = np.sum(area * a) / np.sum(area / r[elements])
        e = a - c / r[elements]
        found.append(np.sum(2 * np.pi * r[elements] * area * e**2) / RHO)
    return np.array(found)


def test_squared_field_is_the_loss_that_the_potential_gives(wound: fm.Design) -> None:
    """At low frequency the vector potential inside a turn gives its loss with no rule at all:
    with the part of its own current, (mu0 I)^2/(192 pi) sigma per length, which the skin factor
    holds. Turn by turn beside the gap, where the field changes across a wire by half of itself."""
    design = replace(wound, detail="turn")
    solution = solved(design)
    exact = eddy_loss_of_turns(design, solution)
    layers = wound_coils(design)[0].layers[0]
    turns = turn_field(ripple_field(solution, 0.0), layers, "turn", is_driven=True)
    square = crossing_square(turns, layers.conductor)
    length = 2 * np.pi * layers.positions[:, 0]
    per_length = np.pi * 0.5e-3**4 / (64 * RHO) * square + (MU_0 * 0.25e-3) ** 2 / (
        192 * np.pi * RHO
    )
    upper = layers.positions[:, 1] > 0.1e-3
    whole = np.array([f"winding main, turn {n}" for n in range(1, 51)])[upper]
    names = [name for name in solution.sides.mesh.names if name.startswith("winding main, turn")]
    kept = [names.index(name) for name in whole]
    np.testing.assert_allclose(exact[kept], (per_length * length)[upper], rtol=0.005, atol=1e-16)


def test_block_and_turn_by_turn_agree(wound: fm.Design) -> None:
    block, turn = (losses(replace(wound, detail=detail)) for detail in ("block", "turn"))
    assert turn.crossing == pytest.approx(block.crossing, rel=0.004)
    for one, other in zip(block.layers, turn.layers, strict=True):
        assert other.crossing == pytest.approx(one.crossing, rel=0.005)
    assert (turn.dc, turn.ripple) == (block.dc, block.ripple)


@pytest.mark.slow
def test_loss_converges_with_the_mesh(wound: fm.Design) -> None:
    """Each accuracy against one that is far finer; 0.02 is what a result has."""
    fine = copper_loss(wound, solved(wound, 1e-5), 2e-3)[0].crossing
    errors = [abs(losses(wound, accuracy).crossing / fine - 1) for accuracy in (0.1, 0.02, 0.005)]
    assert errors[0] < 0.02
    assert errors[1] < 0.004
    assert errors[2] < 0.001


def test_squared_field_of_both_sides_agrees(wound: fm.Design) -> None:
    """Integrated over the elements of the winding from B, and from H of the potential side."""
    solution = solved(wound)
    mesh = solution.sides.mesh
    elements = mesh.elements_of("winding main")
    h = solution.potential.field[elements] / solution.current
    weight = solution.sides.discretisation.weight[elements]
    from_h = np.sum(weight * np.sum((MU_0 * h) ** 2, axis=1))
    from_b = ripple_field(solution, 1.5).squared_in(("winding main", "no such region"))
    assert from_b == pytest.approx(from_h, rel=3e-3)
    loss = copper_loss(wound, solution)[0]
    assert loss.squared_field == pytest.approx(from_b / 8, rel=1e-12)


def test_scaling_with_ripple_frequency_wire_and_turns(wound: fm.Design) -> None:
    base = losses(wound)
    assert base.crossing is not None

    def ratio(design: fm.Design) -> float:
        found = losses(design).crossing
        assert found is not None
        return found / base.crossing

    assert ratio(replace(wound, ripple=replace(SLOW, peak_to_peak=2.0))) == pytest.approx(4.0)
    assert ratio(replace(wound, ripple=replace(SLOW, frequency=3.0))) == pytest.approx(9.0)
    thin = replace(wound.windings[0], conductor=fm.RoundWire(0.25e-3, 0.155e-3))
    assert ratio(replace(wound, windings=(thin,))) == pytest.approx(1 / 16, rel=0.03)
    hot = replace(wound.windings[0], temperature=100.0)
    warmth = 1 + 0.00393 * 80
    assert ratio(replace(wound, windings=(hot,))) == pytest.approx(1 / warmth)
    assert base.dc == pytest.approx(1.5**2 * dc_resistance(wound))
    assert base.ripple == pytest.approx(dc_resistance(wound) / 8)


def dc_resistance(design: fm.Design) -> float:
    wire = design.windings[0].conductor
    assert wire is not None
    return RHO * wound_copper(design)[0].wire_length / wire.copper_area


def test_triangle_has_all_its_harmonics(wound: fm.Design) -> None:
    """At low frequency only the mean square of dI/dt counts: (pp)^2 / (T^2 D (1 - D))."""
    sine = losses(wound)
    for rise in (0.5, 0.2):
        triangle = losses(replace(wound, ripple=fm.Ripple(1.0, 1.0, rise=rise)))
        steepness = 1 / (rise * (1 - rise)) / slope_square(SLOW)
        assert triangle.crossing == pytest.approx(steepness * sine.crossing, rel=1.1e-3)
        assert triangle.ripple == pytest.approx(sine.ripple * 8 / 12, rel=1e-6)


@pytest.mark.parametrize("bias", [0.0, 3.0])
def test_ripple_field_is_the_difference_of_solutions(
    saturating_26_16: fm.Design, bias: float
) -> None:
    """About a bias at which the core saturates, and about none, on the mesh of another current."""
    solution, step = solved(saturating_26_16), 0.002
    field = ripple_field(solution, bias)
    points = np.array([[6.5e-3, 7.5e-3, 9.5e-3], [0.1e-3, -2e-3, 4e-3]])
    low, high = (
        replace(field, per_ampere=field_solution(solution.sides, bias + change).flux.field)
        for change in (-step, step)
    )
    slope = (high.at_points(points) - low.at_points(points)) / (2 * step)
    found = field.at_points(points)
    np.testing.assert_allclose(found, slope, rtol=1e-3, atol=1e-4 * np.abs(found).max())


def test_winding_that_carries_nothing_is_heated_too(wound: fm.Design) -> None:
    idle = fm.Winding(10, conductor=fm.RoundWire(0.3e-3, 0.02e-3), name="idle")
    loss = copper_loss(design := replace(wound, windings=(*wound.windings, idle)), solved(design))[
        1
    ]
    assert (loss.dc, loss.ripple) == (0.0, 0.0)
    assert loss.crossing is not None
    assert loss.crossing > 0.0


def test_what_is_out_of_range_says_why(wound: fm.Design, pot_26_16: fm.Design) -> None:
    foil = fm.Winding(8, conductor=fm.Foil(0.25e-3, insulation=0.05e-3))
    fast = replace(wound, windings=(foil,), ripple=fm.Ripple(1.0, 1e5))
    loss = losses(fast)
    assert loss.dc is not None
    assert (loss.ripple, loss.crossing, loss.total, loss.crossing_of_turns) == (
        None,
        None,
        None,
        (),
    )
    assert "0.25 mm is thicker than a skin depth, 0.209 mm" in loss.note
    assert "lower estimate" in losses(replace(fast, ripple=fm.Ripple(1.0, 2e4))).note
    block = losses(replace(pot_26_16, ripple=SLOW))
    assert (block.dc, block.crossing, block.layers) == (None, None, ())
    assert "winding.conductor" in block.note
    assert block.squared_field > 0.0


def test_beside_straight_legs_a_spacer_has_no_loss_by_the_field(wound: fm.Design) -> None:
    core = fm.catalogue_core("PQ 26/25").core()
    design = replace(wound, core=core, gaps=(fm.Gap(0.5e-3, leg="all"),))
    refused = losses(design, 1e-2)
    assert refused.crossing is None
    assert refused.ripple is not None
    assert "three dimensions" in refused.note
    assert losses(replace(design, gaps=(fm.Gap(0.5e-3),)), 1e-2).crossing is not None


def test_no_ripple_no_loss(pot_26_16: fm.Design) -> None:
    assert copper_loss(pot_26_16, solved(pot_26_16)) == ()


@pytest.mark.parametrize("gap", [0.0, 0.05e-3])
def test_both_sides_give_the_ripple_field_where_they_agree(wound: fm.Design, gap: float) -> None:
    """Without a gap B in the copper is far off at first, and mu0 H is not."""
    design = replace(wound, gaps=(fm.Gap(gap),) if gap else ())
    coarse, _ = adapted_solution(field_problem(design), 1.0, 1e-3)
    close, side = settled_solution(coarse, {"winding main"}, 0.02)
    assert gap or side == "potential"
    found = ripple_field(close, 0.0, side).squared_in({"winding main"})
    fine = agreeing_solution(close, {"winding main"}, 0.02)
    for one in ("flux", "potential"):
        other = ripple_field(fine, 0.0, one).squared_in({"winding main"})
        assert found == pytest.approx(other, rel=3e-3)


def test_loss_in_an_ungapped_saturating_core_takes_few_refinements(
    saturating_26_16: fm.Design,
) -> None:
    design = replace(
        saturating_26_16, gaps=(), current=0.2, ripple=fm.Ripple(0.1, 1e5), tolerance=5e-3
    )
    solution = solved(design)
    close, side = settled_solution(solution, {"winding main"}, 0.02)
    assert side == "potential"
    assert close.unknowns < 2.5 * solution.unknowns
