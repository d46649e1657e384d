"""The command ``gapfield bench``: options in, files and the printed answer out."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from femag.command_output import make_folder, terminal
from femag.errors import InputError

if TYPE_CHECKING:
    from femag.bench import CoreUnderTest, Loop, MeasuredCurve, MeasuredLoss

FOLDER_FILES = ("bench.json", "loop.png", "waveforms.png")
GEOMETRY = "--area and --path, or --core"


CapturesArgument = Annotated[
    list[Path] | None, typer.Argument(metavar="CAPTURE.csv", help="Scope files.")
]
DriveTurnsOption = Annotated[int | None, typer.Option(help="Turns that carry the current.")]
SenseTurnsOption = Annotated[int | None, typer.Option(help="Turns whose voltage is recorded.")]
AreaOption = Annotated[str | None, typer.Option(help="Magnetic section, such as '97 mm2'.")]
PathOption = Annotated[str | None, typer.Option(help="Magnetic path, such as '37.6 mm'.")]
CoreOption = Annotated[
    str | None, typer.Option(help="Core of the catalogue, instead of --area and --path.")
]
ColumnOption = Annotated[str | None, typer.Option(help="Name, or number from 1.")]
SampleRateOption = Annotated[
    str | None, typer.Option(help="Such as '1 MHz', where there is no time.")
]
CurrentScaleOption = Annotated[
    str | None, typer.Option(help="Of a current probe, such as '10 A/V'.")
]
ShuntOption = Annotated[str | None, typer.Option(help="Of a shunt, such as '0.1 ohm'.")]
VoltageScaleOption = Annotated[
    str | None, typer.Option(help="Factor on the sense voltage, such as '10'.")
]
FrequencyOption = Annotated[
    str | None, typer.Option(help="To within 5 %; needed for a record of one period.")
]
FlatTopsOption = Annotated[
    bool, typer.Option("--flat-tops", help="Flat tops are real, not clipped.")
]
MaterialOption = Annotated[Path | None, typer.Option(metavar="FILE", help="Write a material file.")]
NameOption = Annotated[str | None, typer.Option(help="Name of the material.")]
TemperatureOption = Annotated[str, typer.Option(help="Of the core.")]
JsonOption = Annotated[
    str | None, typer.Option(metavar="FILE|-", help="Write JSON; - for the terminal.")
]
OutOption = Annotated[
    Path | None, typer.Option(metavar="DIR", help="Write JSON and figures into a folder.")
]
DemoOption = Annotated[
    Path | None, typer.Option(metavar="DIR", help="Write invented captures and use them.")
]


def bench_command(
    captures: CapturesArgument = None,
    drive_turns: DriveTurnsOption = None,
    sense_turns: SenseTurnsOption = None,
    area: AreaOption = None,
    path: PathOption = None,
    core: CoreOption = None,
    time_column: ColumnOption = None,
    current_column: ColumnOption = None,
    voltage_column: ColumnOption = None,
    sample_rate: SampleRateOption = None,
    current_scale: CurrentScaleOption = None,
    shunt: ShuntOption = None,
    voltage_scale: VoltageScaleOption = None,
    frequency: FrequencyOption = None,
    flat_tops: FlatTopsOption = False,
    material: MaterialOption = None,
    name: NameOption = None,
    temperature: TemperatureOption = "25 C",
    json: JsonOption = None,
    out: OutOption = None,
    demo: DemoOption = None,
) -> None:
    """Turn scope captures into B-H loops, a normal curve and a material file.

    From the current of a drive winding and the voltage of a sense winding.
    """
    from femag.bench import CaptureColumns, loop_of, read_capture
    from femag.units import celsius

    if demo is not None:
        _demo(demo, captures or [])
        return
    if not captures:
        raise InputError("missing", key="CAPTURE.csv", accepted="one scope file or more, or --demo")
    for key, target in (("--material", material), ("--json", json)):
        _refuse_a_capture(key, target, captures)
    degrees = celsius(temperature)
    under_test = _core_under_test(drive_turns, sense_turns, area, path, core)
    columns = CaptureColumns(
        time=time_column, current=current_column, voltage=voltage_column,
        sample_rate=_si("--sample-rate", sample_rate, "Hz"),
        current_scale=current_scale, shunt=shunt, voltage_scale=voltage_scale,
    )  # fmt: skip
    expected = _si("--frequency", frequency, "Hz")
    loops = [
        loop_of(read_capture(file, columns), under_test, expected, flat_tops=flat_tops)
        for file in captures
    ]
    _answer(loops, material, name, degrees, json, out)


def _refuse_a_capture(key: str, target: str | Path | None, captures: Sequence[Path]) -> None:
    """Refuse to write over what was measured."""
    if target is None or not Path(target).exists():
        return
    if any(file.exists() and file.samefile(target) for file in captures):
        raise InputError("is a capture", key=key, value=str(target), accepted="another file")


def _si(key: str, text: str | None, unit: str) -> float | None:
    """Return the SI number above zero of an option, None if it was not given."""
    if text is None:
        return None
    from femag.units import ACCEPTED, si_value

    try:
        value = si_value(text, unit)
    except InputError as error:
        raise error.changed(key=key, value=text) from error
    if value <= 0.0:
        raise InputError("not above zero", key=key, value=text, accepted=ACCEPTED[unit])
    return value


def _core_under_test(
    drive_turns: int | None,
    sense_turns: int | None,
    area: str | None,
    path: str | None,
    size: str | None,
) -> CoreUnderTest:
    from femag.bench import CoreUnderTest

    for key, turns in (("--drive-turns", drive_turns), ("--sense-turns", sense_turns)):
        if turns is None or turns < 1:
            raise InputError("missing" if turns is None else "no number of turns", key=key,
                             value=turns, accepted="a whole number, 1 or more")  # fmt: skip
    assert drive_turns is not None
    assert sense_turns is not None
    given = {"--area": _si("--area", area, "m2"), "--path": _si("--path", path, "m")}
    if size is not None:
        both = [key for key, value in given.items() if value is not None]
        if both:
            raise InputError("says the same as --core", key=both[0], accepted=GEOMETRY)
        return CoreUnderTest(drive_turns, sense_turns, *_effective(size))
    for key, value in given.items():
        if value is None:
            raise InputError("missing", key=key, accepted=GEOMETRY)
    return CoreUnderTest(drive_turns, sense_turns, *(v for v in given.values() if v is not None))


def _effective(size: str) -> tuple[float, float]:
    """Return effective area in m2 and length in m: as published if both are known."""
    from femag.geometry import catalogue_core, effective_parameters

    try:
        entry = catalogue_core(size)
    except InputError as error:
        raise error.changed(key="--core") from error
    known = entry.published
    if "effective_area" in known and "effective_length" in known:
        return known["effective_area"], known["effective_length"]
    computed = effective_parameters(entry.core())
    return computed.area, computed.length


def _answer(
    loops: Sequence[Loop],
    material: Path | None,
    name: str | None,
    temperature: float,
    json: str | None,
    out: Path | None,
) -> None:
    """Write files, then print."""
    from femag.bench import measured_loss
    from femag.bench.normal_curve import LEAST_TIPS, middle_curve, normal_curve
    from femag.bench_answer import bench_json, print_bench

    curve: MeasuredCurve | None = None
    loss: MeasuredLoss | None = None
    if len(loops) >= LEAST_TIPS:
        curve, loss = normal_curve(loops), measured_loss(loops, temperature)
    elif material is not None:
        curve = middle_curve(max(loops, key=lambda loop: loop.readings.peak_flux_density))
    _write(loops, curve, loss, material, name, temperature, json, out)
    if json == "-":
        typer.echo(bench_json(loops, curve, loss), nl=False)
        return

    print_bench(loops, curve, loss, terminal())
    written = [
        *([material] if material else []),
        *([out / file for file in FOLDER_FILES] if out else []),
    ]
    if written:
        typer.echo(f"\nWritten: {', '.join(map(str, written))}")


def _write(
    loops: Sequence[Loop],
    curve: MeasuredCurve | None,
    loss: MeasuredLoss | None,
    material: Path | None,
    name: str | None,
    temperature: float,
    json: str | None,
    out: Path | None,
) -> None:
    """Write all files that were asked for; each is renamed only when all are written."""
    from femag.bench import material_toml
    from femag.bench_answer import bench_json
    from femag.export.whole_file import whole_file

    with ExitStack() as stack:
        if material is not None and curve is not None:
            text = material_toml(curve, name or material.stem, temperature, loss)
            stack.enter_context(whole_file(material)).write_text(text, encoding="utf-8")
        if json is not None and json != "-":
            target = stack.enter_context(whole_file(json))
            target.write_text(bench_json(loops, curve, loss), encoding="utf-8")
        if out is None:
            return
        from femag.plot import loop_figure, waveform_figure, write_figure

        make_folder(out, "--out")
        document, loop, waveforms = (
            stack.enter_context(whole_file(out / file)) for file in FOLDER_FILES
        )
        document.write_text(bench_json(loops, curve, loss), encoding="utf-8")
        largest = max(loops, key=lambda one: one.readings.peak_flux_density)
        write_figure(lambda ax: loop_figure(loops, ax, curve), loop)
        write_figure(lambda ax: waveform_figure(largest, ax), waveforms)


def _demo(folder: Path, captures: Sequence[Path]) -> None:
    """Write the invented captures, and everything that comes of them, into a folder."""
    from femag.bench import CaptureColumns, loop_of, read_capture
    from femag.bench.synthetic import DEMO_CORE, DEMO_SCALE, demo_files
    from femag.export.whole_file import whole_file

    if captures:
        raise InputError(
            "stands beside captures of your own", key="--demo", value=str(folder),
            accepted="one of the two",
        )  # fmt: skip
    make_folder(folder, "--demo")
    texts = {folder / name: text for name, text in demo_files().items()}
    for file, text in texts.items():
        if file.exists() and file.read_text(encoding="utf-8", errors="replace") != text:
            raise InputError(
                "holds a capture of your own", file=str(file), accepted="another folder"
            )
    for file, text in texts.items():
        with whole_file(file) as temporary:
            temporary.write_text(text, encoding="utf-8")
    columns = CaptureColumns(current_scale=DEMO_SCALE)
    loops = [loop_of(read_capture(file, columns), DEMO_CORE) for file in texts]
    _answer(loops, folder / "invented-material.toml", "invented ferrite", 25.0, None, folder)
    typer.echo(
        f"The captures are invented. The same again: gapfield bench {folder}/invented-*.csv "
        f"--drive-turns {DEMO_CORE.drive_turns} --sense-turns {DEMO_CORE.sense_turns} "
        f"--area '{1e6 * DEMO_CORE.area:g} mm2' --path '{1e3 * DEMO_CORE.path_length:g} mm' "
        f"--current-scale '{DEMO_SCALE}' --material mine.toml"
    )
