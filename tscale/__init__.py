"""Clock readings through topocentric, geocentric and barycentric coordinate times, and back.

    bytes -> Instants -> Chain (Step . Step . Step) -> Instants -> bytes

Start with `Instants.from_iso` and `chain`. Names are imported when they are first used, so that
importing the package costs nothing, reads no table and opens no file.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from . import (
        budget,
        clocks,
        cluster,
        crosscheck,
        errors,
        fits,
        interop,
        link,
        plots,
        report,
        serial,
        timecodes,
        transforms,
    )
    from .chains import Chain, chain
    from .clocks import ClockComparison, ProperClock, compare_clocks, height_from_frequency, proper_ledger, proper_rate
    from .compiled import CompiledChain, load_compiled
    from .earth.site import Site
    from .ephemeris import Ephemeris, TimeEphemeris
    from .errors import ExtrapolationWarning, TscaleError
    from .formats.leap_seconds import LeapSeconds
    from .instants import Instants
    from .ledger import Ledger
    from .scenarios import what_if
    from .source import Source
    from .step import Step
    from .surface import SurfaceSite
    from .tables.circular_t import read_circular
    from .tables.clock_log import ClockLog
    from .tables.clock_noise import ClockNoise
    from .tables.earth_orientation import EarthOrientation
    from .tables.reference import ReferenceData
    from .tables.tt_bipm import TTBIPM
    from .trajectory import Trajectory

__version__ = "0.1.0"

__all__ = [
    "TTBIPM",
    "Chain",
    "ClockComparison",
    "ClockLog",
    "ClockNoise",
    "CompiledChain",
    "EarthOrientation",
    "Ephemeris",
    "ExtrapolationWarning",
    "Instants",
    "LeapSeconds",
    "Ledger",
    "ProperClock",
    "ReferenceData",
    "Site",
    "Source",
    "Step",
    "SurfaceSite",
    "TimeEphemeris",
    "Trajectory",
    "TscaleError",
    "budget",
    "chain",
    "clocks",
    "cluster",
    "compare_clocks",
    "crosscheck",
    "errors",
    "fits",
    "height_from_frequency",
    "interop",
    "link",
    "load_compiled",
    "plots",
    "proper_ledger",
    "proper_rate",
    "read_circular",
    "report",
    "serial",
    "timecodes",
    "transforms",
    "what_if",
]

_ROOMS = (
    "budget",
    "clocks",
    "cluster",
    "crosscheck",
    "errors",
    "fits",
    "interop",
    "link",
    "plots",
    "report",
    "serial",
    "timecodes",
    "transforms",
)
_HOMES = {
    "Chain": "chains",
    "ClockComparison": "clocks.comparison",
    "ClockLog": "tables.clock_log",
    "ClockNoise": "tables.clock_noise",
    "CompiledChain": "compiled",
    "EarthOrientation": "tables.earth_orientation",
    "Ephemeris": "ephemeris",
    "ExtrapolationWarning": "errors",
    "Instants": "instants",
    "LeapSeconds": "formats.leap_seconds",
    "Ledger": "ledger",
    "ProperClock": "clocks.proper_clock",
    "ReferenceData": "tables.reference",
    "Site": "earth.site",
    "Source": "source",
    "Step": "step",
    "SurfaceSite": "surface",
    "TTBIPM": "tables.tt_bipm",
    "TimeEphemeris": "ephemeris",
    "Trajectory": "trajectory",
    "TscaleError": "errors",
    "chain": "chains",
    "load_compiled": "compiled",
    "compare_clocks": "clocks.comparison",
    "height_from_frequency": "clocks.heights",
    "proper_ledger": "clocks.rates",
    "proper_rate": "clocks.rates",
    "read_circular": "tables.circular_t",
    "what_if": "scenarios",
}


def __getattr__(name: str) -> Any:
    """Import a public name from its room when it is first asked for."""
    if name in _ROOMS:
        return import_module(f".{name}", __name__)
    if name in _HOMES:
        return getattr(import_module(f".{_HOMES[name]}", __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}; it offers {', '.join(__all__)}")


def __dir__() -> list[str]:
    return sorted([*__all__, "__version__"])
