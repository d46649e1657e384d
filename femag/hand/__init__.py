"""Hand calculation: a reluctance network of the core with every usual fringing formula."""

from femag.hand.comparison import (
    HandEstimate,
    core_network,
    gap_shapes,
    hand_estimates,
    plain_inductance,
)
from femag.hand.fringing import FORMULAS, Formula, GapShape, block_permeance
from femag.hand.network import Branch, NetworkState, network_state

__all__ = [
    "FORMULAS",
    "Branch",
    "Formula",
    "GapShape",
    "HandEstimate",
    "NetworkState",
    "block_permeance",
    "core_network",
    "gap_shapes",
    "hand_estimates",
    "network_state",
    "plain_inductance",
]
