"""The check of arguments `clocks=`, for all that take comparison logs."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from ..errors import InvalidInput
from .clock_log import ClockLog

__all__ = ["checked_clocks", "kind_words"]


def checked_clocks(clocks: Any) -> tuple[ClockLog, ...]:
    """The logs of an argument `clocks=`.

    Raises
    ------
    InvalidInput
        For anything but a list (or another iterable) of `ClockLog`.
    """
    if isinstance(clocks, ClockLog):
        raise InvalidInput("clocks= takes a list of logs: write clocks=[log]")
    if isinstance(clocks, str) or not isinstance(clocks, Iterable):
        raise InvalidInput(
            f"clocks= takes a list of ClockLog, got {kind_words(clocks)}; read files with ClockLog.load(path)"
        )
    logs = tuple(clocks)
    for log in logs:
        if not isinstance(log, ClockLog):
            raise InvalidInput(
                f"clocks= takes a list of ClockLog, one is {kind_words(log)}; read files with ClockLog.load(path)"
            )
    return logs


def kind_words(value: Any) -> str:
    """A wrong argument in words: a short text or number as it is, anything else by its type."""
    return f"{value!r:.60}" if isinstance(value, str | int | float) else type(value).__name__
