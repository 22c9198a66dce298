"""Parquet and Arrow IPC files: one way to read them in blocks, and to write them at once or not at all."""

from __future__ import annotations

import contextlib
import hashlib
import os
import secrets
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from ..errors import DataFileError, InvalidInput
from .arrow_columns import arrow

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["TableReader", "table_kind", "table_writer"]

_KINDS: Final = {".parquet": "parquet", ".arrow": "arrow", ".feather": "arrow"}


def table_kind(path: str | os.PathLike[str]) -> str | None:
    """`parquet` or `arrow` by the ending of a name, None for any other."""
    return _KINDS.get(Path(path).suffix.lower())


class TableReader:
    """A table in one file, or in the files of a folder in the order of their names.

    Attributes
    ----------
    path : Path
    schema : pyarrow.Schema
    rows : int
        In all files.
    """

    def __init__(self, path: str | os.PathLike[str]) -> None:
        self.path = Path(path)
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
            with _opened(file) as source:
                schema, rows = source.schema, source.rows
            if self.schema is None:
                self.schema = schema
            elif not schema.equals(self.schema, check_metadata=False):
                different = _difference(self.schema, schema)
                raise DataFileError(f"{file} has other columns than {self._files[0]}: {different}", path=file)
            self.rows += rows

    def batches(self, rows: int, first: int = 0) -> Iterator[tuple[int, pa.RecordBatch]]:
        """Blocks of at most `rows` rows from row `first` on, each with the number of its first row (from 0)."""
        at = 0
        for file in self._files:
            with _opened(file) as source:
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
def _opened(path: Path) -> Iterator[Any]:
    pa = arrow()
    try:
        source = (_Parquet if table_kind(path) == "parquet" else _Ipc)(path)
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


@contextlib.contextmanager
def table_writer(path: Path, schema: pa.Schema) -> Iterator[Any]:
    """A writer with `write_batch`; the file takes its name when the block ends well, and is removed otherwise."""
    pa = arrow()
    if not path.absolute().parent.is_dir():
        raise InvalidInput(f"{path} cannot be written: there is no folder {path.absolute().parent}; make it first")
    target = Path(os.path.realpath(path))
    temporary = target.with_name(f".{secrets.token_hex(8)}.part")
    try:
        with pa.OSFile(str(temporary), "wb") as sink, _writer(sink, schema, table_kind(path) or "parquet") as writer:
            yield writer
        with temporary.open("rb+") as file:
            os.fsync(file.fileno())
        os.replace(temporary, target)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


def _writer(sink: Any, schema: pa.Schema, kind: str) -> Any:
    pa = arrow()
    if kind == "arrow":
        return pa.ipc.new_file(sink, schema)
    from pyarrow import parquet

    # Fractions of a second do not repeat: a dictionary of them costs time and saves nothing.
    words = [field.name for field in schema if not pa.types.is_floating(field.type)]
    return parquet.ParquetWriter(sink, schema, use_dictionary=words)
