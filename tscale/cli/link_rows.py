"""Links as the cells of a table: their legs, and values as texts and for JSON."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

if TYPE_CHECKING:
    from ..exact import FloatArray
    from ..link import LinkSolution, TwoWaySolution

    Solution = LinkSolution | TwoWaySolution

__all__ = ["decimals", "legs_of", "plain", "texts_of", "total_s"]

_TERM_DIGITS: Final = 15


def plain(value: Any) -> Any:
    """A value as JSON has it, which knows no NaN."""
    return None if value != value else value


def texts_of(name: str, column: list[Any]) -> list[str]:
    """A column of the CSV table, with as many decimals as its unit asks for."""
    unit = name.rpartition("(")[2]
    digits = {"m)": 6, "m/s)": 9, "deg)": 5}.get(unit, _TERM_DIGITS)
    return [x if isinstance(x, str) else f"{x:.{digits}f}" for x in column]


def legs_of(solution: Solution) -> dict[str, LinkSolution]:
    """Legs by the start of their column names."""
    from ..link import TwoWaySolution

    if isinstance(solution, TwoWaySolution):
        return {"up ": solution.up, "down ": solution.down}
    return {"": solution}


def total_s(solution: Solution) -> FloatArray:
    """Light time, or the round trip, in TDB seconds."""
    from ..link import TwoWaySolution

    return solution.round_trip_s if isinstance(solution, TwoWaySolution) else solution.light_time_s


def decimals(value: FloatArray) -> list[str]:
    """Seconds as texts of one length."""
    return [f"{x:.{_TERM_DIGITS}f}" for x in value.reshape(-1).tolist()]
