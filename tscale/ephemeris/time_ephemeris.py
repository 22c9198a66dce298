"""The time ephemeris: TT - TDB at the geocentre, integrated from the planetary ephemeris itself."""

from __future__ import annotations

import hashlib
import math
import os
import re
import threading
import warnings
from functools import lru_cache
from pathlib import Path
from typing import Any, Final

import numpy as np

from ..errors import DataFileError, InvalidInput, OutOfSpan
from ..exact import FloatArray, Pair
from ..storage import write_atomically
from .arguments import file_path
from .cache import cache_folder, locked
from .chebyshev import ChebyshevTable, span_text
from .daf import check_sha256, file_sha256, read_container
from .integrator import NODES, Progress
from .kernel import Ephemeris
from .segments import CHEBYSHEV_TYPES, ChebyshevSegment
from .shipped import DEFAULT_KERNEL, DEFAULT_TIME_EPHEMERIS, manifest, shipped_path
from .spk_writer import CHECKSUM_LINE, spk_bytes
from .time_integral import PANEL_S, Pin, integrate_tt_minus_tdb, pin_at_t0, progress_bar

__all__ = ["TIME_CENTER", "TIME_TARGET", "TimeEphemeris"]

TIME_TARGET: Final = 1000000001
TIME_CENTER: Final = 1000000000
"""Body numbers under which planetary ephemerides store TT - TDB."""

VERSION: Final = 1
"""Raised whenever the integrator would give other numbers: older cache files are then not used."""

_ANCHOR: Final = re.compile(r"^Anchor: (.+), SHA-256 [0-9a-f]{64}$", re.MULTILINE)

_OPENING: Final = threading.Lock()


