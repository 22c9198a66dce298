"""Where the bodies are (SPK kernels), and the time ephemeris integrated from them."""

from .bodies import BODY_IDS, PLANETARY_BODIES, body_id, body_name
from .body_time import BodyTimeEphemeris
from .chebyshev import ChebyshevTable
from .coordinate_rate import coordinate_rate
from .kernel import Ephemeris
from .time_ephemeris import TimeEphemeris

__all__ = [
    "BODY_IDS",
    "PLANETARY_BODIES",
    "BodyTimeEphemeris",
    "ChebyshevTable",
    "Ephemeris",
    "TimeEphemeris",
    "body_id",
    "body_name",
    "coordinate_rate",
]
