"""Geometry: the section as named polygons, pot cores, gaps and windings."""

from femag.geometry.gaps import Gap, gap_length
from femag.geometry.pot import PotCore, half_window_height, pot_cuts, pot_regions
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
    "SURROUNDINGS",
    "Block",
    "Cut",
    "Gap",
    "PotCore",
    "Region",
    "Section",
    "Wall",
    "Winding",
    "gap_length",
    "half_window_height",
    "is_mirror_symmetric",
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
