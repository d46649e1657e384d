"""Design files: TOML in and out, checked key by key."""

from femag.design_file.changed_file import changed_design_file
from femag.design_file.keys import (
    as_written,
    files_of,
    folder_of,
    plain_value,
    unit_of_key,
    with_key,
)
from femag.design_file.messages import first_error
from femag.design_file.reading import (
    check_tables,
    design_from_document,
    design_from_toml,
    read_design,
    read_document,
)
from femag.design_file.tables import DesignTable
from femag.design_file.waveform_file import read_ripple
from femag.design_file.writing import design_document, design_toml

__all__ = [
    "DesignTable",
    "as_written",
    "changed_design_file",
    "check_tables",
    "design_document",
    "design_from_document",
    "design_from_toml",
    "design_toml",
    "files_of",
    "first_error",
    "folder_of",
    "plain_value",
    "read_design",
    "read_document",
    "read_ripple",
    "unit_of_key",
    "with_key",
]
