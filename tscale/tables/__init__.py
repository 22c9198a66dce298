"""Tables that time scales hang on. Each is immutable and knows its name, span, date and SHA-256."""

from __future__ import annotations

from ..formats.leap_seconds import LeapSeconds
from .clock_log import ClockLog
from .clock_noise import ClockNoise
from .earth_orientation import EarthOrientation, EOPMotion, EOPValues
from .reference import ReferenceData
from .tt_bipm import TTBIPM

__all__ = [
    "TTBIPM",
    "ClockLog",
    "ClockNoise",
    "EOPMotion",
    "EOPValues",
    "EarthOrientation",
    "LeapSeconds",
    "ReferenceData",
]
