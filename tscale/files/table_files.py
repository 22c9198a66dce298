"""Parquet, Arrow IPC and CSV files: one way to read them in blocks, and to write them at once or not at all."""

from __future__ import annotations

import contextlib
import hashlib
import json
import os
import secrets
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from ..errors import DataFileError, InvalidInput
from .arrow_columns import arrow
from .csv_tables import CsvSource, CsvTarget, TextLayout

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["JOB", "TableReader", "table_kind", "table_writer"]

JOB: Final = "_job.json"
"""What a folder of parts is part of."""

_PLAIN: Final = TextLayout()
_KINDS: Final = {".parquet": "parquet", ".arrow": "arrow", ".feather": "arrow", ".csv": "csv"}


def table_kind(path: str | os.PathLike[str]) -> str | None:
    """`parquet`, `arrow` or `csv` by the ending of a name, None for any other."""
    return _KINDS.get(Path(path).suffix.lower())


class TableReader:
    """A table in one file, or in the files of a folder in the order of their names.

    Attributes
    ----------
    path : Path
    schema : pyarrow.Schema
    rows : int
        In all files.
    column : str or None
        Column of dates: as asked for, or the first of a CSV file.
    """

    def __init__(self, path: str | os.PathLike[str], column: str | None = None, delimiter: str = ",") -> None:
        self.path = Path(path)
        self._column, self._delimiter = column, delimiter
        if self.path.is_dir():
            self._files = sorted(
                p for p in self.path.iterdir() if table_kind(p) is not None and not p.name.startswith((".", "_"))
            )
            if not self._files:
                raise DataFileError(f"{path} holds no file that ends in {', '.join(_KINDS)}", path=self.path)
        elif table_kind(self.path) is None:
            raise InvalidInput(f"{path} is no table by its name: it must end in {', '.join(_KINDS)}, or be a folder")
        else:
            self._files = [self.path]
        self.rows = 0
        self.schema: Any = None
        for file in self._files:
            with _opened(file, column, delimiter) as source:
                schema, rows = source.schema, source.rows
                self.column = getattr(source, "column", column)
            if self.schema is None:
                self.schema = schema
            elif not schema.equals(self.schema, check_metadata=False):
                different = _difference(self.schema, schema)
                raise DataFileError(f"{file} has other columns than {self._files[0]}: {different}", path=file)
            self.rows += rows
        if self.path.is_dir():
            _require_whole(self.path, self.rows)

    def batches(self, rows: int, first: int = 0) -> Iterator[tuple[int, pa.RecordBatch]]:
        """Blocks of at most `rows` rows from row `first` on, each with the number of its first row (from 0)."""
        at = 0
        for file in self._files:
            with _opened(file, self._column, self._delimiter) as source:
                if at + source.rows <= first:
                    at += source.rows
                    continue
                for batch in source.batches(rows, max(0, first - at)):
                    yield at + batch[0], batch[1]
                at += source.rows

    @property
    def digest(self) -> str:
        """SHA-256 over names, sizes and dates of change of the files: what tells that they are the same as before."""
        facts = [(file.name, (stat := file.stat()).st_size, stat.st_mtime_ns) for file in self._files]
        return hashlib.sha256(repr(facts).encode()).hexdigest()


def _require_whole(folder: Path, rows: int) -> None:
    """Refuse a folder of parts (`table_parts`) that is still being filled."""
    job = folder / JOB
    if not job.exists():
        return
    try:
        wanted = json.loads(job.read_text(encoding="utf-8"))["rows"]
    except (OSError, ValueError, KeyError, TypeError, RecursionError) as error:
        raise DataFileError(f"{job} is damaged ({error}): make the parts in {folder} anew", path=job) from error
    if wanted != rows:
        raise DataFileError(
            f"{folder} holds {rows} of {wanted} rows: a conversion was broken off; run it again, and it goes on there",
            path=folder,
        )


def _difference(one: Any, other: Any) -> str:
    mine, theirs = ({f"{field.name} ({field.type})" for field in schema} for schema in (one, other))
    return ", ".join(sorted(mine ^ theirs)) or "in another order"


