"""Write the reference pages from the code: commands, keys, JSON files, Python names, validation."""

from __future__ import annotations

import importlib
import inspect
import json
import pkgutil
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any, get_args

import typer

import femag.export
from femag.cli import app
from femag.design_file import DesignTable
from femag.export.document import Entry
from validation.__main__ import FOLDERS, folder_rows
from validation.table import cells

ROOT = Path(__file__).parents[1]


def write_reference_pages(folder: Path) -> None:
    """Write all pages into a folder, each anew."""
    folder.mkdir(exist_ok=True)
    pages = {
        "commands.md": commands_page(),
        "design-keys.md": keys_page(),
        "json.md": json_page(),
        "python.md": python_page(),
        "validation.md": validation_page(),
    }
    for name, text in pages.items():
        (folder / name).write_text(text, encoding="utf-8")


def commands_page() -> str:
    """Return every command with its arguments and options."""
    group: Any = typer.main.get_command(app)
    lines = ["# Commands", ""]
    for name, command in group.commands.items():
        first, _, rest = inspect.cleandoc(command.help or "").partition("\n")
        lines += [f"## gapfield {name}", "", first, "", " ".join(rest.split()), ""]
        lines += ["| argument, option | what |", "|---|---|"]
        for parameter in command.params:
            names = ", ".join(getattr(parameter, "opts", [])) or parameter.name
            if parameter.param_type_name == "argument":
                names = parameter.metavar or parameter.name
            elif parameter.metavar:
                names += f" {parameter.metavar}"
            lines.append(f"| `{_cell(names)}` | {_cell(getattr(parameter, 'help', '') or '')} |")
        lines.append("")
    return "\n".join(lines)


def keys_page() -> str:
    """Return every key of the design file with what it accepts and its default."""
    schema = DesignTable.model_json_schema()
    tables = {"the file": schema, **schema["$defs"]}
    lines = [
        "# Keys of the design file", "",
        "What each key accepts, as messages say it. [Files and commands](../files-and-commands.md) "
        "says what each one means.", "",
    ]  # fmt: skip
    for name, table in tables.items():
        lines += [f"## {name.removesuffix('Table')}", "", table.get("description", ""), ""]
        lines += ["| key | accepted | default |", "|---|---|---|"]
        for key, entry in table["properties"].items():
            default = "required" if key in table.get("required", ()) else _default(entry)
            lines.append(f"| `{key}` | {_cell(entry.get('description', ''))} | {default} |")
        lines.append("")
    return "\n".join(lines)


def json_page() -> str:
    """Return every table of every JSON file."""
    lines = ["# JSON files", "", "SI units throughout.", ""]
    for module in _document_modules():
        entries = list(_entries(module))
        (title,) = (e.model_fields["format"] for e in entries if "format" in e.model_fields)
        lines += [f"## {get_args(title.annotation)[0]}", ""]
        for entry in entries:
            lines += [f"**{entry.__name__}**: {inspect.getdoc(entry)}", ""]
            lines += ["| key | type |", "|---|---|"]
            lines += [f"| `{key}` | `{_type_name(f)}` |" for key, f in entry.model_fields.items()]
            lines.append("")
    return "\n".join(lines)


def python_page() -> str:
    """Return a page that documents every public name of the package and every figure."""
    lines = ["# Python", "", "`import femag as fm`", ""]
    for name in femag.__all__:
        if name == "plot":
            continue
        value = getattr(femag, name)
        kind = "class" if inspect.isclass(value) else "function" if callable(value) else "data"
        lines += [f"## {name}", "", "```{eval-rst}", f".. auto{kind}:: {value.__module__}.{name}"]
        lines += ["```", ""] if kind != "data" else ["   :no-value:", "```", ""]
    lines += [
        "## plot",
        "",
        "`fm.plot`: one function a figure, each draws on an Axes of yours.",
        "",
    ]
    for name in importlib.import_module("femag.plot").__all__:
        value = getattr(femag.plot, name)
        lines += ["```{eval-rst}", f".. autofunction:: {value.__module__}.{name}", "```", ""]
    return "\n".join(lines)


def validation_page() -> str:
    """Solve every case of validation/ and return its rows, below what each folder says of them."""
    lines = [
        "# Validation table", "",
        "Made by `python -m validation` when this page was built. Errors and half widths of the "
        "bounds are over the reference, in ppm.", "",
    ]  # fmt: skip
    for folder in FOLDERS:
        readme = ROOT.joinpath("validation", folder, "README.md").read_text(encoding="utf-8")
        title, _, rest = readme.partition("\n")
        lines += [f"## {title.lstrip('# ')}", "", re.sub("(?m)^#+ ", "### ", rest).strip(), ""]
        lines += ["| case | quantity | reference | error | half width | bounds hold it | passed |"]
        lines += ["|---|---|---|---|---|---|---|"]
        lines += [
            f"| {' | '.join(_cell(cell) for cell in cells(row))} |" for row in folder_rows(folder)
        ]
        lines.append("")
    return "\n".join(lines)


def _document_modules() -> Iterator[Any]:
    """Yield the modules of femag.export that describe a file with a format of its own."""
    for found in pkgutil.iter_modules(femag.export.__path__, "femag.export."):
        module = importlib.import_module(found.name)
        if any("format" in entry.model_fields for entry in _entries(module)):
            yield module


def _entries(module: Any) -> Iterator[type[Entry]]:
    for value in vars(module).values():
        if (
            inspect.isclass(value)
            and issubclass(value, Entry)
            and value.__module__ == module.__name__
        ):
            yield value


def _type_name(field: Any) -> str:
    annotation = field.annotation
    text = (
        annotation.__name__
        if inspect.isclass(annotation) and "[" not in str(annotation)
        else str(annotation)
    )
    return text.replace("typing.", "").replace("femag.export.", "")


def _default(entry: dict[str, Any]) -> str:
    return f"`{json.dumps(entry['default'])}`" if "default" in entry else ""


def _cell(text: str) -> str:
    return text.replace("|", "\\|")
