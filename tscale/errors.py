"""The one family of errors, and the one warning.

Every message says what was given, what is allowed and what to do. Where single values of an
array are at fault the error carries them: `mask` (True at each offender, in the shape of the
input) or `row` (the line of a file, counted from 1).
"""

from __future__ import annotations

import sys
import warnings
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


def warn_extrapolation(message: str) -> None:
    """Issue an `ExtrapolationWarning` at the line outside this package from which the call came."""
    package = __name__.partition(".")[0]
    level, frame = 2, sys._getframe(1)
    while frame.f_back is not None and frame.f_globals.get("__name__", "").partition(".")[0] == package:
        level, frame = level + 1, frame.f_back
    warnings.warn(message, ExtrapolationWarning, stacklevel=level)
