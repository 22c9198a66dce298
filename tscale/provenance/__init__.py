"""Where a result comes from: its steps, tables, logs and versions, as JSON and as lines for the head of a file."""

from __future__ import annotations

from .content import content_sha256
from .record import ClockRecord, Provenance, StepRecord, TableRecord, provenance_of
from .tables_read import tables_read

__all__ = [
    "ClockRecord",
    "Provenance",
    "StepRecord",
    "TableRecord",
    "content_sha256",
    "provenance_of",
    "tables_read",
]
