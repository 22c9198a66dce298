"""Instants as two columns of an Arrow or Parquet table, whole seconds and fraction, bit for bit (needs pyarrow).

A column of dates NAME is two columns: `NAME_whole_s` (int64) and `NAME_fraction_s` (float64, in [0, 1)), seconds since
2000-01-01T12:00:00 of the scale. The metadata of both fields say which scale and place, and which part each is. Columns
of timestamps and of ISO 8601 texts are read too; what they are labels of has to be said.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final, Literal, NamedTuple

import numpy as np

from ..errors import DataFileError, InvalidInput, MissingPiece
from ..exact import Pair
from ..instants import Instants
from ..scales import Node, Scale, check_place
from ..timecodes.dates import from_datetime64
from .date_text import read_dates

if TYPE_CHECKING:
    import pyarrow as pa

    from ..formats.leap_seconds import LeapSeconds

__all__ = ["DateColumn", "agreed", "arrow", "date_columns", "fields", "find_dates", "instants_of", "pair_of"]

ORIGIN: Final = "2000-01-01T12:00:00"
_WHOLE: Final = "_whole_s"
_FRACTION: Final = "_fraction_s"


def arrow() -> Any:
    """The pyarrow package, or `MissingPiece` that says how to get it."""
    try:
        import pyarrow
    except ImportError as error:
        raise MissingPiece("Arrow and Parquet tables need pyarrow: pip install 'tscale[tables]'") from error
    return pyarrow


class DateColumn(NamedTuple):
    """Where the dates of a table stand, and what they are."""

    name: str
    kind: Literal["counts", "timestamps", "texts"]
    indices: tuple[int, ...]
    node: Node | None
    """Scale and place by the metadata (UTC for timestamps with a time zone), None where they say nothing."""


def fields(name: str, node: Node) -> tuple[pa.Field, pa.Field]:
    """The two fields of a column of dates."""
    pa = arrow()
    common = {"time_scale": node.scale.name, "time_origin": ORIGIN, "unit": "s"}
    if node.place is not None:
        common["place"] = node.place
    return (
        pa.field(name + _WHOLE, pa.int64(), nullable=False, metadata={**common, "part": "whole"}),
        pa.field(name + _FRACTION, pa.float64(), nullable=False, metadata={**common, "part": "fraction"}),
    )


def date_columns(name: str, t: Instants) -> pa.Table:
    """Instants (any shape, flattened) as a table of two columns."""
    pa = arrow()
    schema = pa.schema(fields(name, Node(Scale.parse(t.scale), t.place)))
    return pa.table([t.whole.reshape(-1), t.fraction.reshape(-1)], schema=schema)


def find_dates(schema: pa.Schema, name: str | None = None) -> DateColumn:
    """Find the column of dates in a schema: the one named, or the only one.

    Raises
    ------
    InvalidInput
        No such column, or several without a name; the message lists those that are there.
    DataFileError
        Columns of another type, or metadata that contradict each other or name another origin.
    """
    pa = arrow()
    pairs = [
        field.name.removesuffix(_WHOLE)
        for field in schema
        if field.name.endswith(_WHOLE) and schema.get_field_index(field.name.removesuffix(_WHOLE) + _FRACTION) >= 0
    ]
    stamps = [field.name for field in schema if pa.types.is_timestamp(field.type)]
    there = list(dict.fromkeys([*pairs, *stamps]))
    listed = ", ".join(there) or "none"
    if name is None:
        if len(there) != 1:
            raise InvalidInput(
                f"the table has {len(there)} columns of dates ({listed}); name the one to be read. A column of dates "
                f"NAME is two, NAME{_WHOLE} (int64) and NAME{_FRACTION} (float64), or one of timestamps"
            )
        name = there[0]
    for wanted in (name, name + _WHOLE, name + _FRACTION):
        if len(schema.get_all_field_indices(wanted)) > 1:
            raise InvalidInput(f"the table has {wanted!r} more than once; rename all but one")
    if name not in pairs:
        return _single(schema, name, listed)
    whole, fraction = (schema.get_field_index(name + ending) for ending in (_WHOLE, _FRACTION))
    for index, kind in ((whole, pa.int64()), (fraction, pa.float64())):
        if schema.field(index).type != kind:
            raise DataFileError(
                f"column {schema.field(index).name!r} is {schema.field(index).type}, dates need {kind}: cast it"
            )
    return DateColumn(name, "counts", (whole, fraction), _node(name, [schema.field(whole), schema.field(fraction)]))


def _single(schema: pa.Schema, name: str, listed: str) -> DateColumn:
    """A column of timestamps or of texts."""
    pa = arrow()
    index = schema.get_field_index(name)
    if index < 0:
        raise InvalidInput(
            f"the table has no column of dates {name!r} (there: {listed}); it would be two columns, {name}{_WHOLE} "
            f"(int64) and {name}{_FRACTION} (float64), or one of timestamps or ISO 8601 texts"
        )
    kind = schema.field(index).type
    if pa.types.is_timestamp(kind):
        return DateColumn(name, "timestamps", (index,), None if kind.tz is None else Node.parse("UTC"))
    views = getattr(pa.types, "is_string_view", lambda kind: False)  # since pyarrow 16
    if pa.types.is_string(kind) or pa.types.is_large_string(kind) or views(kind):
        return DateColumn(name, "texts", (index,), None)
    raise DataFileError(f"column {name!r} is {kind}; dates are two columns of counts, timestamps or texts")


def _node(name: str, pair: list[Any]) -> Node | None:
    said = [{k: v.decode("utf-8", "replace") for k, v in (field.metadata or {}).items()} for field in pair]
    keys = ("time_scale", "place", "time_origin", "unit")
    found = {key: {text[key.encode()] for text in said if key.encode() in text} for key in keys}
    for key, values in found.items():
        if len(values) > 1:
            raise DataFileError(f"the two columns of {name!r} contradict each other: {key} is {' and '.join(values)}")
    for key, wanted in (("time_origin", ORIGIN), ("unit", "s")):
        if found[key] - {wanted}:
            raise DataFileError(f"column {name!r} has {key} {found[key].pop()!r}; only {wanted!r} is understood")
    if not found["time_scale"]:
        return None
    return Node(Scale.parse(found["time_scale"].pop()), check_place(found["place"].pop() if found["place"] else None))


def pair_of(
    batch: pa.RecordBatch | pa.Table,
    column: DateColumn,
    scale: str,
    leap_seconds: LeapSeconds | None = None,
    layout: str = "iso",
) -> Pair:
    """The dates as counts of a scale; those that are counts without a copy where Arrow allows.

    Raises
    ------
    DataFileError
        Rows without a date, or with a fraction outside [0, 1), with the mask.
    TextError
        Texts that are no dates, and labels that do not exist, with the mask.
    """
    parts = []
    for index in column.indices:
        values = batch.column(index)
        if values.null_count:
            mask = np.asarray(values.is_null())
            raise DataFileError(
                f"{values.null_count} of {len(values)} rows have no date in {column.name!r}: fill them or leave them "
                "out (see .mask)",
                mask=mask,
                row=int(np.argmax(mask)) + 1,
            )
        parts.append(values.to_numpy() if hasattr(values, "num_chunks") else values.to_numpy(zero_copy_only=False))
    if column.kind == "timestamps":
        return from_datetime64(parts[0], scale, leap_seconds=leap_seconds).pair
    if column.kind == "texts":
        return read_dates(parts[0].tolist(), layout, scale, leap_seconds=leap_seconds).pair
    whole, fraction = parts
    # Two passes without a mask; a NaN fails the comparison.
    if fraction.size and not (fraction.min() >= 0.0 and fraction.max() < 1.0):
        bad = ~((fraction >= 0.0) & (fraction < 1.0))
        raise DataFileError(
            f"{int(np.count_nonzero(bad))} of {bad.size} fractions of {column.name!r} are not in [0, 1) (see .mask)",
            mask=bad,
            row=int(np.argmax(bad)) + 1,
        )
    return whole, fraction


def instants_of(
    table: pa.RecordBatch | pa.Table,
    name: str | None = None,
    *,
    node: Node | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Read the dates of a table.

    Parameters
    ----------
    table : pyarrow Table or RecordBatch
    name : str, optional
        Column of dates; may be left out if there is one.
    node : Node, optional
        Scale and place, for columns whose metadata do not say; must not contradict metadata that do.
    leap_seconds : LeapSeconds, optional
        For timestamps and texts of UTC.

    Raises
    ------
    InvalidInput, DataFileError
        As `find_dates` and `pair_of`; dates whose scale nobody says.
    """
    column = find_dates(table.schema, name)
    scale, place = agreed(column, node)
    return Instants._of(pair_of(table, column, scale.name, leap_seconds), scale, place)


def agreed(column: DateColumn, node: Node | None) -> tuple[Scale, str | None]:
    """Scale and place by the metadata and by what the caller says."""
    said = column.node
    if said is None:
        if node is None:
            raise InvalidInput(f"nothing says which scale the dates {column.name!r} are on: name the node")
        return node.scale, node.place
    places = {place for place in (said.place, None if node is None else node.place) if place is not None}
    if node is not None and (node.scale != said.scale or len(places) > 1):
        raise InvalidInput(f"the dates {column.name!r} are {said} by their metadata, not {node}")
    return said.scale, said.place if said.place is not None or node is None else node.place
