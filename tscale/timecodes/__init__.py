"""Instants from and to the time codes of other systems.

GNSS weeks (`gnss`), POSIX time (`posix`), NTP (`ntp`), IEEE 1588 (`ptp`), the CCSDS codes (`ccsds`), numpy's datetime64
and Python's datetime (`dates`), and calendar fields (`calendar`). What a code cannot tell, such as a leap second or
how often a week number has rolled over, has to be said; it is never guessed.
"""

from __future__ import annotations

from . import ccsds
from .calendar import Calendar, from_calendar, to_calendar
from .dates import from_datetime, from_datetime64, to_datetime, to_datetime64
from .gnss import GnssWeek, from_gnss_week, to_gnss_week
from .ntp import NtpStamp, from_ntp, to_ntp
from .posix import from_posix, to_posix
from .ptp import PtpStamp, from_ptp, to_ptp

__all__ = [
    "Calendar",
    "GnssWeek",
    "NtpStamp",
    "PtpStamp",
    "ccsds",
    "from_calendar",
    "from_datetime",
    "from_datetime64",
    "from_gnss_week",
    "from_ntp",
    "from_posix",
    "from_ptp",
    "to_calendar",
    "to_datetime",
    "to_datetime64",
    "to_gnss_week",
    "to_ntp",
    "to_posix",
    "to_ptp",
]
