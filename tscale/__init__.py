"""Clock readings through topocentric, geocentric and barycentric coordinate times, and back.

    bytes -> Instants -> Chain (Step . Step . Step) -> Instants -> bytes

Start with `Instants.from_iso` and `chain`. Names are imported when they are first used, so that
importing the package costs nothing, reads no table and opens no file.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from . import errors, interop, link, transforms
    from .chains import Chain, chain
    from .earth.site import Site
    from .ephemeris import Ephemeris, TimeEphemeris
    from .errors import ExtrapolationWarning, TscaleError
    from .formats.leap_seconds import LeapSeconds
    from .instants import Instants
    from .ledger import Ledger
    from .source import Source
    from .step import Step
    from .surface import SurfaceSite
    from .tables.clock_log import ClockLog
    from .tables.earth_orientation import EarthOrientation
    from .tables.reference import ReferenceData
    from .tables.tt_bipm import TTBIPM
    from .trajectory import Trajectory

__version__ = "0.1.0"

__all__ = [
    "TTBIPM",
    "Chain",
    "ClockLog",
    "EarthOrientation",
    "Ephemeris",
    "ExtrapolationWarning",
    "Instants",
    "LeapSeconds",
    "Ledger",
    "ReferenceData",
    "Site",
    "Source",
    "Step",
    "SurfaceSite",
    "TimeEphemeris",
    "Trajectory",
    "TscaleError",
    "chain",
    "errors",
    "interop",
    "link",
    "transforms",
]

_ROOMS = ("errors", "interop", "link", "transforms")
_HOMES = {
    "Chain": "chains",
    "ClockLog": "tables.clock_log",
    "EarthOrientation": "tables.earth_orientation",
    "Ephemeris": "ephemeris",
    "ExtrapolationWarning": "errors",
    "Instants": "instants",
    "LeapSeconds": "formats.leap_seconds",
    "Ledger": "ledger",
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
