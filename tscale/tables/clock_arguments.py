"""The check of arguments `clocks=`, for all that take comparison logs."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, Any, Protocol, TypeAlias, runtime_checkable

from ..errors import InvalidInput
from .clock_log import ClockLog

if TYPE_CHECKING:
    from ..instants import Instants

__all__ = ["Clock", "FreeClock", "checked_clocks", "checked_logs", "kind_words"]


@runtime_checkable
class FreeClock(Protocol):
    """A clock that no log ties to another: it ticks its own proper time (`clocks.ProperClock`)."""

    @property
    def name(self) -> str:
        """Its name."""
        ...

    @property
    def scale(self) -> str:
        """PROPER(name)."""
        ...

    @property
    def observer(self) -> Any:
        """Where it is."""
        ...

    @property
    def coincidence(self) -> Instants:
        """When it was set."""
        ...

    @property
    def dates_own_event(self) -> bool:
        """Whether TT and TCG reach it."""
        ...


Clock: TypeAlias = "ClockLog | FreeClock"


def checked_clocks(clocks: Any) -> tuple[Any, ...]:
    """The logs and free clocks of an argument `clocks=` of a chain.

    Raises
    ------
    InvalidInput
        For anything but a list (or another iterable) of `ClockLog` and `ProperClock`, or two free clocks of one name.
    """
    if isinstance(clocks, FreeClock):
        raise InvalidInput("clocks= takes a list of clocks: write clocks=[clock]")
    if isinstance(clocks, str | ClockLog) or not isinstance(clocks, Iterable):
        return checked_logs(clocks)
    given = tuple(clocks)
    free = [clock.scale for clock in given if isinstance(clock, FreeClock)]
    if len(set(free)) != len(free):
        raise InvalidInput(f"each free clock needs a name of its own, got {', '.join(free)}")
    checked_logs([clock for clock in given if not isinstance(clock, FreeClock)])
    return given


def checked_logs(clocks: Any) -> tuple[ClockLog, ...]:
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