class _Parquet:
    def __init__(self, path: Path) -> None:
        from pyarrow import parquet

        self._file: Any = parquet.ParquetFile(path, memory_map=True)
        self.schema = self._file.schema_arrow
        self.rows = self._file.metadata.num_rows

    def batches(self, rows: int, first: int) -> Iterator[tuple[int, Any]]:
        metadata, at = self._file.metadata, 0
        groups: list[int] = []
        for group in range(metadata.num_row_groups):
            size = metadata.row_group(group).num_rows
            if at + size > first or groups:
                groups.append(group)
            else:
                at += size
        for batch in self._file.iter_batches(batch_size=rows, row_groups=groups):
            skip = min(max(0, first - at), batch.num_rows)
            if skip < batch.num_rows:
                yield at + skip, batch.slice(skip)
            at += batch.num_rows

    def close(self) -> None:
        self._file.close()


class _Ipc:
    def __init__(self, path: Path) -> None:
        pa = arrow()
        self._map = pa.memory_map(str(path))
        self._file = pa.ipc.open_file(self._map)
        self.schema = self._file.schema
        self._sizes = [self._file.get_batch(i).num_rows for i in range(self._file.num_record_batches)]
        self.rows = sum(self._sizes)

    def batches(self, rows: int, first: int) -> Iterator[tuple[int, Any]]:
        at = 0
        for i, size in enumerate(self._sizes):
            if at + size > first:
                batch = self._file.get_batch(i)
                for start in range(max(0, first - at), size, rows):
                    yield at + start, batch.slice(start, rows)
            at += size

    def close(self) -> None:
        self._map.close()


@contextlib.contextmanager
def _opened(path: Path, column: str | None, delimiter: str) -> Iterator[Any]:
    pa = arrow()
    kind = table_kind(path)
    try:
        source = (
            CsvSource(path, column, delimiter) if kind == "csv" else (_Parquet if kind == "parquet" else _Ipc)(path)
        )
        _ = source.schema.names  # decoded here, where it can be said which file is at fault
    except (OSError, pa.ArrowException) as error:
        raise DataFileError(f"cannot read {path} as a table: {_first_line(error)}", path=path) from error
    except UnicodeDecodeError as error:
        raise DataFileError(f"{path} is damaged: a column's name is no UTF-8 text ({error})", path=path) from error
    try:
        yield source
    except (OSError, pa.ArrowException) as error:
        raise DataFileError(f"{path} is damaged: {_first_line(error)}; fetch or make it again", path=path) from error
    finally:
        source.close()


def _first_line(error: BaseException) -> str:
    return str(error).partition("\n")[0]


class _IpcTarget:
    """An Arrow file. It holds one dictionary a column; blocks may bring their own, so these are written plain."""

    def __init__(self, sink: Any, schema: pa.Schema) -> None:
        pa = arrow()
        plain = [
            field.with_type(field.type.value_type) if pa.types.is_dictionary(field.type) else field for field in schema
        ]
        self._schema = pa.schema(plain, metadata=schema.metadata)
        self._writer = pa.ipc.new_file(sink, self._schema)

    def write_batch(self, batch: pa.RecordBatch) -> None:
        """Write the rows of a batch."""
        columns = [
            column if column.type == field.type else column.dictionary_decode()
            for column, field in zip(batch.columns, self._schema, strict=True)
        ]
        self._writer.write_batch(arrow().RecordBatch.from_arrays(columns, schema=self._schema))

    def __enter__(self) -> _IpcTarget:
        return self

    def __exit__(self, *error: object) -> None:
        self._writer.close()


@contextlib.contextmanager
def table_writer(path: Path, schema: pa.Schema, text: TextLayout = _PLAIN) -> Iterator[Any]:
    """A writer with `write_batch`; the file takes its name when the block ends well, and is removed otherwise."""
    pa = arrow()
    if not path.absolute().parent.is_dir():
        raise InvalidInput(f"{path} cannot be written: there is no folder {path.absolute().parent}; make it first")
    target = Path(os.path.realpath(path))
    temporary = target.with_name(f".{secrets.token_hex(8)}.part")
    try:
        with pa.OSFile(str(temporary), "wb") as sink, _writer(sink, schema, path, text) as writer:
            yield writer
        with temporary.open("rb+") as file:
            os.fsync(file.fileno())
        os.replace(temporary, target)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


def _writer(sink: Any, schema: pa.Schema, path: Path, text: TextLayout) -> Any:
    pa = arrow()
    kind = table_kind(path)
    if kind == "csv":
        return CsvTarget(sink, schema, text)
    if kind == "arrow":
        return _IpcTarget(sink, schema)
    from pyarrow import parquet

    # Fractions of a second do not repeat: a dictionary of them costs time and saves nothing.
    words = [field.name for field in schema if not pa.types.is_floating(field.type)]
    return parquet.ParquetWriter(sink, schema, use_dictionary=words)
