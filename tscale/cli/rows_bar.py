"""The progress of work on rows, with rate and time left."""

from __future__ import annotations

import sys
from typing import Any

__all__ = ["RowsBar"]


class RowsBar:
    """A progress bar of rows, that appears on a terminal when the work takes longer than a second."""

    def __init__(self, silent: bool) -> None:
        self._silent = silent or sys.stderr is None or not sys.stderr.isatty()
        self._bar: Any = None

    def tell(self, done: int, total: int) -> None:
        """Rows that are done, of how many."""
        if self._bar is None:
            from tqdm import tqdm

            self._bar = tqdm(total=total, unit="rows", unit_scale=True, delay=1.0, disable=self._silent, leave=False)
        self._bar.update(done - self._bar.n)

    def close(self) -> None:
        """Take the bar off the terminal."""
        if self._bar is not None:
            self._bar.close()
