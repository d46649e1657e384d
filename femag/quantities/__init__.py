"""Quantities: what engineers read off the fields."""

from femag.quantities.copper import WoundCopper, wound_copper
from femag.quantities.copper_clearance import CopperClearance, copper_clearance, gap_openings
from femag.quantities.copper_loss import LayerLoss, WindingLoss, copper_loss
from femag.quantities.core_loss import CoreLoss, LossShare, PartLoss, core_loss
from femag.quantities.core_volume import VolumeShare, core_share_above, volume_shares
from femag.quantities.field_map import FieldMap, field_map, typical_peak
from femag.quantities.field_points import PointFields, point_fields
from femag.quantities.force import Force, Pull, force_of
from femag.quantities.fringing import gap_factor, plain_gap_reluctance
from femag.quantities.inductance import incremental_inductance_of_sides
from femag.quantities.loss_budget import LossBudget
from femag.quantities.ripple_field import RippleField, ripple_field
from femag.quantities.section_means import (
    SectionMean,
    flux_through_discs,
    mean_flux_densities,
    section_means,
)

__all__ = [
    "CopperClearance",
    "CoreLoss",
    "FieldMap",
    "Force",
    "LayerLoss",
    "LossBudget",
    "LossShare",
    "PartLoss",
    "PointFields",
    "Pull",
    "RippleField",
    "SectionMean",
    "VolumeShare",
    "WindingLoss",
    "WoundCopper",
    "copper_clearance",
    "copper_loss",
    "core_loss",
    "core_share_above",
    "field_map",
    "flux_through_discs",
    "force_of",
    "gap_factor",
    "gap_openings",
    "incremental_inductance_of_sides",
    "mean_flux_densities",
    "plain_gap_reluctance",
    "point_fields",
    "ripple_field",
    "section_means",
    "typical_peak",
    "volume_shares",
    "wound_copper",
]
