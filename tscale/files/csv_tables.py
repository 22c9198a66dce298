"""Comma-separated text as a table: read in blocks and written with dates as ISO 8601 text (needs pyarrow)."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, NamedTuple

from ..errors import DataFileError
from ..instants import Instants
from .arrow_columns import arrow, find_dates, instants_of
from .date_text import write_dates

if TYPE_CHECKING:
    import pyarrow as pa

    from ..formats.leap_seconds import LeapSeconds

__all__ = ["CsvSource", "CsvTarget", "TextLayout"]

_BLOCK_BYTES: Final = 2**24


class TextLayout(NamedTuple):
    """How dates are written in text, on either side of a conversion (see `date_text`)."""

    read: str = "iso"
    written: str = "iso"
    digits: int | None = None
    """Decimals written; None resolves a picosecond."""
    delimiter: str = ","
    leap_seconds: LeapSeconds | None = None


class CsvSource:
    """A CSV file with a header; lines that begin with # above it are passed over.

    The column of dates is kept as text. Types of the others are told from the first 16 MiB.

    Attributes
    ----------
    schema : pyarrow.Schema
    rows : int
        Lines below the header: more than rows where a cell holds a line break.
    """

    def __init__(self, path: Path, column: str | None, delimiter: str = ",") -> None:
        self._path, self._delimiter = path, delimiter
        self._above, header = _header(path, delimiter)
        self.column = header[0] if column is None else column
        with path.open("rb") as file:
            lines = sum(block.count(b"\n") for block in iter(lambda: file.read(2**20), b""))
        self.rows = max(0, lines - self._above - 1)
        reader = self._reader()
        self.schema = reader.schema
        reader.close()

    def _reader(self) -> Any:
        pa = arrow()
        from pyarrow import csv as arrow_csv

        return arrow_csv.open_csv(
            self._path,
            read_options=arrow_csv.ReadOptions(block_size=_BLOCK_BYTES, skip_rows=self._above),
            parse_options=arrow_csv.ParseOptions(delimiter=self._delimiter),
            convert_options=arrow_csv.ConvertOptions(column_types={self.column: pa.string()}),
        )

    def batches(self, rows: int, first: int) -> Iterator[tuple[int, Any]]:
        """Blocks of at most `rows` rows from row `first` on, each with the number of its first row."""
        at = 0
        with self._reader() as reader:
            for batch in reader:
                for start in range(max(0, first - at), batch.num_rows, rows):
                    yield at + start, batch.slice(start, rows)
                at += batch.num_rows

    def close(self) -> None:
        """Nothing is held open."""


def _header(path: Path, delimiter: str) -> tuple[int, list[str]]:
    """Lines above the header, and the names in it."""
    above = 0
    try:
        with path.open(encoding="utf-8-sig", newline="") as file:
            for line in file:
                if not line.startswith("#"):
                    names = next(csv.reader([line], delimiter=delimiter), [])
                    if names:
                        return above, names
                above += 1
    except UnicodeDecodeError as error:
        raise DataFileError(f"{path} is not UTF-8 text: {error}", path=path) from error
    raise DataFileError(f"{path} has no header: its first line names the columns", path=path)


class CsvTarget:
    """A writer of record batches: dates that are two columns of counts become one of text."""

    def __init__(self, sink: Any, schema: pa.Schema, text: TextLayout) -> None:
        pa = arrow()
        from pyarrow import csv as arrow_csv

        self._text = text
        dates = [name.removesuffix("_whole_s") for name in schema.names if name.endswith("_whole_s")]
        self._dates = [name for name in dates if f"{name}_fraction_s" in schema.names and _dated(schema, name)]
        fields = []
        for field in schema:
            name = field.name.removesuffix("_whole_s")
            if name in self._dates and field.name.endswith("_whole_s"):
                fields.append(pa.field(name, pa.string()))
            elif field.name.removesuffix("_fraction_s") not in self._dates:
                fields.append(field)
        self._schema = pa.schema(fields)
        self._writer = arrow_csv.CSVWriter(
            sink, self._schema, write_options=arrow_csv.WriteOptions(quoting_style="needed")
        )

    def write_batch(self, batch: pa.RecordBatch) -> None:
        """Write the rows of a batch."""
        pa = arrow()
        columns = []
        for field in self._schema:
            if field.name in self._dates:
                t: Instants = instants_of(batch, field.name)
                texts = write_dates(t, self._text.written, self._text.digits, leap_seconds=self._text.leap_seconds)
                columns.append(pa.array(texts, pa.string()))
            else:
                columns.append(batch.column(batch.schema.get_field_index(field.name)))
        self._writer.write_batch(pa.RecordBatch.from_arrays(columns, schema=self._schema))

    def __enter__(self) -> CsvTarget:
        return self

    def __exit__(self, *error: object) -> None:
        self._writer.close()


def _dated(schema: pa.Schema, name: str) -> bool:
    return find_dates(schema, name).node is not None
