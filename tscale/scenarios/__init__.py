"""Another set of tables, and what it moves."""

from __future__ import annotations

from .moved import Change, Moved, WhatIf
from .run import what_if

__all__ = ["Change", "Moved", "WhatIf", "what_if"]
