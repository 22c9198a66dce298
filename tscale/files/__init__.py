"""Bytes to instants and back: delimited text read in parts, dates as text, files replaced at once or not at all."""

from __future__ import annotations

from .atomic import replaced
from .date_text import LAYOUTS, read_dates, write_dates
from .delimited import DelimitedReader, RowBlock
from .lines import LiveLines

__all__ = ["LAYOUTS", "DelimitedReader", "LiveLines", "RowBlock", "read_dates", "replaced", "write_dates"]
