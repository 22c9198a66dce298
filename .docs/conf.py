"""Settings of Sphinx for the reference that is made from the docstrings."""

from __future__ import annotations

import re
from typing import Any

import tscale

project = "tscale"
author = "the authors of tscale"
version = release = tscale.__version__
extensions = ["sphinx.ext.autodoc", "sphinx.ext.napoleon"]
napoleon_google_docstring = False
napoleon_use_ivar = True
napoleon_use_rtype = False
default_role = "literal"  # names in docstrings stand between single backquotes
autodoc_default_options = {"members": True, "show-inheritance": True}
autodoc_typehints = "none"  # the docstrings say what the types are, with shapes and units
autodoc_member_order = "bysource"
suppress_warnings = ["ref.python"]  # types in docstrings are short names, which several modules offer
html_theme = "alabaster"
html_show_sourcelink = False
html_theme_options = {"fixed_sidebar": True, "page_width": "1100px", "sidebar_width": "240px"}


def setup(app: Any) -> None:
    """Describe what is at the top on its page alone, and each name once."""
    seen: dict[int, str] = {}

    def skip(app: Any, what: str, name: str, obj: Any, skipped: bool, options: Any) -> bool | None:
        if what != "module" or skipped:
            return None
        page = app.env.docname
        at_top = name in tscale.__all__ and getattr(tscale, name, None) is obj
        return (at_top and page != "tscale") or seen.setdefault(id(obj), page) != page or None

    def bars(app: Any, what: str, name: str, obj: Any, options: Any, lines: list[str]) -> None:
        # |x| is a length here, and a substitution for docutils.
        lines[:] = [re.sub(r"\|(?=\S[^`|]*\|)|(?<=[^`|\s])\|", r"\\|", line) for line in lines]

    app.connect("autodoc-skip-member", skip)
    app.connect("autodoc-process-docstring", bars)
