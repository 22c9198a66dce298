"""Dates in frames: pandas, polars, pyarrow, whatever else shows itself as an Arrow stream; numpy's structured arrays.

A column of dates NAME is two, `NAME_whole_s` (int64) and `NAME_fraction_s` (float64), as in `files.arrow_columns`, bit
for bit. A pyarrow table keeps scale and place in the metadata of the two; pandas and polars have no room for
them, so that `scale=` has to be said. Columns of datetimes and of ISO 8601 texts are read where they are named.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..files.added_columns import added_columns
from ..files.arrow_columns import agreed, arrow, fields, find_dates, instants_of, pair_of
from ..files.stream import Mapping
from ..instants import Instants
from ..scales import Node, Scale, check_place

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = ["add_to_frame", "convert_frame", "from_frame"]

_ENDINGS: Final = ("_whole_s", "_fraction_s")


def from_frame(
    frame: Any,
    column: str | None = None,
    *,
    scale: str | None = None,
    place: str | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Read a column of dates of a frame.

    Parameters
    ----------
    frame : pandas, polars or pyarrow table, or a structured numpy array
        Anything with `__arrow_c_stream__` (needs pyarrow), or an array with named fields (which does not).
    column : str, optional
        Column of dates: NAME of two columns of counts; datetimes, whose labels are those of `scale` (those with a time
        zone are UTC); or ISO 8601 texts. May be left out if there is one of the first two kinds.
    scale, place : str, optional
        What the dates are; must not contradict metadata that say.
    leap_seconds : LeapSeconds, optional
        For datetimes and texts of UTC.

    Returns
    -------
    Instants
        One a row.

    Raises
    ------
    InvalidInput
        No such column, several without a name, a scale that nobody says, anything that is no frame.
    DataFileError
        Rows without a date or with a fraction outside [0, 1), with the mask.
    TextError
        Texts that are no dates, with the mask.
    """
    table = _arrow_table(frame, column)
    node = None if scale is None else Node(Scale.parse(scale), check_place(place))
    t = instants_of(table, column, node=node, leap_seconds=leap_seconds)
    if place is not None and t.place is None:
        return t.at(place)
    if place is not None and t.place != place:
        raise InvalidInput(f"these dates are at {t.place} by their metadata, not at {place}")
    return t


def add_to_frame(frame: Any, instants: Instants, name: str) -> Any:
    """The frame with two more columns, `NAME_whole_s` and `NAME_fraction_s`; the one given stays as it was.

    Parameters
    ----------
    frame : pandas, polars or pyarrow table, or a structured numpy array
    instants : Instants (n,)
        One a row.
    name : str

    Returns
    -------
    frame
        Of the same kind, all other columns as they were (a pandas index too); a pyarrow table for any other kind.

    Raises
    ------
    InvalidInput
        Another number of instants than rows, or names that are taken.
    """
    if not isinstance(instants, Instants):
        raise InvalidInput(f"add_to_frame takes Instants, got {type(instants).__name__}")
    if instants.ndim != 1:
        raise InvalidInput(f"a column holds one instant a row, got the shape {instants.shape}; use .ravel()")
    names = [name + ending for ending in _ENDINGS]
    return _added(frame, names, list(instants.pair), lambda: fields(name, instants.node))


def convert_frame(
    frame: Any,
    mapping: Mapping | Sequence[Mapping],
    column: str | None = None,
    *,
    result: str | Sequence[str] | None = None,
    ledger: bool = False,
    sigma: bool = False,
    rate: bool = False,
    leap_seconds: LeapSeconds | None = None,
) -> Any:
    """The frame with columns of converted dates, and on request of terms, uncertainties and rates.

    Parameters
    ----------
    frame : pandas, polars or pyarrow table, or a structured numpy array
    mapping : Chain or CompiledChain, or several from one start
        Take the dates of `column`, on the scale of their start.
    column : str, optional
        As for `from_frame`.
    result : str or sequence of str, optional
        Names of the new columns of dates, by default the end nodes.
    ledger, sigma, rate : bool
        As for `files.tables.convert_table`.
    leap_seconds : LeapSeconds, optional
        For reading datetimes and texts of UTC.

    Returns
    -------
    frame
        As `add_to_frame`.
    """
    mappings = list(mapping) if isinstance(mapping, Sequence) else [mapping]
    names = [result] if isinstance(result, str) else result
    table = _arrow_table(frame, column)
    added = added_columns(mappings, names, ledger=ledger, sigma=sigma, rate=rate)
    given = find_dates(table.schema, column)
    agreed(given, added.start)
    pair = pair_of(table, given, added.start.scale.name, leap_seconds)
    values = added.make((np.asarray(pair[0]), np.asarray(pair[1])))
    return _added(frame, [field.name for field in added.fields], values, lambda: added.fields)


# ---- the kinds of frames -------------------------------------------------------------------------


