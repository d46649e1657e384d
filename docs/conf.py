"""Sphinx configuration: ``sphinx-build -W docs build/docs``."""

import sys
from importlib.metadata import version as installed_version
from pathlib import Path

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE))

from reference_pages import write_reference_pages  # noqa: E402

project = "Gapfield"
author = "The Gapfield authors"
copyright = "The Gapfield authors, GPL-3.0-or-later"
version = release = installed_version("gapfield")

extensions = ["myst_parser", "sphinx.ext.autodoc", "sphinx.ext.napoleon", "sphinx.ext.viewcode"]
exclude_patterns = ["README.md"]
myst_enable_extensions = ["colon_fence"]
myst_heading_anchors = 3

add_module_names = False
autodoc_typehints = "none"
autodoc_member_order = "bysource"
autodoc_default_options = {"members": True}
napoleon_google_docstring = False
napoleon_use_param = False
napoleon_use_rtype = False
napoleon_use_ivar = True

html_theme = "furo"
html_title = f"Gapfield {release}"
html_copy_source = False
html_show_sphinx = False

write_reference_pages(HERE / "reference")
