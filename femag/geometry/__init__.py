"""Geometry: the section as named polygons, pot cores, gaps and windings."""

from femag.geometry.catalogue import (
    LIMITS,
    CatalogueCore,
    Limit,
    catalogue,
    catalogue_core,
    matching_cores,
)
from femag.geometry.gaps import Gap, gap_length
from femag.geometry.pot import DIMENSIONS, PotCore, half_window_height, pot_cuts, pot_regions
from femag.geometry.section import (
    SURROUNDINGS,
    Cut,
    Region,
    Section,
    Wall,
    is_mirror_symmetric,
    open_section,
    parts_extent,
    polygon_area,
    rectangle,
    region_areas,
    scaled_section,
    singular_corners,
    upper_half,
)
from femag.geometry.windings import Block, Winding, winding_region

__all__ = [
    "DIMENSIONS",
    "LIMITS",
    "SURROUNDINGS",
    "Block",
    "CatalogueCore",
    "Cut",
    "Gap",
    "Limit",
    "PotCore",
    "Region",
    "Section",
    "Wall",
    "Winding",
    "catalogue",
    "catalogue_core",
    "gap_length",
    "half_window_height",
    "is_mirror_symmetric",
    "matching_cores",
    "open_section",
    "parts_extent",
    "polygon_area",
    "pot_cuts",
    "pot_regions",
    "rectangle",
    "region_areas",
    "scaled_section",
    "singular_corners",
    "upper_half",
    "winding_region",
]
