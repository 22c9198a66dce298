"""Adapters to other libraries; each is imported only when its function is called."""

from __future__ import annotations

from .astropy import from_astropy, to_astropy

__all__ = ["from_astropy", "to_astropy"]
