"""FITS files by the time standard (Rots et al. 2015, A&A 574, A36): time frames, event lists, good time intervals."""

from __future__ import annotations

from .events import ConvertedEvents, convert_events
from .frame import TimeFrame, read_time_frame
from .observer import site_of, source_of
from .reading import instant_blocks, read_good_time, read_instants

__all__ = [
    "ConvertedEvents",
    "TimeFrame",
    "convert_events",
    "instant_blocks",
    "read_good_time",
    "read_instants",
    "read_time_frame",
    "site_of",
    "source_of",
]
