"""Design files: TOML in and out, checked key by key."""

from femag.design_file.reading import design_from_document, design_from_toml, read_design
from femag.design_file.tables import DesignTable
from femag.design_file.waveform_file import read_ripple
from femag.design_file.writing import design_document, design_toml

__all__ = [
    "DesignTable",
    "design_document",
    "design_from_document",
    "design_from_toml",
    "design_toml",
    "read_design",
    "read_ripple",
]