def _is_of(frame: Any, package: str, kind: str) -> bool:
    """Whether a frame is of a package, which then is loaded: nothing is imported to find out."""
    module = sys.modules.get(package)
    return module is not None and isinstance(frame, getattr(module, kind))


def _structured(frame: Any) -> bool:
    return isinstance(frame, np.ndarray) and frame.dtype.names is not None


def _arrow_table(frame: Any, column: str | None) -> Any:
    """The columns that may hold the dates, as an Arrow table."""
    pa = arrow()
    if _structured(frame):
        flat = frame.reshape(-1)
        names = _wanted(list(frame.dtype.names), column)
        return pa.table({name: _arrow_array(flat[name]) for name in names if flat[name].ndim == 1})
    _check_frame(frame)
    if _is_of(frame, "pandas", "DataFrame"):
        if any(not isinstance(name, str) for name in frame.columns) or not frame.columns.is_unique:
            raise InvalidInput("the columns of this frame need names, each once, that are texts: rename them")
        frame = frame[_wanted(list(frame.columns), column)]
    elif _is_of(frame, "polars", "DataFrame"):
        frame = frame[_wanted(list(frame.columns), column)]
    try:
        return _plain_texts(pa.table(frame))
    except (pa.ArrowException, TypeError) as error:
        raise InvalidInput(f"this frame cannot be read through Arrow ({error}); name the column of dates") from error


def _plain_texts(table: Any) -> Any:
    """Texts that an Arrow stream brings as views, as texts of the common kind."""
    pa = arrow()
    views = getattr(pa.types, "is_string_view", lambda kind: False)
    for index, field in enumerate(table.schema):
        if views(field.type):
            plain = field.with_type(pa.large_string())
            table = table.set_column(index, plain, table.column(index).cast(pa.large_string()))
    return table


def _check_frame(frame: Any) -> None:
    if not hasattr(frame, "__arrow_c_stream__"):
        hint = ": collect() it first" if type(frame).__name__ == "LazyFrame" else ""
        raise InvalidInput(
            "a frame offers its columns as an Arrow stream (pandas from 2.2, polars, pyarrow) or is a structured numpy "
            f"array; {type(frame).__name__} is neither{hint}"
        )


def _wanted(names: list[str], column: str | None) -> list[str]:
    """Only the columns that are asked for, so that no other has to be carried over."""
    if column is None:
        return names
    pair = [column + ending for ending in _ENDINGS]
    if all(name in names for name in pair):
        return pair
    return [column] if column in names else names


def _arrow_array(values: npt.NDArray[Any]) -> Any:
    pa = arrow()
    if values.dtype.kind == "U":
        return pa.array(values.tolist(), pa.string())
    return pa.array(np.ascontiguousarray(values))


def _added(frame: Any, names: list[str], values: list[Any], described: Callable[[], Sequence[Any]]) -> Any:
    """The frame with columns behind its own."""
    arrays = [np.asarray(value) for value in values]
    structured = _structured(frame)
    if not structured:
        _check_frame(frame)
    if structured:
        there = list(frame.dtype.names)
    elif hasattr(frame, "column_names"):
        there = list(frame.column_names)
    else:
        there = list(getattr(frame, "columns", []))
    taken = [name for name in names if name in there]
    if taken or len(set(names)) != len(names):
        raise InvalidInput(f"the frame has a column {(taken or names)[0]!r} already; name the new one otherwise")
    rows = frame.size if structured else _rows(frame)
    if any(array.shape != (rows,) for array in arrays):
        raise InvalidInput(f"{arrays[0].size} instants do not fit {rows} rows: a column holds one a row")
    if structured:
        return _with_fields(frame, names, arrays)
    if _is_of(frame, "pandas", "DataFrame"):
        return frame.assign(**dict(zip(names, arrays, strict=True)))
    if _is_of(frame, "polars", "DataFrame"):
        make = sys.modules["polars"].Series
        return frame.with_columns([make(name, array) for name, array in zip(names, arrays, strict=True)])
    table = arrow().table(frame)
    for field, array in zip(described(), arrays, strict=True):
        table = table.append_column(field, arrow().array(array))
    return table


def _rows(frame: Any) -> int:
    return int(frame.num_rows) if hasattr(frame, "num_rows") else len(frame)


def _with_fields(frame: npt.NDArray[Any], names: list[str], arrays: list[npt.NDArray[Any]]) -> npt.NDArray[Any]:
    old = frame.dtype
    assert old.names is not None
    parts: list[Any] = [(name, old[name]) for name in old.names]
    parts += [(name, array.dtype) for name, array in zip(names, arrays, strict=True)]
    out = np.empty(frame.shape, dtype=parts)
    for name in old.names:
        out[name] = frame[name]
    for name, array in zip(names, arrays, strict=True):
        out[name] = array.reshape(frame.shape)
    return out
