"""Materials: magnetisation curves with consistent energy densities, a library, and files."""

from femag.materials.curves import (
    AIR,
    FroehlichCurve,
    LinearCurve,
    MagnetisationCurve,
    ResaturatedCurve,
    ScaledCurve,
    with_permeability,
    with_saturation,
)
from femag.materials.diagnosis import curve_through
from femag.materials.library import library_material, material, material_library
from femag.materials.loss_table import loss_document, loss_of_table
from femag.materials.material_file import is_material_file, read_material
from femag.materials.steinmetz import Steinmetz, steinmetz_through
from femag.materials.tabulated import TabulatedCurve
from femag.materials.temperature import Material

__all__ = [
    "AIR",
    "FroehlichCurve",
    "LinearCurve",
    "MagnetisationCurve",
    "Material",
    "ResaturatedCurve",
    "ScaledCurve",
    "Steinmetz",
    "TabulatedCurve",
    "curve_through",
    "is_material_file",
    "library_material",
    "loss_document",
    "loss_of_table",
    "material",
    "material_library",
    "read_material",
    "steinmetz_through",
    "with_permeability",
    "with_saturation",
]
