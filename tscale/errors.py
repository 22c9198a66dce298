"""The one family of errors, and the one warning.

Every message says what was given, what is allowed and what to do. Where single values of an
array are at fault the error carries them: `mask` (True at each offender, in the shape of the
input) or `row` (the line of a file, counted from 1).
"""

from __future__ import annotations

import sys
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

__all__ = [
    "DataFileError",
    "ExtrapolationWarning",
    "GeometryError",
    "InvalidInput",
    "MissingPiece",
    "NotConverged",
    "OutOfSpan",
    "ScaleMismatch",
    "TextError",
    "TscaleError",
    "gathered_extrapolations",
    "unsaid_extrapolations",
    "warn_extrapolation",
]


class TscaleError(Exception):
    """Base of every error that this package raises on purpose.

    Attributes
    ----------
    mask : bool array or None
        True at each offending value, in the shape of the input.
    row : int or None
        Line of the file at fault, counted from 1.
    path : pathlib.Path or None
        File at fault.
    """

    def __init__(
        self,
        message: str,
        *,
        mask: npt.NDArray[np.bool_] | None = None,
        row: int | None = None,
        path: str | Path | None = None,
    ) -> None:
        super().__init__(message)
        self.mask = mask
        self.row = row
        self.path = None if path is None else Path(path)

    def __reduce__(self) -> tuple[Any, ...]:
        # Exceptions are rebuilt from their positional arguments alone, so the keyword-only ones
        # travel as state: an error raised in a worker process keeps its mask.
        return (type(self), self.args, dict(self.__dict__))


class InvalidInput(TscaleError, ValueError):
    """A value, shape or argument that no function here can accept."""


class TextError(InvalidInput):
    """A text that is not a date, or a label that does not exist."""


class ScaleMismatch(TscaleError, TypeError):
    """Instants of different scales or places were mixed."""


class OutOfSpan(TscaleError, ValueError):
    """An instant lies outside the span of a table, a log or an ephemeris."""


class MissingPiece(TscaleError, LookupError):
    """A chain needs a site, a source, a clock log or a table that was not given."""


class DataFileError(TscaleError, ValueError):
    """A data file is missing, damaged or not of the kind expected."""


class NotConverged(TscaleError, ArithmeticError):
    """An iteration did not reach its tolerance."""


class GeometryError(TscaleError, ValueError):
    """A geometry for which no answer exists, such as a light path through a body."""


class ExtrapolationWarning(UserWarning):
    """A value is used beyond the span for which its table gives it.

    Raised as a warning, never hidden: the ledger and the budget mark the same values.
    """


class _Gathered(dict[str, tuple[int, int, float]]):
    """Warnings by text: how many instants, of how many, and the worst value."""

    def __init__(self, repeats: bool) -> None:
        super().__init__()
        self._repeats = repeats

    def take(self, text: str, count: int, size: int, worst: float) -> None:
        known = self.get(text, (0, 0, 0.0))
        if self._repeats:
            self[text] = max(known[0], count), max(known[1], size), max(known[2], worst)
        else:
            self[text] = known[0] + count, known[1] + size, max(known[2], worst)


_GATHERED: ContextVar[_Gathered | None] = ContextVar("gathered extrapolations", default=None)


@contextmanager
def gathered_extrapolations(*, size: int | None = None, repeats: bool = False) -> Iterator[None]:
    """Say once, with the counts of all, what is extrapolated in the parts of one job; of its own thread alone.

    Parameters
    ----------
    size : int, optional
        Instants of the whole job, of which parts without a warning do not tell.
    repeats : bool
        The parts are passes over the same instants, so that counts are not added up.
    """
    outer, mine = _GATHERED.get(), _Gathered(repeats)
    token = _GATHERED.set(mine)
    try:
        yield
    finally:
        _GATHERED.reset(token)
    for text, (count, told, worst) in mine.items():
        (_warn if outer is None else outer.take)(text, count, told if size is None else size, worst)


@contextmanager
def unsaid_extrapolations() -> Iterator[None]:
    """Say nothing of what is extrapolated at dates that no caller gave; of its own thread alone."""
    token = _GATHERED.set(_Gathered(False))
    try:
        yield
    finally:
        _GATHERED.reset(token)


def warn_extrapolation(text: str, count: int, size: int, worst: float = 0.0) -> None:
    """Issue an `ExtrapolationWarning`, "COUNT of SIZE TEXT", in the name of whoever called the package.

    `{worst}` in the text stands for the worst value of all.
    """
    gathered = _GATHERED.get()
    (_warn if gathered is None else gathered.take)(text, count, size, worst)


def _warn(text: str, count: int, size: int, worst: float) -> None:
    inside = (__name__.partition(".")[0], "contextlib")
    level, frame = 2, sys._getframe(1)
    while frame.f_back is not None and frame.f_globals.get("__name__", "").partition(".")[0] in inside:
        level, frame = level + 1, frame.f_back
    message = f"{count} of {size} {text.replace('{worst}', f'{worst:.2g}')}"
    warnings.warn(message, ExtrapolationWarning, stacklevel=level)
