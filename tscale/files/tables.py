"""Tables of dates in Parquet and Arrow files, converted in bounded memory (needs pyarrow).

A file is written under a temporary name and renamed. A folder is written part by part, each renamed when it is whole,
so that work broken off goes on where it was.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Final, NamedTuple

from ..errors import DataFileError, InvalidInput
from ..scales import Node
from .arrow_columns import DateColumn, arrow, fields, find_dates, pair_of
from .stream import Evaluator, Mapping, evaluator, in_order
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
    column: str
    """Column of dates that was added."""


def convert_table(
    mapping: Mapping,
    source: str | os.PathLike[str],
    target: str | os.PathLike[str],
    *,
    column: str | None = None,
    result: str | None = None,
    threads: int = 1,
    rows: int = ROWS,
    progress: Callable[[int, int], None] | None = None,
) -> Converted:
    """Add a column of converted dates to a table, and copy all others as they are.

    Parameters
    ----------
    mapping : Chain or CompiledChain
        Takes the dates of `column`.
    source : path
        A file that ends in .parquet, .arrow or .feather (Arrow IPC), or a folder of such files, taken in the order of
        their names.
    target : path
        A file of one of these endings, which appears when all is done; or a folder (an ending-less name), in which
        parts of `rows` x 16 rows appear as they are done. Called again with the same arguments after a break, the
        parts that are there are kept.
    column : str, optional
        Column of dates, as two columns (see `arrow_columns`); may be left out if there is one.
    result : str, optional
        Name of the new column of dates, by default the end node of the mapping.
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
        Whatever the mapping raises: nothing is left behind of a file, and of a folder the parts done so far.
    """
    if not isinstance(rows, int) or rows < 1:
        raise InvalidInput(f"rows must be a whole number from 1, got {rows!r}")
    reader = TableReader(source)
    given = find_dates(reader.schema, column)
    _check_node(given, mapping.start)
    name = str(mapping.end) if result is None else result
    added = fields(name, mapping.end)
    for field in added:
        if reader.schema.get_field_index(field.name) >= 0 or field.name in reader.schema.names:
            raise InvalidInput(f"the table has a column {field.name!r} already; name the new one otherwise (result=)")
    schema = reader.schema
    for field in added:
        schema = schema.append(field)
    work = _worker(evaluator(mapping), given, schema)
    target = Path(target)
    if table_kind(target) is not None:
        done = 0
        with table_writer(target, schema) as writer:
            for batch in in_order(work, reader.batches(rows), threads):
                writer.write_batch(batch)
                done += batch.num_rows
                if progress is not None:
                    progress(done, reader.rows)
        return Converted(done, 0, name)
    from .table_parts import PartFolder

    folder = PartFolder(target, reader, mapping, rows * 16, [given.name, name])
    return Converted(*folder.fill(schema, work, rows, threads, progress), name)


def _check_node(column: DateColumn, start: Node) -> None:
    said = column.node
    if said is not None and (said.scale != start.scale or (said.place and start.place and said.place != start.place)):
        raise InvalidInput(f"the dates {column.name!r} are {said} by their metadata; this chain takes {start}")


def _worker(
    evaluate: Evaluator, column: DateColumn, schema: pa.Schema
) -> Callable[[tuple[int, pa.RecordBatch]], pa.RecordBatch]:
    """What puts the converted dates behind the columns of a batch, given with the number of its first row."""
    module = arrow()

    def work(item: tuple[int, pa.RecordBatch]) -> pa.RecordBatch:
        first, batch = item
        try:
            whole, fraction = evaluate(pair_of(batch, column))
        except DataFileError as error:
            if error.row is not None:
                error.row += first
            raise
        columns = [*batch.columns, module.array(whole), module.array(fraction)]
        return module.RecordBatch.from_arrays(columns, schema=schema)

    return work
