"""Provenance: which tables, kernel, logs, models and versions a result was made of."""

from __future__ import annotations

import dataclasses
import json
import platform
import warnings
from collections.abc import Mapping
from dataclasses import dataclass
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from ..errors import ExtrapolationWarning
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..tables.clock_log import ClockLog
from .content import content_sha256
from .tables_read import TableRecord, reads_ephemeris, table_options, tables_of

if TYPE_CHECKING:
    from ..chains import Chain

__all__ = ["ClockRecord", "Provenance", "StepRecord", "TableRecord", "provenance_of"]

_PIECES: Final = ("reference", "site", "clocks", "source")
_LIBRARIES: Final = ("numpy", "pyerfa")


@dataclass(frozen=True)
class StepRecord:
    """A step of the chain."""

    start: str
    end: str
    title: str
    source: str


@dataclass(frozen=True)
class ClockRecord:
    """A comparison log that the chain reads."""

    scale: str
    reference: str
    name: str
    interpolation: str
    comparisons: int
    start: str
    """First and last comparison."""
    end: str
    sha256: str
    """Of the rows and all that was made of them; of a log read from one CSV file and not predicted, of the file."""
    content_sha256: str
    """Of the log as it is used: its rows, its gaps, how it is interpolated."""
    files: tuple[tuple[str, str], ...] = ()
    """Names and SHA-256 of the files it was read from."""
    predicted: Mapping[str, Any] | None = None
    """How it goes on past its comparisons: `fit_s`, `drift`, `start`, `until`, `noise`; None where it does not."""
    remarks: tuple[str, ...] = ()
    """What its source notes, such as steps of the clock."""


@dataclass(frozen=True)
class Provenance:
    """What a result was made of. Same inputs give the same bytes: it holds no clock time and no paths.

    Attributes
    ----------
    path : str
        The chain as a text.
    steps : tuple of StepRecord
    options : mapping
        What the caller chose beside the other pieces: `second_order`, free clocks.
    tables : tuple of TableRecord
        Those that the steps read, in the order of the chain.
    clocks : tuple of ClockRecord
    observer, source : mapping or None
        Kind, name, the values of a site or a source, and the SHA-256 of its content.
    dates : mapping or None
        Of the instants asked about: how many, the first and the last, and the SHA-256 of all.
    notes : tuple of str
        What a reader of the result should know: values predicted, held, or past a table's expiry.
    software : mapping
        Versions of this package, Python and the libraries that calculate. Another version of these libraries changes
        roundings at the most.
    digest : str
        SHA-256 over all that determines the numbers: this package's version, the steps, options, tables, logs,
        observer, source and dates; not the names of files and not the versions of Python and libraries.
    """

    path: str
    steps: tuple[StepRecord, ...]
    options: Mapping[str, Any]
    tables: tuple[TableRecord, ...]
    clocks: tuple[ClockRecord, ...]
    observer: Mapping[str, Any] | None
    source: Mapping[str, Any] | None
    dates: Mapping[str, Any] | None
    notes: tuple[str, ...]
    software: Mapping[str, str]
    digest: str

    def to_dict(self) -> dict[str, Any]:
        """The same as plain dictionaries, lists, texts and numbers."""
        return {item.name: _plain(getattr(self, item.name)) for item in dataclasses.fields(self)}

    def to_json(self, indent: int | None = None) -> str:
        """The same as JSON with sorted keys, without an end of line: one line, or indented."""
        separators = (",", ":") if indent is None else (",", ": ")
        return json.dumps(self.to_dict(), sort_keys=True, indent=indent, separators=separators, allow_nan=False)

    def header(self) -> list[str]:
        """Lines without their ends for the head of a text file, each beginning with `#`."""
        versions = ", ".join(f"{name} {number}" for name, number in self.software.items())
        lines = [f"made by {versions}", f"path: {self.path}"]
        lines += [f"step: {step.start} -> {step.end}: {step.title} [{step.source}]" for step in self.steps]
        lines += [f"option: {name} = {json.dumps(value, sort_keys=True)}" for name, value in self.options.items()]
        for table in self.tables:
            span = f"{table.start} to {table.end or 'further notice'}"
            stamps = "".join(
                f"; {word} {value}" for word, value in (("issued", table.issued), ("expires", table.expires)) if value
            )
            lines.append(f"table: {table.table}: {table.name}; {span}{stamps}; SHA-256 {table.sha256}")
        for log in self.clocks:
            lines.append(
                f"clock: {log.scale} by {log.reference}: {log.name}; {log.start} to {log.end}, {log.comparisons} "
                f"comparisons, {log.interpolation}; SHA-256 {log.sha256}"
            )
            if log.predicted is not None:
                words = ", ".join(f"{key} {held}" for key, held in log.predicted.items() if held is not None)
                lines.append(f"predicted: {log.scale}: {words}")
            if [digest for _, digest in log.files] != [log.sha256]:
                lines += [f"file: {log.scale}: {name}; SHA-256 {digest}" for name, digest in log.files]
            lines += [f"remark: {log.scale}: {remark}" for remark in log.remarks]
        for what in ("observer", "source", "dates"):
            value = getattr(self, what)
            if value is not None:
                lines.append(f"{what}: {json.dumps(_plain(value), sort_keys=True)}")
        lines += [f"note: {note}" for note in self.notes]
        lines.append(f"digest: SHA-256 {self.digest}")
        return [f"# {_one_line(line)}" for line in lines]


