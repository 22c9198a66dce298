"""The Earth: sites, its rotation, its figure, and what an observer is."""

from __future__ import annotations

from .geodesy import geocentric_from_geodetic, geodetic_from_geocentric
from .observer import Observer
from .rotation import gcrs_from_itrs, gcrs_state_from_itrs, itrs_from_gcrs, itrs_state_from_gcrs
from .site import Site

__all__ = [
    "Observer",
    "Site",
    "gcrs_from_itrs",
    "gcrs_state_from_itrs",
    "geocentric_from_geodetic",
    "geodetic_from_geocentric",
    "itrs_from_gcrs",
    "itrs_state_from_gcrs",
]
