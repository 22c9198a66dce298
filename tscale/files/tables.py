"""Tables of dates in Parquet and Arrow files, converted in bounded memory (needs pyarrow).

A file is written under a temporary name and renamed. A folder is written part by part, each renamed when it is whole,
so that work broken off goes on where it was.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Final, NamedTuple

from ..errors import DataFileError, InvalidInput, TscaleError
from ..formats.leap_seconds import LeapSeconds
from .added_columns import Added, added_columns
from .arrow_columns import DateColumn, agreed, arrow, find_dates, pair_of
from .csv_tables import TextLayout
from .stream import Mapping, in_order
from .table_files import TableReader, table_kind, table_writer

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["Converted", "convert_table"]

ROWS: Final = 2**19
"""Rows read and mapped at a time."""


class Converted(NamedTuple):
    """What `convert_table` has done."""

    rows: int
    """Rows of the whole output."""
    found: int
    """Rows that were there already, from work that was broken off."""
    columns: tuple[str, ...]
    """Columns that were added."""


def convert_table(
    mapping: Mapping | Sequence[Mapping],
    source: str | os.PathLike[str],
    target: str | os.PathLike[str],
    *,
    column: str | None = None,
    result: str | Sequence[str] | None = None,
    ledger: bool = False,
    sigma: bool = False,
    rate: bool = False,
    leap_seconds: LeapSeconds | None = None,
    text: TextLayout | None = None,
    threads: int = 1,
    rows: int = ROWS,
    progress: Callable[[int, int], None] | None = None,
) -> Converted:
    """Add columns of converted dates to a table, and copy all others as they are.

    Parameters
    ----------
    mapping : Chain or CompiledChain, or several from one start
        Take the dates of `column`.
    source : path
        A file that ends in .parquet, .arrow or .feather (Arrow IPC) or .csv, or a folder of such files, taken in the
        order of their names.
    target : path
        A file of one of these endings, which appears when all is done (in .csv dates are ISO 8601 text, to 1 ps); or a
        folder (an ending-less name), in which parts of `rows` x 16 rows appear as they are done. Called again with the
        same arguments after a break, the parts that are there are kept.
    column : str, optional
        Column of dates: two columns of counts (see `arrow_columns`), timestamps, or ISO 8601 texts. May be left out if
        there is one of the first two kinds, and for the first column of a CSV file.
    result : str or sequence of str, optional
        Names of the new columns of dates, by default the end nodes of the mappings.
    ledger, sigma, rate : bool
        Add a column for every term, for the standard uncertainty of each result, and for d(result)/d(date) - 1; the
        first two need chains that are not compiled.
    leap_seconds : LeapSeconds, optional
        For reading timestamps and texts of UTC, and writing texts.
    text : TextLayout, optional
        How dates are written in texts: ISO 8601 on both sides, unless said.
    threads : int
        Blocks that are mapped at the same time.
    rows : int
        Rows of a block; memory is about `threads` + 3 blocks.
    progress : callable, optional
        Told rows done and rows in all after each block.

    Raises
    ------
    DataFileError
        For a file that is missing, damaged or not a table, rows without dates (with the mask), and a folder with the
        parts of another job.
    InvalidInput
        For names of other endings, a column that is not there, and one that is there already.
    TscaleError
        Whatever the mapping raises, with the row (from 1): nothing is left behind of a file, and of a folder the parts
        done so far.
    """
    if not isinstance(rows, int) or rows < 1:
        raise InvalidInput(f"rows must be a whole number from 1, got {rows!r}")
    mappings = list(mapping) if isinstance(mapping, Sequence) else [mapping]
    names = None if result is None else [result] if isinstance(result, str) else list(result)
    layout = (text or TextLayout())._replace(leap_seconds=leap_seconds)
    reader = TableReader(source, column, layout.delimiter)
    given = find_dates(reader.schema, reader.column)
    added = added_columns(mappings, names, ledger=ledger, sigma=sigma, rate=rate)
    agreed(given, mappings[0].start)
    schema = reader.schema
    for field in added.fields:
        if field.name in schema.names:
            raise InvalidInput(f"the table has a column {field.name!r} already; name the new one otherwise (result=)")
        schema = schema.append(field)
    work = _worker(added, given, schema, layout)
    target = Path(target)
    columns = tuple(field.name for field in added.fields)
    if table_kind(target) is not None:
        done = 0
        with table_writer(target, schema, layout) as writer:
            for batch in in_order(work, reader.batches(rows), threads):
                writer.write_batch(batch)
                done += batch.num_rows
                if progress is not None:
                    progress(done, reader.rows)
        return Converted(done, 0, columns)
    if target.suffix and not target.is_dir():
        raise InvalidInput(
            f"{target} is no table by its name: a file ends in .parquet, .arrow, .feather or .csv; a folder, to be "
            "filled part by part, has no ending"
        )
    from .table_parts import PartFolder

    # What counts are does not depend on leap seconds; what labels are does.
    labels = None if given.kind == "counts" else (leap_seconds or LeapSeconds.default()).sha256
    folder = PartFolder(target, reader, mappings, rows * 16, [given.name, *columns], labels)
    return Converted(*folder.fill(schema, work, rows, threads, progress), columns)


def _worker(
    added: Added, column: DateColumn, schema: pa.Schema, text: TextLayout
) -> Callable[[tuple[int, pa.RecordBatch]], pa.RecordBatch]:
    """What puts the new columns behind those of a batch, given with the number of its first row."""
    module = arrow()

    def work(item: tuple[int, pa.RecordBatch]) -> pa.RecordBatch:
        first, batch = item
        try:
            batch.validate(full=True)
        except module.ArrowException as error:
            raise DataFileError(f"the table is damaged: {str(error).partition(chr(10))[0]}; make it again") from error
        try:
            new = added.make(pair_of(batch, column, added.start.scale.name, text.leap_seconds, text.read))
        except TscaleError as error:
            if error.row is None and error.mask is not None and error.mask.shape == (batch.num_rows,):
                error.row = int(error.mask.argmax()) + 1
            if error.row is not None:
                error.row += first
            raise
        columns = [*batch.columns, *(module.array(values) for values in new)]
        return module.RecordBatch.from_arrays(columns, schema=schema)

    return work
