"""ReferenceData: the tables in use, as one immutable value."""

from __future__ import annotations

import hashlib
import threading
from collections.abc import Iterable, Sequence
from datetime import date, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn, TypeAlias, cast

from ..errors import InvalidInput, MissingPiece
from ..formats.leap_seconds import LeapSeconds
from .earth_orientation import EarthOrientation
from .facts import TableFacts, facts_of
from .imported import resolved
from .tt_bipm import TTBIPM

if TYPE_CHECKING:
    from ..ephemeris.kernel import Ephemeris
    from ..ephemeris.time_ephemeris import TimeEphemeris

__all__ = ["ReferenceData", "TableFacts"]

File: TypeAlias = "str | Path"
_PARTS = ("leap_seconds", "earth_orientation", "tt_bipm", "ephemeris", "time_ephemeris")


class ReferenceData:
    """One immutable bundle of tables: leap seconds, Earth orientation, TT(BIPM), ephemeris.

    A table left out is the default one, and is read when it is first needed. Safe between threads.

    Parameters
    ----------
    leap_seconds : LeapSeconds, optional
        Default `LeapSeconds.default()`.
    earth_orientation : EarthOrientation, optional
        Default `EarthOrientation.default(leap_seconds)`: rows stand at 0h UTC, and the leap seconds say when that is.
    tt_bipm : sequence of TTBIPM, optional
        None by default: no such table is shipped.
    ephemeris : Ephemeris, optional
        Default `Ephemeris.default()`.
    time_ephemeris : TimeEphemeris, optional
        TT - TDB at the geocentre. By default that of `ephemeris`: integrated from it, and pinned where TT - TDB is
        defined (T0, in 1977). A kernel that does not reach T0 is pinned to the shipped time ephemeris instead, in the
        middle of their overlap; its name then says "anchored to" which.

    Raises
    ------
    InvalidInput
        For members of another type, or two TT(BIPM) tables of one realisation.
    """

    __slots__ = ("__weakref__", "_given", "_lock", "_made")
    _given: dict[str, Any]
    _made: dict[str, Any]
    _lock: threading.RLock

    def __init__(
        self,
        *,
        leap_seconds: LeapSeconds | None = None,
        earth_orientation: EarthOrientation | None = None,
        tt_bipm: Sequence[TTBIPM] = (),
        ephemeris: Ephemeris | None = None,
        time_ephemeris: TimeEphemeris | None = None,
    ) -> None:
        tables = _tables(tt_bipm)
        _check("leap_seconds", leap_seconds, LeapSeconds)
        _check("earth_orientation", earth_orientation, EarthOrientation)
        for table in tables:
            _check("tt_bipm", table, TTBIPM)
        if ephemeris is not None and not hasattr(ephemeris, "position"):
            raise InvalidInput(
                f"ephemeris must be an Ephemeris, got {type(ephemeris).__name__}; use ReferenceData.load for a path"
            )
        if time_ephemeris is not None and not hasattr(time_ephemeris, "tt_minus_tdb_s"):
            raise InvalidInput(
                f"time_ephemeris must be a TimeEphemeris, got {type(time_ephemeris).__name__}; use ReferenceData.load "
                "for a path"
            )
        scales = [table.scale for table in tables]
        if len(set(scales)) != len(scales):
            raise InvalidInput(f"each realisation of TT needs one table, got {', '.join(scales)}; name them apart")
        given = {
            "leap_seconds": leap_seconds,
            "earth_orientation": earth_orientation,
            "tt_bipm": tables,
            "ephemeris": ephemeris,
            "time_ephemeris": time_ephemeris,
        }
        object.__setattr__(self, "_given", given)
        object.__setattr__(self, "_made", {})
        object.__setattr__(self, "_lock", threading.RLock())

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"ReferenceData is immutable; cannot set {name!r}. Use .replace({name}=...)")

    def __reduce__(self) -> tuple[Any, ...]:
        return _rebuild, (self._given,)

    # ---- making one ------------------------------------------------------------------------------

    @classmethod
    def default(cls) -> ReferenceData:
        """Return the shared bundle of default tables; cheap, since each is read only when it is needed."""
        return _DEFAULT

    @classmethod
    def load(
        cls,
        *,
        leap_seconds: File | LeapSeconds | None = None,
        earth_orientation: File | EarthOrientation | None = None,
        tt_bipm: File | TTBIPM | Sequence[File | TTBIPM] | None = None,
        ephemeris: File | Ephemeris | None = None,
        time_ephemeris: File | TimeEphemeris | None = None,
        **unknown: NoReturn,
    ) -> ReferenceData:
        """Make a bundle from files, or tables at hand; those left out are the default ones.

        `imported:NAME` in place of a path is a file that was imported into the cache (`tscale data --import`).

        Raises
        ------
        DataFileError
            For a file that is missing, damaged or of another kind.
        InvalidInput
            For what is neither a table nor a path, and for a table that is not known by name.
        """
        _check_names(unknown)
        leap_seconds, earth_orientation = resolved(leap_seconds), resolved(earth_orientation)
        ephemeris, time_ephemeris = resolved(ephemeris), resolved(time_ephemeris)
        leap = LeapSeconds.load(leap_seconds) if isinstance(leap_seconds, (str, Path)) else leap_seconds
        if isinstance(earth_orientation, (str, Path)):
            earth_orientation = EarthOrientation.load(earth_orientation, leap_seconds=leap)
        tables = [
            TTBIPM.load(table, leap_seconds=leap) if isinstance(table, (str, Path)) else table
            for table in map(resolved, _tables(tt_bipm))
        ]
        if isinstance(ephemeris, (str, Path)):
            from ..ephemeris.kernel import Ephemeris

            ephemeris = Ephemeris.open(ephemeris)
        if isinstance(time_ephemeris, (str, Path)):
            from ..ephemeris.time_ephemeris import TimeEphemeris

            time_ephemeris = TimeEphemeris.open(time_ephemeris)
        return cls(
            leap_seconds=leap,
            earth_orientation=earth_orientation,
            tt_bipm=tables,
            ephemeris=ephemeris,
            time_ephemeris=time_ephemeris,
        )

    def replace(self, **tables: Any) -> ReferenceData:
        """Return a bundle with some members (tables or paths, as for `load`) replaced; None means the default again."""
        _check_names(tables)
        return type(self).load(**{**self._given, **tables})

    # ---- members ---------------------------------------------------------------------------------

    @property
    def leap_seconds(self) -> LeapSeconds:
        """TAI - UTC."""
        return cast(LeapSeconds, self._given["leap_seconds"] or LeapSeconds.default())

    @property
    def earth_orientation(self) -> EarthOrientation:
        """UT1, polar motion and celestial pole offsets."""
        given = self._given["earth_orientation"]
        return cast(EarthOrientation, self._once("earth_orientation", given))

    @property
    def tt_bipm(self) -> tuple[TTBIPM, ...]:
        """Realisations of TT by the BIPM; empty unless given."""
        return cast("tuple[TTBIPM, ...]", self._given["tt_bipm"])

    def realisation(self, scale: str) -> TTBIPM:
        """Find the table of a realisation such as `TT(BIPM23)`, or `MissingPiece` that names those at hand."""
        for table in self.tt_bipm:
            if table.scale == scale:
                return table
        have = ", ".join(table.scale for table in self.tt_bipm) or "none"
        raise MissingPiece(
            f"no table of {scale} in the reference data (there: {have}); load its BIPM file with tt_bipm="
        )

    @property
    def ephemeris(self) -> Ephemeris:
        """Positions of the bodies."""
        return cast("Ephemeris", self._once("ephemeris", self._given["ephemeris"]))

    @property
    def time_ephemeris(self) -> TimeEphemeris:
        """TT - TDB at the geocentre: as given, else integrated from this bundle's own ephemeris when first needed.

        Raises
        ------
        OutOfSpan
            For an ephemeris that neither reaches T0 (in 1977) nor overlaps the shipped time ephemeris, 1960 to 2060.
        """
        return cast("TimeEphemeris", self._once("time_ephemeris", self._given["time_ephemeris"]))

    def _once(self, part: str, given: Any) -> Any:
        """Return a member that is given, or made on first use; by one thread, while the others wait."""
        if given is not None:
            return given
        made = self._made.get(part)
        if made is None:
            with self._lock:
                made = self._made.get(part)
                if made is None:
                    made = self._made[part] = self._make(part)
        return made

    def _make(self, part: str) -> Any:
        if part == "earth_orientation":
            return EarthOrientation.default(self.leap_seconds)
        if part == "ephemeris":
            from ..ephemeris.kernel import Ephemeris

            return Ephemeris.default()
        from ..ephemeris.anchored import anchored_time_ephemeris

        return anchored_time_ephemeris(self.ephemeris)

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def fingerprint(self) -> str:
        """SHA-256 over the hashes of all tables: two bundles in which it is equal give equal results."""
        parts = [self.leap_seconds.sha256, self.earth_orientation.sha256, self.ephemeris.sha256]
        parts += [f"{table.scale} {table.sha256}" for table in self.tt_bipm]
        parts += [f"GM {body} {value!r}" for body, value in sorted(self.ephemeris.given_gm_m3_s2.items())]
        if self._given["time_ephemeris"] is not None:
            parts.append(f"time ephemeris {self.time_ephemeris.sha256}")
        return hashlib.sha256("\n".join(parts).encode()).hexdigest()

    def describe(self, on: date | None = None) -> list[TableFacts]:
        """Facts of every table, for a listing: name, span, dates, age in days on a day (default today), hash, file.

        A table that cannot be read or made stands in the list with its `error`.
        """
        if on is not None and not isinstance(on, date):
            raise InvalidInput(f"on must be a datetime.date, such as date(2025, 1, 31); got {on!r}")
        today = date.today() if on is None else on.date() if isinstance(on, datetime) else on
        return facts_of(
            [
                ("leap seconds", lambda: self.leap_seconds),
                ("Earth orientation", lambda: self.earth_orientation),
                *((table.scale, lambda table=table: table) for table in self.tt_bipm),
                ("ephemeris", lambda: self.ephemeris),
                ("time ephemeris", lambda: self.time_ephemeris),
            ],
            today,
        )

    def __repr__(self) -> str:
        given = [f"{part}={value!r}" for part, value in self._given.items() if value]
        return f"ReferenceData({', '.join(given) or 'default tables'})"


def _tables(given: Any) -> tuple[Any, ...]:
    """What was given as TT(BIPM), one or several, as a tuple."""
    if given is None:
        return ()
    if isinstance(given, (str, Path, TTBIPM)):
        return (given,)
    try:
        return tuple(given)
    except TypeError as error:
        raise InvalidInput(
            f"tt_bipm must be TTBIPM tables, or their paths for ReferenceData.load; got {given!r}"
        ) from error


def _check_names(names: Iterable[str]) -> None:
    unknown = sorted(set(names) - set(_PARTS))
    if unknown:
        raise InvalidInput(f"no table is called {', '.join(unknown)}; there are {', '.join(_PARTS)}")


def _check(part: str, value: object, kind: type) -> None:
    if value is not None and not isinstance(value, kind):
        raise InvalidInput(
            f"{part} must be {kind.__name__}, got {type(value).__name__}; use ReferenceData.load to read it from a path"
        )


def _rebuild(given: dict[str, Any]) -> ReferenceData:
    return _DEFAULT if not any(given.values()) else ReferenceData(**given)


_DEFAULT = ReferenceData()
