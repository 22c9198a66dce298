"""Instants, comparison logs and the ledger as fields of a document."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ..exact import Pair
from ..instants import Instants
from ..ledger import Ledger, LedgerLine
from ..tables.clock_bends import Bend, Stencil
from ..tables.clock_curve import ClockCurve
from ..tables.clock_log import ClockLog
from ..tables.clock_noise import ClockNoise
from ..tables.clock_prediction import Forecast, Prediction
from ..tables.clock_rows import LogMark, LogRemark
from .kind import Context, Fields, Kind, of_class
from .values import array_of, damaged, numbers_of, shape_of

__all__ = ["DATED", "checked_pair"]

# Laid out anew from these: the rest of a curve is derived.
_CURVE: Final = (
    "reference",
    "offset",
    "change_s",
    "bend",
    "stencil",
    "gap",
    "broken",
    "corner",
    "sigma_s",
    "common_s",
    "step",
    "reset",
)
_LOG: Final = (
    "scale",
    "reference",
    "name",
    "interpolation",
    "sha256",
    "marks",
    "noise",
    "prediction",
    "remarks",
    "files",
)


def checked_pair(pair: Any, shape: tuple[int, ...] | None, what: str) -> Pair:
    """A pair of arrays (int64, float64 in [0, 1)) of one shape."""
    if not isinstance(pair, tuple) or len(pair) != 2:
        raise damaged(f"{what} is a pair (whole, fraction)")
    whole, fraction = (np.asarray(part) for part in pair)
    if whole.dtype != np.int64 or fraction.dtype != np.float64 or whole.shape != fraction.shape:
        raise damaged(f"{what} is a pair of int64 and float64 of one shape")
    if shape is not None and whole.shape != shape:
        raise damaged(f"{what} has the shape {whole.shape}, not {shape}")
    if not np.all((fraction >= 0.0) & (fraction < 1.0)):
        raise damaged(f"fractions of {what} are not in [0, 1)")
    # Scalars stay scalars, so that the same is written again.
    return (whole, fraction) if whole.ndim or isinstance(pair[0], np.ndarray) else (whole[()], fraction[()])


# ---- Instants ------------------------------------------------------------------------------------


def _take_instants(t: Instants) -> Fields:
    # Flat lists, so that other languages find two columns and not an array of ours.
    return {
        "scale": t.scale,
        "place": t.place,
        "shape": t.shape,
        "whole": tuple(numbers_of(t.whole)),
        "fraction": tuple(numbers_of(t.fraction)),
    }


def _make_instants(fields: Fields, context: Context) -> Instants:
    parts = []
    for name, dtype in (("whole", "int64"), ("fraction", "float64")):
        if not isinstance(fields[name], tuple):
            raise damaged(f"{name} of Instants is a list of numbers")
        parts.append(array_of(dtype, [len(fields[name])], list(fields[name])))
    shape = shape_of(list(fields["shape"]) if isinstance(fields["shape"], tuple) else fields["shape"])
    if parts[0].size != parts[1].size or parts[0].size != int(np.prod(shape, dtype=np.int64)):
        raise damaged(f"{parts[0].size} whole seconds and {parts[1].size} fractions for instants of shape {shape}")
    whole, fraction = checked_pair((parts[0], parts[1]), None, "instants")
    return Instants(whole.reshape(shape), fraction.reshape(shape), fields["scale"], fields["place"])


# ---- comparison logs -----------------------------------------------------------------------------


def _take_log(log: ClockLog) -> Fields:
    # Not where its file lies: that says something of a machine and nothing of the clock. Name and hash are there.
    return {**{name: getattr(log, name) for name in _LOG}, "forecasts": log._forecasts, "curve": log._curve}


def _make_log(fields: Fields, context: Context) -> ClockLog:
    curve, forecasts = fields.pop("curve"), fields.pop("forecasts")
    count = len(curve.gap)
    for found in forecasts:
        if not 0 <= found.interval < count or not np.all((found.nodes >= 0) & (found.nodes < count)):
            raise damaged("a prediction of a log hangs on comparisons that it does not hold")
    fields["path"] = None  # also of documents that say one
    return ClockLog(**fields, _curve=curve, _forecasts=forecasts)


def _take_curve(curve: ClockCurve) -> Fields:
    return {name: getattr(curve, name) for name in _CURVE}


def _make_curve(fields: Fields, context: Context) -> ClockCurve:
    gap = np.asarray(fields["gap"])
    size = gap.shape
    if gap.ndim != 1 or gap.size < 2:
        raise damaged("a log has two or more comparisons")
    for name, dtype in (("gap", np.bool_), ("broken", np.bool_), ("corner", np.bool_)):
        _check(fields[name], size, np.dtype(dtype), name)
    for name in ("change_s", "sigma_s", "common_s"):
        _check(fields[name], size, np.dtype(np.float64), name)
    for name in ("reference", "offset", "reset"):
        fields[name] = checked_pair(fields[name], size, name)
    bend, stencil = fields["bend"], fields["stencil"]
    for part in [*(bend or ())]:
        _check(part, size, np.dtype(np.float64), "bend")
    for part in [*(stencil or ())]:
        _check(part, size, None, "stencil")
    if not isinstance(fields["step"], bool):
        raise damaged("step of a log is true or false")
    return ClockCurve.laid(**fields)


def _check(value: Any, shape: tuple[int, ...], dtype: Any, what: str) -> None:
    if not isinstance(value, np.ndarray) or value.shape != shape or (dtype is not None and value.dtype != dtype):
        raise damaged(f"{what} of a log is an array of {dtype or 'numbers'}, one a comparison")


# ---- ledger --------------------------------------------------------------------------------------


def _take_ledger(ledger: Ledger) -> Fields:
    return {"shape": ledger.shape, "lines": tuple(ledger._lines.values()), "notes": ledger.notes}


def _make_ledger(fields: Fields, context: Context) -> Ledger:
    shape = shape_of(list(fields["shape"]))
    for line in fields["lines"]:
        pair = checked_pair(line.value, None, f"the term {line.term!r}")
        if np.broadcast_shapes(pair[0].shape, shape) != shape:
            raise damaged(f"the term {line.term!r} does not fit the shape {shape}")
    return Ledger(list(fields["lines"]), shape, fields["notes"])


def _take_line(line: LedgerLine) -> Fields:
    whole, fraction = line.value
    return {
        "step": line.step,
        "term": line.term,
        "value": (np.asarray(whole, dtype=np.int64), np.asarray(fraction, dtype=np.float64)),
    }


def _make_line(fields: Fields, context: Context) -> LedgerLine:
    return LedgerLine(**fields)


DATED: Final = (
    Kind("Instants", Instants, _take_instants, _make_instants, ("scale", "place", "shape", "whole", "fraction")),
    Kind("ClockLog", ClockLog, _take_log, _make_log, (*_LOG, "forecasts", "curve"), ("path",)),
    Kind("ClockCurve", ClockCurve, _take_curve, _make_curve, _CURVE),
    Kind("Ledger", Ledger, _take_ledger, _make_ledger, ("shape", "lines", "notes")),
    Kind("LedgerLine", LedgerLine, _take_line, _make_line, ("step", "term", "value")),
    *(of_class(cls) for cls in (Bend, Stencil, ClockNoise, Forecast, LogMark, LogRemark, Prediction)),
)
