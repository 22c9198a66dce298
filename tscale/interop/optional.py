"""Packages that are there or not."""

from __future__ import annotations

import importlib
from typing import Any

from ..errors import MissingPiece

__all__ = ["needed"]


def needed(module: str) -> Any:
    """A module of astropy, or `MissingPiece` that says how to get it."""
    try:
        return importlib.import_module(module)
    except ImportError as error:
        raise MissingPiece("this needs the package astropy: pip install 'tscale[astropy]'") from error
