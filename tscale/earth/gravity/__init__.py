"""Gravity: the normal field, measured fields and the tide-raising potential."""

from __future__ import annotations

from .field import EARTH_ZONAL, GravityField, ZonalField
from .harmonic import HarmonicField
from .normal import GRS80, WGS84, NormalField, geopotential_number_m2_s2, height_above_geoid_m
from .tidal import ground_tidal_potential_m2_s2, ground_tide_factor, permanent_tide_m2_s2, tidal_potential_m2_s2

__all__ = [
    "EARTH_ZONAL",
    "GRS80",
    "WGS84",
    "GravityField",
    "HarmonicField",
    "NormalField",
    "ZonalField",
    "geopotential_number_m2_s2",
    "ground_tidal_potential_m2_s2",
    "ground_tide_factor",
    "height_above_geoid_m",
    "permanent_tide_m2_s2",
    "tidal_potential_m2_s2",
]