class TimeEphemeris:
    """TT - TDB at the geocentre as a function of TDB: immutable, safe between threads, picklable.

    At T0 (1977-01-01T00:00:32.184 TT) the geocentre's TT, TCG and TCB agree by definition, so that
    TT - TDB = -TDB0 = 65.5 us there exactly (IAU 2006 Resolution B3). Use `of` or `open`.

    Attributes
    ----------
    name : str
        File name, or what it was built from; and the anchor, if the kernel did not reach T0.
    anchor : str or None
        Name of the time ephemeris that was continued, for a kernel that did not reach T0.
    path : pathlib.Path or None
        File it was read from.
    sha256 : str
        Of that file, or of the file that `write_spk` would write.
    """

    name: str
    anchor: str | None
    path: Path | None
    sha256: str
    _table: ChebyshevTable
    _comment: str

    def __init__(self, table: ChebyshevTable, name: str, path: Path | None, sha256: str, comment: str) -> None:
        found = _ANCHOR.search(comment)
        anchor = found[1] if found else None
        if anchor is not None and not name.endswith(anchor):
            name = f"{name}, anchored to {anchor}"
        values = {"name": name, "anchor": anchor, "path": path, "sha256": sha256, "_table": table, "_comment": comment}
        for attribute, value in values.items():
            object.__setattr__(self, attribute, value)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"a TimeEphemeris is immutable; cannot set {name!r}. Make another one with of or open")

    @classmethod
    def of(
        cls,
        ephemeris: Ephemeris,
        *,
        cache: bool = True,
        progress: Progress | bool | None = None,
        anchor: TimeEphemeris | None = None,
    ) -> TimeEphemeris:
        """Find the time ephemeris of a kernel, or build it.

        The shipped one is used if it was made from this kernel (same SHA-256), else the one in the cache folder, else
        it is integrated (about 0.5 s per century) and stored there, once for all processes that ask at the same time.

        Parameters
        ----------
        ephemeris : Ephemeris
        cache : bool
            False: build anew and store nothing.
        progress : bool or callable, optional
            True shows a progress bar while building; a callable is told the panels done and their total.
        anchor : TimeEphemeris, optional
            For a kernel that does not reach T0: one that overlaps it, whose value is continued.

        Raises
        ------
        OutOfSpan
            For a kernel that does not reach T0 and no `anchor` that overlaps it.
        MissingPiece
            For a kernel without the Sun, the planets, the Earth and the Moon.

        Warns
        -----
        UserWarning
            If a damaged cache file was replaced, or the cache folder cannot be used.
        """
        if not isinstance(ephemeris, Ephemeris):
            raise InvalidInput(
                f"a time ephemeris is that of an Ephemeris, got {ephemeris!r:.80}: use Ephemeris.open(path) for a "
                "kernel, TimeEphemeris.open(path) for a file of TT - TDB"
            )
        if anchor is not None and not isinstance(anchor, TimeEphemeris):
            raise InvalidInput(
                f"anchor must be a TimeEphemeris, got {anchor!r:.80}: use TimeEphemeris.open(path) or "
                "TimeEphemeris.of(Ephemeris.default())"
            )
        if not cache:
            return cls._build(ephemeris, progress, anchor)
        key = _key(ephemeris, anchor)
        if key == manifest(DEFAULT_KERNEL)["sha256"]:
            with _OPENING:  # so that all threads get the same one
                return _shipped()
        folder: Path | str = "the cache folder"
        try:
            folder = cache_folder()
            path = folder / f"time_ephemeris_{key[:32]}_v{VERSION}.bsp"
            found = cls._cached(path, key)
            if found is not None:
                return found
            with locked(path):
                found = cls._cached(path, key)  # another process may have built it meanwhile
                if found is not None:
                    return found
                built = cls._build(ephemeris, progress, anchor)
                built.write_spk(path)
        except OSError as error:
            warnings.warn(
                f"cannot store the time ephemeris in {folder} ({error.strerror or error}): it is built in memory "
                "each time; set TSCALE_CACHE to a folder that can be written",
                stacklevel=2,
            )
            return cls._build(ephemeris, progress, anchor)
        return cls.open(path)

    @classmethod
    def open(cls, path: str | Path) -> TimeEphemeris:
        """Read TT - TDB from any SPK kernel that holds body 1000000001 from 1000000000, in seconds.

        Raises
        ------
        DataFileError
            For a file that is missing, damaged, without such a segment, or whose checksum does not fit.
        """
        return cls._open(path, None)

    @classmethod
    def _open(cls, path: str | Path, key: str | None) -> TimeEphemeris:
        """Read a kernel; with a `key` only one that this module wrote, checksum and all, for that key."""
        path = Path(os.path.realpath(file_path(path, "a file of TT - TDB")))
        container = read_container(path)
        found = [a for a in container.arrays if (a.target, a.center) == (TIME_TARGET, TIME_CENTER)]
        if len(found) != 1 or found[0].data_type not in CHEBYSHEV_TYPES:
            there = ", ".join(f"{a.target} from {a.center} (type {a.data_type})" for a in container.arrays)
            raise DataFileError(
                f"{path} needs one segment of body {TIME_TARGET} from {TIME_CENTER} of SPK data type "
                f"{' or '.join(map(str, CHEBYSHEV_TYPES))}; it holds {there}: give a kernel with TT - TDB",
                path=path,
            )
        stated = CHECKSUM_LINE.search(container.comment)
        if stated and hashlib.sha256(np.ascontiguousarray(found[0].words).tobytes()).hexdigest() != stated[1]:
            raise DataFileError(
                f"{path} is damaged: its numbers do not fit the checksum in its comments: remove it and build it anew",
                path=path,
            )
        if key is not None and not stated:
            raise DataFileError(f"{path} has no checksum in its comments: build it anew", path=path)
        if key is not None and f"Key: {key}" not in container.comment.splitlines():
            raise DataFileError(f"{path} was made from another kernel: build it anew", path=path)
        comment = CHECKSUM_LINE.sub("", container.comment)
        whole = ChebyshevSegment(found[0], path.name, container).table
        # Only x is kept, in memory: the file may be replaced while this value is in use.
        rows = np.array(whole.coefficients[:, :1], dtype=np.float64)
        if not np.isfinite(rows).all():
            raise DataFileError(f"{path} is damaged: it holds numbers that are not finite: build it anew", path=path)
        table = ChebyshevTable(whole.start_s, whole.step_s, rows, path.name)
        return cls(table, path.name, path, file_sha256(path), comment)

    def __reduce__(self) -> tuple[Any, ...]:
        if self.path is not None:
            return _reopen, (str(self.path), self.sha256)
        return TimeEphemeris, (self._table, self.name, None, self.sha256, self._comment)

    def __repr__(self) -> str:
        return f"TimeEphemeris({self.name!r}, {span_text(self.span)} TDB)"

    @property
    def span(self) -> tuple[float, float]:
        """First and last TDB count covered, s."""
        return self._table.span

    def tt_minus_tdb_s(self, tdb: Pair) -> FloatArray:
        """TT - TDB at the geocentre, s.

        Parameters
        ----------
        tdb : (int64 array, float64 array)
            TDB counts, any shape.

        Raises
        ------
        OutOfSpan
            For dates outside `span`; the mask marks them.
        """
        value: FloatArray = self._table.value(tdb)[..., 0]
        return value

    def tt_minus_tdb_and_rate(self, tdb: Pair) -> tuple[FloatArray, FloatArray]:
        """Evaluate `tt_minus_tdb_s` and `rate` together, for the price of little more than one of them."""
        value, rate = self._table.value_and_rate(tdb)
        return value[..., 0], rate[..., 0]

    def rate(self, tdb: Pair) -> FloatArray:
        """d(TT - TDB)/dTDB at the geocentre; see `tt_minus_tdb_s`."""
        rate: FloatArray = self._table.value_and_rate(tdb)[1][..., 0]
        return rate

    def write_spk(self, path: str | Path) -> None:
        """Write a kernel that general ephemeris readers understand: body 1000000001 from 1000000000, x in seconds.

        The file appears whole or not at all.
        """
        write_atomically(Path(path).expanduser(), _content(self._table, self._comment))

    @classmethod
    def _cached(cls, path: Path, key: str) -> TimeEphemeris | None:
        if not path.is_file():
            return None
        try:
            return cls._open(path, key)
        except DataFileError as error:
            # Whoever reads this has nothing to do: no advice to fetch or remove the file.
            found_wrong = re.sub(r": (?:fetch|remove|build)\b[^:]*$", "", str(error))
            warnings.warn(f"{found_wrong}; the time ephemeris is built anew", stacklevel=3)
            return None

    @classmethod
    def _build(
        cls,
        ephemeris: Ephemeris,
        progress: Progress | bool | None = None,
        anchor: TimeEphemeris | None = None,
        panel_s: float = PANEL_S,
    ) -> TimeEphemeris:
        with progress_bar(progress) as tell:
            pin = pin_at_t0 if anchor is None else anchor._pin
            table, pinned = integrate_tt_minus_tdb(ephemeris, pin, tell, panel_s)
        comment = (
            f"TT - TDB at the geocentre, seconds, as the x component of body {TIME_TARGET} from {TIME_CENTER}.\n"
            f"IAU 2000 Resolution B1.5 to order c^-4, integrated along {ephemeris.name},\n"
            f"SHA-256 {ephemeris.sha256}.\n"
            f"Panels of {table.step_s / 86400.0:g} days, {NODES} Gauss-Legendre nodes each; integrator {VERSION}.\n"
            f"TT - TDB = {pinned.value_s!r} s at TDB count {pinned.tdb[0]} + {pinned.tdb[1]!r} s.\n"
            f"Key: {_key(ephemeris, anchor)}\n"
        )
        if anchor is not None:
            comment += f"Anchor: {anchor.name}, SHA-256 {anchor.sha256}\n"
        return cls(table, table.name, None, hashlib.sha256(_content(table, comment)).hexdigest(), comment)

    def _pin(self, span: tuple[float, float]) -> Pin:
        """Choose the whole second in the middle of the overlap, and this time ephemeris's value there."""
        first, last = max(span[0], self.span[0]), min(span[1], self.span[1])
        if not math.ceil(first) <= math.floor(last):
            raise OutOfSpan(
                f"the anchor {self.name} covers {span_text(self.span)} TDB and does not overlap the kernel, "
                f"{span_text(span)} TDB: give one that does"
            )
        whole = min(max(round((first + last) / 2), math.ceil(first)), math.floor(last))
        return Pin((whole, 0.0), float(self.tt_minus_tdb_s((np.array(whole), np.array(0.0)))))


