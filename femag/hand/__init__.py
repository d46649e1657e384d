"""Hand calculation: a reluctance network of the core with every usual fringing formula."""

from femag.hand.comparison import (
    HandEstimate,
    gap_shapes,
    hand_estimates,
    plain_inductance,
    pot_network,
)
from femag.hand.effective import (
    CoreSection,
    EffectiveParameters,
    core_sections,
    effective_parameters,
)
from femag.hand.fringing import FORMULAS, Formula, GapShape, block_permeance
from femag.hand.network import Branch, NetworkState, network_state

__all__ = [
    "FORMULAS",
    "Branch",
    "CoreSection",
    "EffectiveParameters",
    "Formula",
    "GapShape",
    "HandEstimate",
    "NetworkState",
    "block_permeance",
    "core_sections",
    "effective_parameters",
    "gap_shapes",
    "hand_estimates",
    "network_state",
    "plain_inductance",
    "pot_network",
]
