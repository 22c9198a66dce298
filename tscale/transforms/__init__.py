"""The transforms that chains are made of: plain functions on Instants and arrays, each usable alone."""

from __future__ import annotations

from . import barycentric, body_events, geocentric, lunar, planetary, proper_time, shapiro, terrestrial, wavefront
from .barycentric import tcb_to_tcg, tcb_to_tdb, tcg_to_tcb, tdb_to_tcb, tdb_to_tt, topocentric_terms, tt_to_tdb
from .geocentric import tcg_to_tt, tt_to_tcg
from .terrestrial import (
    clock_to_reference,
    reference_to_clock,
    tai_to_tt_bipm,
    tai_to_ut1,
    to_fixed_scale,
    tt_bipm_to_tai,
    ut1_to_tai,
)
from .wavefront import barycenter_to_observer, observer_to_barycenter, wavefront_terms

__all__ = [
    "barycenter_to_observer",
    "barycentric",
    "body_events",
    "clock_to_reference",
    "geocentric",
    "lunar",
    "observer_to_barycenter",
    "planetary",
    "proper_time",
    "reference_to_clock",
    "shapiro",
    "tai_to_tt_bipm",
    "tai_to_ut1",
    "tcb_to_tcg",
    "tcb_to_tdb",
    "tcg_to_tcb",
    "tcg_to_tt",
    "tdb_to_tcb",
    "tdb_to_tt",
    "terrestrial",
    "to_fixed_scale",
    "topocentric_terms",
    "tt_bipm_to_tai",
    "tt_to_tcg",
    "tt_to_tdb",
    "ut1_to_tai",
    "wavefront",
    "wavefront_terms",
]