def provenance_of(chain: Chain, t: Instants | None = None) -> Provenance:
    """Tell what the results of a chain are made of.

    Parameters
    ----------
    chain : Chain
    t : Instants, optional
        Dates at its start: with them the digest covers the results themselves, and the notes are told.

    Raises
    ------
    DataFileError
        For a table that the chain reads and that cannot be read, or another error of that table.
    """
    supplies = chain._supplies
    steps = tuple(StepRecord(str(step.start), str(step.end), step.title, step.source) for step in chain.steps)
    options = {
        item.name: _option(getattr(supplies, item.name))
        for item in dataclasses.fields(supplies)
        if item.name not in _PIECES and getattr(supplies, item.name) != ()
    }
    tables = tables_of(chain)
    read = {name for step in chain.steps for name in (step.start.scale.name, step.end.scale.name)}
    table = chain.reference.leap_seconds
    clocks = tuple(_clock(log, table) for log in supplies.clocks if {log.scale, log.reference} <= read)
    placed = any(reads_ephemeris(step) and "TOPOCENTER" in (step.start.place, step.end.place) for step in chain.steps)
    moved = any(step.start.place != step.end.place for step in chain.steps)
    observer = _object(supplies.site) if placed and supplies.site is not None else None
    source = _object(supplies.source) if moved and supplies.source is not None else None
    dates = None if t is None else _dates(t, table)
    notes = () if t is None else chain.notes(t)
    software = {"tscale": _version("tscale"), "python": platform.python_version()}
    software |= {name: _version(name) for name in _LIBRARIES}
    digest = content_sha256(
        software["tscale"],
        [(step.start, step.end) for step in steps],
        options,
        [(table.table, table.sha256) for table in tables],
        table_options(chain.reference, tables),
        [(log.scale, log.reference, log.content_sha256) for log in clocks],
        None if observer is None else observer["sha256"],
        None if source is None else source["sha256"],
        None if dates is None else dates["sha256"],
    )
    return Provenance(
        str(chain), steps, options, tables, clocks, observer, source, dates, tuple(notes), software, digest
    )


def _clock(log: ClockLog, table: LeapSeconds) -> ClockRecord:
    start, end = _texts(log.comparisons.epoch[[0, -1]], 0, table)
    asked, predicted = log.prediction, None
    if asked is not None:
        first, last = _texts(log.span, 0, table)
        predicted = {
            "fit_s": asked.fit_s,
            "drift": asked.drift,
            "start": None if asked.start is None else first,
            "until": None if asked.until is None else last,
            "noise": str(log.noise),
        }
    return ClockRecord(
        log.scale,
        log.reference,
        log.name,
        log.interpolation,
        len(log),
        start,
        end,
        log.sha256,
        content_sha256(log),
        log.files,
        predicted,
        tuple(remark.text for remark in log.remarks),
    )


def _object(value: Any) -> dict[str, Any]:
    """Kind, name and plain values of a site, an orbit or a source."""
    plain = {}
    if dataclasses.is_dataclass(value):
        for item in dataclasses.fields(value):
            held = getattr(value, item.name)
            numbers = isinstance(held, tuple) and all(isinstance(part, int | float) for part in held)
            if item.init and item.name != "name" and (isinstance(held, bool | int | float | str) or numbers):
                plain[item.name] = held
    kind = type(value).__name__
    return {"kind": kind, "name": str(getattr(value, "name", "")), **plain, "sha256": content_sha256(value)}


def _option(value: Any) -> Any:
    """A choice as it is, or the facts of pieces of a kind that has no place of its own, such as free clocks."""
    if isinstance(value, tuple | list):
        return [_option(item) for item in value]
    return value if value is None or isinstance(value, bool | int | float | str) else _object(value)


def _dates(t: Instants, table: LeapSeconds) -> dict[str, Any]:
    first, last = _texts(t.ravel()[[0, -1]], 15, table) if t.size else (None, None)
    return {"scale": t.scale, "count": int(t.size), "first": first, "last": last, "sha256": content_sha256(*t.pair)}


def _texts(two: Instants, digits: int, table: LeapSeconds) -> tuple[str, str]:
    with warnings.catch_warnings():
        # That a label is past the expiry of the table is said by the notes.
        warnings.simplefilter("ignore", ExtrapolationWarning)
        first, last = two.to_iso(digits, leap_seconds=table)
    return str(first), str(last)


def _version(package: str) -> str:
    if package == "tscale":
        from .. import __version__

        return __version__
    try:
        return version(package)
    except PackageNotFoundError:
        return "unknown"


def _plain(value: Any) -> Any:
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {item.name: _plain(getattr(value, item.name)) for item in dataclasses.fields(value)}
    if isinstance(value, Mapping):
        return {str(key): _plain(held) for key, held in value.items()}
    if isinstance(value, tuple | list):
        return [_plain(item) for item in value]
    return value.name if isinstance(value, Path) else value


def _one_line(text: str) -> str:
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)
