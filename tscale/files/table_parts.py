"""A folder that is filled with the parts of a table, and goes on where it was after a break."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from ..errors import DataFileError, InvalidInput
from ..storage import write_atomically
from .stream import Mapping, in_order, mapping_digest
from .table_files import JOB, TableReader, table_kind, table_writer

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["PartFolder"]

_LOCK: Final = "_job.lock"


class PartFolder:
    """Parts `part-00000.parquet` ... of a table, and `_job.json`, which tells what they are parts of.

    Raises
    ------
    DataFileError
        A folder with the parts of another job, or with a job file that is damaged.
    InvalidInput
        A folder with files that are not ours.
    """

    def __init__(
        self,
        path: Path,
        reader: TableReader,
        mappings: Sequence[Mapping],
        part_rows: int,
        columns: list[str],
        leap_seconds: str | None,
    ) -> None:
        self._path, self._reader, self._part_rows = path, reader, part_rows
        job = {
            "columns": columns,
            "input": reader.digest,
            "leap_seconds": leap_seconds,
            "mappings": [mapping_digest(mapping) for mapping in mappings],
            "part_rows": part_rows,
            "rows": reader.rows,
        }
        if path.exists() and not path.is_dir():
            raise InvalidInput(f"{path} is a file; parts need a folder, and a single file a name that ends in .parquet")
        path.mkdir(exist_ok=True)
        known = path / JOB
        if known.exists():
            self._compare(known, job)
        elif any(not _temporary(file) and file.name != _LOCK for file in path.iterdir()):
            raise InvalidInput(f"{path} holds other files; name a new or an empty folder")
        else:
            write_atomically(known, (json.dumps(job, indent=1, sort_keys=True) + "\n").encode())

    def _compare(self, known: Path, job: dict[str, Any]) -> None:
        try:
            before = json.loads(known.read_text(encoding="utf-8"))
            differing = [key for key in job if before[key] != job[key]]
        except (OSError, ValueError, KeyError, TypeError) as error:
            raise DataFileError(
                f"{known} is damaged ({error}): remove the folder and begin anew", path=known
            ) from error
        if differing:
            raise DataFileError(
                f"{self._path} holds the parts of another job (other {', '.join(differing)}): name another folder, or "
                "remove it",
                path=self._path,
            )

    def fill(
        self,
        schema: pa.Schema,
        work: Callable[[Any], Any],
        rows: int,
        threads: int,
        progress: Callable[[int, int], None] | None,
    ) -> tuple[int, int]:
        """Make the parts that are missing; returns rows in all and rows that were there."""
        from filelock import FileLock, Timeout

        try:
            with FileLock(self._path / _LOCK, timeout=0):
                for file in self._path.iterdir():
                    if _temporary(file):  # of work that was killed
                        file.unlink()
                return self._fill(schema, work, rows, threads, progress)
        except Timeout as error:
            raise InvalidInput(
                f"another process is filling {self._path}; wait for it, or name another folder"
            ) from error

    def _fill(
        self,
        schema: pa.Schema,
        work: Callable[[Any], Any],
        rows: int,
        threads: int,
        progress: Callable[[int, int], None] | None,
    ) -> tuple[int, int]:
        total = self._reader.rows
        found = 0
        for first in range(0, max(total, 1), self._part_rows):
            target = self._path / f"part-{first // self._part_rows:05d}.parquet"
            size = min(self._part_rows, total - first)
            if target.exists():
                found += size
            else:
                done = first
                with table_writer(target, schema) as writer:
                    for batch in in_order(work, self._blocks(rows, first, size), threads):
                        writer.write_batch(batch)
                        done += batch.num_rows
                        if progress is not None:
                            progress(done, total)
        return total, found

    def _blocks(self, rows: int, first: int, size: int) -> Iterator[tuple[int, Any]]:
        left = size
        for at, batch in self._reader.batches(rows, first):
            if left <= 0:
                return
            yield at, batch.slice(0, left)
            left -= batch.num_rows


def _temporary(file: Path) -> bool:
    return file.name.startswith(".") and file.suffix == ".part" and table_kind(file) is None
