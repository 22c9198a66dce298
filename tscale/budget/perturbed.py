"""Chains whose inputs are moved: tables, logs, places and directions with errors put upon them."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any, Final

import numpy as np

from .. import exact
from ..exact import FloatArray, IntArray, Pair
from ..source import Source
from ..tables.clock_curve import ClockCurve
from ..tables.clock_log import ClockLog
from ..tables.common import since
from ..tables.earth_orientation import EarthOrientation
from ..tables.node_cubics import lagrange_cubics
from ..tables.tt_bipm import TTBIPM

__all__ = ["OrientationErrors", "ShiftedTimeEphemeris", "moved_log", "moved_source", "moved_tt_bipm"]

_MARGIN: Final = 6


def moved_log(log: ClockLog, rows: IntArray, errors_s: FloatArray) -> ClockLog:
    """A log with errors put upon the offsets of some comparisons, and predicted again from there if it is predicted."""
    curve = log._measured_curve()
    shift = np.zeros(len(curve.gap))
    shift[rows] = errors_s
    offset = exact.add_seconds(curve.offset, shift)
    moved = ClockCurve.of(
        curve.reference,
        offset,
        curve.sigma_s,
        curve.gap,
        log.interpolation,
        common_s=curve.common_s,
        reset=curve.reset,
        broken=curve.broken,
        corner=curve.corner,
    )
    if log.prediction is not None:
        moved, _ = log.prediction.of(moved, log.name)
    return replace(log, _curve=moved)


def moved_tt_bipm(table: TTBIPM, rows: IntArray, errors_s: FloatArray) -> TTBIPM:
    """A realisation of TT with errors put upon some rows."""
    shift = np.zeros(len(table.mjd))
    shift[rows] = errors_s
    first, last = (table._tai[0][:-1], table._tai[1][:-1]), (table._tai[0][1:], table._tai[1][1:])
    slope = table._slope + np.diff(shift) / since(first, last)
    return replace(table, _start_s=table._start_s + shift[:-1], _slope=slope)


class OrientationErrors:
    """An Earth orientation table cut down to the rows in use, upon which errors are put draw by draw."""

    def __init__(self, table: EarthOrientation, rows: IntArray) -> None:
        nodes = table._nodes
        first = max(int(rows.min()) - _MARGIN, 0)
        last = min(int(rows.max()) + _MARGIN, len(nodes.status) - 1)
        own, between = slice(first, last + 1), slice(first, last)
        self._first, self._table, self._mjd = first, table, table.mjd[own]
        self._nodes = nodes._replace(
            tai=(nodes.tai[0][own], nodes.tai[1][own]),
            length_s=nodes.length_s[between],
            ut1_base=nodes.ut1_base[own],
            powers=nodes.powers[between],
            sigmas=nodes.sigmas[between],
            status=nodes.status[own],
        )

    def moved(self, errors: Mapping[int, tuple[IntArray, FloatArray]]) -> EarthOrientation:
        """The table with errors upon rows of some columns, in s and rad."""
        shift = np.zeros((len(self._mjd), 5))
        for column, (rows, values) in errors.items():
            shift[rows - self._first, column] = values
        cubics = lagrange_cubics(self._nodes.tai, shift, np.zeros(len(shift)))
        nodes = self._nodes._replace(powers=self._nodes.powers + cubics)
        return replace(self._table, mjd=self._mjd, _nodes=nodes)


class ShiftedTimeEphemeris:
    """A time ephemeris with an error that runs straight between the instants where it is given."""

    def __init__(self, table: Any, at_s: FloatArray, errors_s: FloatArray) -> None:
        order = np.argsort(at_s, kind="stable")
        self._table, self._at_s, self._errors_s = table, at_s[order], errors_s[order]

    def __getattr__(self, name: str) -> Any:
        return getattr(self._table, name)

    def tt_minus_tdb_s(self, tdb: Pair) -> FloatArray:
        """TT - TDB at the geocentre, s."""
        return np.asarray(self._table.tt_minus_tdb_s(tdb) + self._error_s(tdb))

    def tt_minus_tdb_and_rate(self, tdb: Pair) -> tuple[FloatArray, FloatArray]:
        """Both; the error's own slope, below 1e-16, is left out of the rate."""
        value, rate = self._table.tt_minus_tdb_and_rate(tdb)
        return np.asarray(value + self._error_s(tdb)), rate

    def _error_s(self, tdb: Pair) -> FloatArray:
        return np.asarray(np.interp(tdb[0] + tdb[1], self._at_s, self._errors_s))


def moved_source(source: Source, errors: Mapping[str, float]) -> Source:
    """A source with errors upon its direction (in degrees, that of right ascension times cos dec) and motion."""
    found: dict[str, Any] = {name: getattr(source, name) + error for name, error in errors.items()}
    if "ra_deg" in errors:
        found["ra_deg"] = source.ra_deg + errors["ra_deg"] / math.cos(math.radians(source.dec_deg))
    return replace(source, **found)
