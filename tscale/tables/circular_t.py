"""Clocks of laboratories as the BIPM publishes them: UTC - UTC(k) of Circular T and UTCr as a `ClockLog`."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Final, NamedTuple, TypeAlias

import numpy as np

from ..constants import DAY_S
from ..errors import DataFileError, InvalidInput, MissingPiece
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale
from .circular_text import CircularIssue, read_issue
from .clock_log import ClockLog
from .clock_rows import LogRemark
from .common import mjd_date

__all__ = ["circular_notes", "laboratories", "read_circular"]

Files: TypeAlias = "str | Path | Sequence[str | Path]"

_SAME_NS: Final = 0.05
"""Two issues that share a day agree to the printed 0.1 ns, or one of them was corrected."""


class _Value(NamedTuple):
    ns: float | None
    own_s: float
    common_s: float
    issue: CircularIssue
    line: int


def laboratories(path: Files, *, leap_seconds: LeapSeconds | None = None) -> dict[str, str]:
    """Acronyms and cities of the laboratories in one or several issues.

    Raises
    ------
    DataFileError
        See `read_circular`.
    """
    return {name: row.city for issue in _issues(path, leap_seconds) for name, row in issue.rows.items()}


def circular_notes(path: Files, laboratory: str, *, leap_seconds: LeapSeconds | None = None) -> tuple[str, ...]:
    """What the issues note of one laboratory, oldest first: steps of its clock within five days, corrections."""
    name = _acronym(laboratory)
    issues = sorted(_issues(path, leap_seconds), key=lambda issue: issue.mjd)
    return tuple(text for issue in issues for text in _notes(issue, name))


def read_circular(
    path: Files,
    laboratory: str,
    *,
    uncertainty_s: float | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> ClockLog:
    """Read the clock of a laboratory, UTC(k) against UTC, from issues of BIPM's Circular T or UTCr.

    The publication gives UTC - UTC(k); the log holds clock minus reference, UTC(k) - UTC, which is its negative.

    Parameters
    ----------
    path : str, Path or a sequence of them
        Text files of one or several issues, in any order, all monthly or all rapid. An issue begins on the day on which
        the one before it ends; where both give a value they must agree. Where an issue is missing, and where a value is
        (`-` in the text), the log has a gap.
    laboratory : str
        Its acronym, as in `KRL` or `UTC(KRL)`.
    uncertainty_s : float, optional
        Standard uncertainty for values whose issue states none, taken as common to all. Issues before 2005 and those of
        UTCr have no such column, so that it must be given; for UTCr it has to include what UTCr differs from UTC (some
        ns).
    leap_seconds : LeapSeconds, optional
        Says when 0h UTC was; the TAI - UTC of the text is compared with it.

    Returns
    -------
    ClockLog
        Of scale UTC(k) by reference UTC. uA is own to each value; uB, that of the calibration of the link, is common to
        all (`common_s`), and so is a u that stands alone. The notes of the issues on the laboratory are its `remarks`.

    Raises
    ------
    DataFileError
        With path and row, for a file that is missing, damaged, cut short or of another layout, and for issues that
        contradict each other.
    MissingPiece
        If no issue has the laboratory, or an uncertainty is neither in the text nor given.
    InvalidInput
        For arguments that cannot be used.

    Notes
    -----
    A laboratory may step its clock between two of the days. The issue then says so in a note: see `circular_notes`.
    The straight line between the two values is wrong there; `notes` of the log, and so of a chain, tell it.
    """
    name = _acronym(laboratory)
    given = None if uncertainty_s is None else float(uncertainty_s)
    if given is not None and not (np.isfinite(given) and given >= 0.0):
        raise InvalidInput(f"uncertainty_s must be finite and not negative, got {uncertainty_s!r}")
    table = LeapSeconds.default() if leap_seconds is None else leap_seconds
    issues = sorted(_issues(path, table), key=lambda issue: issue.mjd)
    if len({issue.rapid for issue in issues}) > 1:
        raise InvalidInput("issues of Circular T and of UTCr refer to different realisations of UTC; read them apart")
    found: dict[int, _Value] = {}
    for issue in issues:
        _take(found, issue, name, given)
    if not any(value.ns is not None for value in found.values()):
        known = ", ".join(sorted({acronym for issue in issues for acronym in issue.rows}))
        state = f"UTC({name}) has no value" if found else f"UTC({name}) is not"
        meant = [acronym for issue in issues for acronym in issue.rows if acronym == name.upper() != name]
        hint = f"; did you mean {meant[0]!r}?" if meant else ""
        raise MissingPiece(f"{state} in {_titles(issues)}{hint}; laboratories there: {known}")
    days = np.array(sorted(found), dtype=np.int64)
    values = [found[day] for day in days.tolist()]
    missing = np.array([value.ns is None for value in values])
    # Decimal text times 1e-9 as one division: the float64 nearest to the published value.
    offset_s = np.array([0.0 if value.ns is None else -value.ns / 1e9 for value in values])
    own_s, common_s = (np.array([getattr(value, part) for value in values]) for part in ("own_s", "common_s"))
    count = table.count_from_label(days, 0, 0.0)
    longest_s = issues[0].step_days * DAY_S + 1.5  # a leap second may be in it
    log = ClockLog.from_rows(
        f"UTC({name})",
        Instants(*count, "UTC"),
        offset_s,
        np.hypot(own_s, common_s),
        common_s=common_s,
        missing=missing,
        max_gap_s=longest_s,
    )
    digest = hashlib.sha256(" ".join([log.sha256, *(issue.sha256 for issue in issues)]).encode()).hexdigest()
    return replace(
        log,
        name=f"UTC({name}) of {_titles(issues)}",
        sha256=digest,
        remarks=_remarks(issues, name, table),
        files=tuple((issue.path.name, issue.sha256) for issue in issues),
    )


def _remarks(issues: Sequence[CircularIssue], name: str, table: LeapSeconds) -> tuple[LogRemark, ...]:
    """Notes of issues sorted by their days, each for the days of its issue."""
    found = []
    for issue in issues:
        first, last = (int(table.count_from_label(issue.mjd[end], 0, 0.0)[0]) for end in (0, -1))
        found += [LogRemark(text, first, last) for text in _notes(issue, name)]
    return tuple(found)


def _notes(issue: CircularIssue, name: str) -> list[str]:
    marks = issue.rows[name].notes if name in issue.rows else ()
    return [f"{issue.title}, note {mark}: {issue.notes[mark]}" for mark in marks]


def _take(found: dict[int, _Value], issue: CircularIssue, name: str, given: float | None) -> None:
    """Add the values of an issue to those of the issues before it."""
    row = issue.rows.get(name)
    if row is None:
        return
    stated = None if given is None else (0.0, given)
    if row.uncertainty_ns is not None:
        stated = (row.uncertainty_ns[0] / 1e9, row.uncertainty_ns[1] / 1e9)
    if stated is None and any(value is not None for value in row.values_ns):
        raise MissingPiece(
            f"{issue.path}, line {row.line}: {issue.title} states no uncertainty for UTC({name}); say what it is with "
            "uncertainty_s=",
            row=row.line,
            path=issue.path,
        )
    for day, ns in zip(issue.mjd, row.values_ns, strict=True):
        before = found.get(day)
        if before is not None and before.ns is not None and ns is not None and abs(before.ns - ns) > _SAME_NS:
            raise DataFileError(
                f"{issue.path}, line {row.line}: UTC - UTC({name}) on MJD {day} ({mjd_date(day)}) is {ns} ns here and "
                f"{before.ns} ns in {before.issue.path.name}, line {before.line}; leave out the issue "
                f"that was corrected",
                row=row.line,
                path=issue.path,
            )
        if before is None or before.ns is None:
            own_s, common_s = stated or (0.0, 0.0)
            found[day] = _Value(ns, own_s, common_s, issue, row.line)


def _issues(path: Files, leap_seconds: LeapSeconds | None) -> list[CircularIssue]:
    table = LeapSeconds.default() if leap_seconds is None else leap_seconds
    paths = [path] if isinstance(path, str | Path) else list(path)
    if not paths:
        raise InvalidInput("no file given; name one or several issues of Circular T or UTCr")
    return [read_issue(Path(one), table) for one in paths]


def _titles(issues: Sequence[CircularIssue]) -> str:
    first, last = issues[0].title, issues[-1].title
    return first if first == last else f"{first} to {last.split()[-1]}"


def _acronym(laboratory: str) -> str:
    """`KRL` of `KRL` or `UTC(KRL)`."""
    text = laboratory.strip() if isinstance(laboratory, str) else ""
    try:
        scale = Scale.parse(text if text.startswith("UTC(") else f"UTC({text})")
    except InvalidInput as error:
        raise InvalidInput(f"{laboratory!r} is no laboratory; give its acronym, as in 'KRL' or 'UTC(KRL)'") from error
    assert scale.realisation is not None
    return scale.realisation
