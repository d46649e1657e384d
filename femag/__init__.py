"""Gapfield: gapped inductors on round-post cores, inductance between a lower and an upper bound.

Names are loaded when first used, so that ``import femag`` is quick::

    import femag as fm

    core = fm.PotCore(outer_diameter=25.5e-3, window_diameter=21.2e-3, post_diameter=11.5e-3,
                      hole_diameter=5.5e-3, height=16.1e-3, window_height=11e-3)
    design = fm.Design(core=core, gaps=[fm.Gap(0.5e-3)], windings=[fm.Winding(turns=50)],
                       material=fm.LinearCurve(2000))
    result = fm.solve(design, current=1.0)
    print(result.inductance)
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from femag import plot
    from femag.bench import (
        Capture,
        CaptureColumns,
        CoreUnderTest,
        Loop,
        loop_of,
        material_toml,
        measured_loss,
        middle_curve,
        normal_curve,
        read_capture,
    )
    from femag.copper_distance import KeepOut, keep_out
    from femag.coupled_windings import WindingMatrix, winding_matrix
    from femag.current_curve import InductanceCurve, inductance_curve
    from femag.design import Design
    from femag.design_file import design_toml, read_design, read_ripple
    from femag.design_slopes import sensitivities
    from femag.errors import GapfieldError, InputError, NumericalError
    from femag.export.circuit_model import write_circuit
    from femag.export.curve_file import read_curve, write_curve
    from femag.export.curve_table import write_curve_table
    from femag.export.mesh_files import write_field, write_mesh
    from femag.export.result_file import read_result, write_result
    from femag.field.adapt import ToleranceError
    from femag.field.bounds import Bounds
    from femag.geometry import (
        ALUMINIUM,
        COPPER,
        Block,
        Foil,
        Former,
        Gap,
        LitzWire,
        Magnet,
        PotCore,
        RoundWire,
        Step,
        Winding,
        catalogue,
        catalogue_core,
    )
    from femag.materials import (
        FroehlichCurve,
        LinearCurve,
        Steinmetz,
        TabulatedCurve,
        material,
        material_library,
        read_material,
        steinmetz_through,
    )
    from femag.measured_inductance import (
        MeasuredPoints,
        fitted_design,
        measured_curve,
        read_measured,
        residuals,
    )
    from femag.part_tolerances import PartTolerances
    from femag.quantities import CoreLoss, LossBudget
    from femag.requirement_checks import RequirementCheck, checked_requirements
    from femag.requirements import Requirements
    from femag.result import Result, solve
    from femag.review import Review, design_review
    from femag.ripple import Ripple
    from femag.sheet import review_sheet
    from femag.study import Sample, Study, StudyTable, read_study, read_table
    from femag.target_gap import gap_for
    from femag.target_turns import turns_for
    from femag.tolerance_budget import sampled_spread

_HOME = {
    "ALUMINIUM": "femag.geometry",
    "Block": "femag.geometry",
    "COPPER": "femag.geometry",
    "Capture": "femag.bench",
    "CaptureColumns": "femag.bench",
    "CoreLoss": "femag.quantities",
    "CoreUnderTest": "femag.bench",
    "Foil": "femag.geometry",
    "Former": "femag.geometry",
    "LitzWire": "femag.geometry",
    "LossBudget": "femag.quantities",
    "Loop": "femag.bench",
    "loop_of": "femag.bench",
    "material_toml": "femag.bench",
    "measured_loss": "femag.bench",
    "middle_curve": "femag.bench",
    "normal_curve": "femag.bench",
    "read_capture": "femag.bench",
    "Magnet": "femag.geometry",
    "RoundWire": "femag.geometry",
    "Bounds": "femag.field.bounds",
    "Design": "femag.design",
    "FroehlichCurve": "femag.materials",
    "TabulatedCurve": "femag.materials",
    "material": "femag.materials",
    "material_library": "femag.materials",
    "read_material": "femag.materials",
    "InductanceCurve": "femag.current_curve",
    "inductance_curve": "femag.current_curve",
    "read_curve": "femag.export.curve_file",
    "write_circuit": "femag.export.circuit_model",
    "write_curve": "femag.export.curve_file",
    "write_curve_table": "femag.export.curve_table",
    "MeasuredPoints": "femag.measured_inductance",
    "fitted_design": "femag.measured_inductance",
    "measured_curve": "femag.measured_inductance",
    "read_measured": "femag.measured_inductance",
    "residuals": "femag.measured_inductance",
    "Gap": "femag.geometry",
    "GapfieldError": "femag.errors",
    "InputError": "femag.errors",
    "LinearCurve": "femag.materials",
    "NumericalError": "femag.errors",
    "PotCore": "femag.geometry",
    "RequirementCheck": "femag.requirement_checks",
    "Requirements": "femag.requirements",
    "Result": "femag.result",
    "Review": "femag.review",
    "checked_requirements": "femag.requirement_checks",
    "design_review": "femag.review",
    "review_sheet": "femag.sheet",
    "Ripple": "femag.ripple",
    "Steinmetz": "femag.materials",
    "steinmetz_through": "femag.materials",
    "Step": "femag.geometry",
    "ToleranceError": "femag.field.adapt",
    "Winding": "femag.geometry",
    "catalogue": "femag.geometry",
    "catalogue_core": "femag.geometry",
    "design_toml": "femag.design_file",
    "read_design": "femag.design_file",
    "read_ripple": "femag.design_file",
    "read_result": "femag.export.result_file",
    "PartTolerances": "femag.part_tolerances",
    "gap_for": "femag.target_gap",
    "KeepOut": "femag.copper_distance",
    "keep_out": "femag.copper_distance",
    "sampled_spread": "femag.tolerance_budget",
    "sensitivities": "femag.design_slopes",
    "turns_for": "femag.target_turns",
    "solve": "femag.result",
    "Sample": "femag.study",
    "Study": "femag.study",
    "StudyTable": "femag.study",
    "read_study": "femag.study",
    "read_table": "femag.study",
    "write_result": "femag.export.result_file",
    "write_field": "femag.export.mesh_files",
    "write_mesh": "femag.export.mesh_files",
    "WindingMatrix": "femag.coupled_windings",
    "winding_matrix": "femag.coupled_windings",
}

__all__ = [
    "ALUMINIUM",
    "COPPER",
    "Block",
    "Bounds",
    "Capture",
    "CaptureColumns",
    "CoreLoss",
    "CoreUnderTest",
    "Design",
    "Foil",
    "Former",
    "FroehlichCurve",
    "Gap",
    "GapfieldError",
    "InductanceCurve",
    "InputError",
    "KeepOut",
    "LinearCurve",
    "LitzWire",
    "Loop",
    "LossBudget",
    "Magnet",
    "MeasuredPoints",
    "NumericalError",
    "PartTolerances",
    "PotCore",
    "RequirementCheck",
    "Requirements",
    "Result",
    "Review",
    "Ripple",
    "RoundWire",
    "Sample",
    "Steinmetz",
    "Step",
    "Study",
    "StudyTable",
    "TabulatedCurve",
    "ToleranceError",
    "Winding",
    "WindingMatrix",
    "catalogue",
    "catalogue_core",
    "checked_requirements",
    "design_review",
    "design_toml",
    "fitted_design",
    "gap_for",
    "inductance_curve",
    "keep_out",
    "loop_of",
    "material",
    "material_library",
    "material_toml",
    "measured_curve",
    "measured_loss",
    "middle_curve",
    "normal_curve",
    "plot",
    "read_capture",
    "read_curve",
    "read_design",
    "read_material",
    "read_measured",
    "read_result",
    "read_ripple",
    "read_study",
    "read_table",
    "residuals",
    "review_sheet",
    "sampled_spread",
    "sensitivities",
    "solve",
    "steinmetz_through",
    "turns_for",
    "winding_matrix",
    "write_circuit",
    "write_curve",
    "write_curve_table",
    "write_field",
    "write_mesh",
    "write_result",
]


def __getattr__(name: str) -> Any:
    if name == "plot":
        return importlib.import_module("femag.plot")
    if name not in _HOME:
        raise AttributeError(f"module 'femag' has no attribute {name!r}")
    return getattr(importlib.import_module(_HOME[name]), name)


def __dir__() -> list[str]:
    return sorted(__all__)
