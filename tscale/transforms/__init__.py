"""The transforms that chains are made of: plain functions on Instants and arrays, each usable alone."""

from __future__ import annotations

from . import barycentric, geocentric, terrestrial, wavefront

__all__ = ["barycentric", "geocentric", "terrestrial", "wavefront"]
