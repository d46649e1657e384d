"""Designs that several tests use."""

from dataclasses import replace

import pytest

import femag as fm


@pytest.fixture(scope="session")
def pot_26_16() -> fm.Design:
    """Pot core 26/16 with a gap of 0.5 mm and 50 turns, linear."""
    return fm.Design(
        core=fm.PotCore(
            outer_diameter=25.5e-3,
            window_diameter=21.2e-3,
            post_diameter=11.5e-3,
            hole_diameter=5.5e-3,
            height=16.1e-3,
            window_height=11.0e-3,
        ),
        gaps=(fm.Gap(0.5e-3),),
        windings=(fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3)),),
        material=fm.LinearCurve(2000.0),
    )


@pytest.fixture(scope="session")
def saturating_26_16(pot_26_16: fm.Design) -> fm.Design:
    """The same core with a saturating material, driven into the knee."""
    return replace(pot_26_16, material=fm.FroehlichCurve(2000.0, 0.45, 2.0), current=6.0)
