"""Quantities: what engineers read off the fields."""

from femag.quantities.copper import WoundCopper, wound_copper
from femag.quantities.core_volume import VolumeShare, core_share_above, volume_shares
from femag.quantities.field_map import FieldMap, field_map, typical_peak
from femag.quantities.force import Force, Pull, force_of
from femag.quantities.fringing import gap_factor, plain_gap_reluctance
from femag.quantities.inductance import incremental_inductance_of_sides
from femag.quantities.section_means import (
    SectionMean,
    flux_through_discs,
    mean_flux_densities,
    section_means,
)

__all__ = [
    "FieldMap",
    "Force",
    "Pull",
    "SectionMean",
    "VolumeShare",
    "WoundCopper",
    "core_share_above",
    "field_map",
    "flux_through_discs",
    "force_of",
    "gap_factor",
    "incremental_inductance_of_sides",
    "mean_flux_densities",
    "plain_gap_reluctance",
    "section_means",
    "typical_peak",
    "volume_shares",
    "wound_copper",
]