def _key(ephemeris: Ephemeris, anchor: TimeEphemeris | None) -> str:
    """Name what the numbers depend on: the kernel, and masses or an anchor where they were given."""
    if not ephemeris.given_gm_m3_s2 and anchor is None:
        return ephemeris.sha256
    masses = sorted((body, float(value).hex()) for body, value in ephemeris.given_gm_m3_s2.items())
    # The anchor's name is in the file: one of another name is another file.
    parts = (ephemeris.sha256, repr(masses), "" if anchor is None else f"{anchor.name} {anchor.sha256}")
    return hashlib.sha256("\n".join(parts).encode()).hexdigest()


def _content(table: ChebyshevTable, comment: str) -> bytes:
    """Return the bytes of the kernel file: x is TT - TDB, y and z are 0."""
    coefficients = np.zeros((table.records, 3, table.coefficients.shape[2]))
    coefficients[:, 0] = table.coefficients[:, 0]
    return spk_bytes(
        title="TT - TDB at the geocentre (s)",
        comment=comment,
        target=TIME_TARGET,
        center=TIME_CENTER,
        start_s=table.start_s,
        step_s=table.step_s,
        coefficients=coefficients,
    )


@lru_cache(maxsize=1)
def _shipped() -> TimeEphemeris:
    found = TimeEphemeris.open(shipped_path(DEFAULT_TIME_EPHEMERIS))
    expected = manifest(DEFAULT_TIME_EPHEMERIS)["sha256"]
    if found.sha256 != expected:
        raise DataFileError(
            f"the shipped {found.path} has SHA-256 {found.sha256}, its manifest says {expected}: install the package "
            "again",
            path=found.path,
        )
    return found


@lru_cache(maxsize=8)
def _reopen(path: str, sha256: str) -> TimeEphemeris:
    """Rebuild from a pickle; the value is immutable, so one per process is shared."""
    check_sha256(Path(path), sha256)
    return TimeEphemeris.open(path)
