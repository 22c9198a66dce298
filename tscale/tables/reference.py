"""ReferenceData: the tables in use, as one immutable value."""

from __future__ import annotations

import hashlib
import threading
from collections.abc import Sequence
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple, TypeAlias, cast

import numpy as np

from ..errors import InvalidInput, MissingPiece
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .common import mjd_date
from .earth_orientation import EarthOrientation
from .tt_bipm import TTBIPM

if TYPE_CHECKING:
    from ..ephemeris.kernel import Ephemeris
    from ..ephemeris.time_ephemeris import TimeEphemeris

__all__ = ["ReferenceData", "TableFacts"]

File: TypeAlias = "str | Path"
_PARTS = ("leap_seconds", "earth_orientation", "tt_bipm", "ephemeris")


class TableFacts(NamedTuple):
    """What there is to know of one table in use."""

    table: str
    name: str
    start: str
    end: str | None
    issued: str | None
    expires: str | None
    age_days: int | None
    """Days from `issued` to the day asked about; None where no day of issue is known."""
    sha256: str
    path: Path | None


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
    ) -> None:
        tables = tuple(tt_bipm)
        _check("leap_seconds", leap_seconds, LeapSeconds)
        _check("earth_orientation", earth_orientation, EarthOrientation)
        for table in tables:
            _check("tt_bipm", table, TTBIPM)
        if ephemeris is not None and not hasattr(ephemeris, "position"):
            raise InvalidInput(
                f"ephemeris must be an Ephemeris, got {type(ephemeris).__name__}; use ReferenceData.load for a path"
            )
        scales = [table.scale for table in tables]
        if len(set(scales)) != len(scales):
            raise InvalidInput(f"each realisation of TT needs one table, got {', '.join(scales)}; name them apart")
        given = {
            "leap_seconds": leap_seconds,
            "earth_orientation": earth_orientation,
            "tt_bipm": tables,
            "ephemeris": ephemeris,
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
    ) -> ReferenceData:
        """Make a bundle from files, or tables at hand; those left out are the default ones.

        Raises
        ------
        DataFileError
            For a file that is missing, damaged or of another kind.
        """
        leap = LeapSeconds.load(leap_seconds) if isinstance(leap_seconds, (str, Path)) else leap_seconds
        if isinstance(earth_orientation, (str, Path)):
            earth_orientation = EarthOrientation.load(earth_orientation, leap_seconds=leap)
        if tt_bipm is None:
            tt_bipm = ()
        elif isinstance(tt_bipm, (str, Path, TTBIPM)):
            tt_bipm = (tt_bipm,)
        tables = [
            TTBIPM.load(table, leap_seconds=leap) if isinstance(table, (str, Path)) else table for table in tt_bipm
        ]
        if isinstance(ephemeris, (str, Path)):
            from ..ephemeris.kernel import Ephemeris

            ephemeris = Ephemeris.open(ephemeris)
        return cls(leap_seconds=leap, earth_orientation=earth_orientation, tt_bipm=tables, ephemeris=ephemeris)

    def replace(self, **tables: Any) -> ReferenceData:
        """Return a bundle with some members (tables or paths, as for `load`) replaced; None means the default again."""
        unknown = sorted(set(tables) - set(_PARTS))
        if unknown:
            raise InvalidInput(f"no table is called {', '.join(unknown)}; there are {', '.join(_PARTS)}")
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
        """TT - TDB at the geocentre, integrated from this bundle's own ephemeris when first needed."""
        return cast("TimeEphemeris", self._once("time_ephemeris", None))

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
        from ..ephemeris.time_ephemeris import TimeEphemeris

        return TimeEphemeris.of(self.ephemeris)

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def fingerprint(self) -> str:
        """SHA-256 over the hashes of all tables: equal where two bundles give equal results."""
        parts = [self.leap_seconds.sha256, self.earth_orientation.sha256, self.ephemeris.sha256]
        parts += [f"{table.scale} {table.sha256}" for table in self.tt_bipm]
        parts += [f"GM {body} {value!r}" for body, value in sorted(self.ephemeris.given_gm_m3_s2.items())]
        return hashlib.sha256("\n".join(parts).encode()).hexdigest()

    def describe(self, on: date | None = None) -> list[TableFacts]:
        """Facts of every table, for a listing: name, span, dates, age in days on a day (default today), hash, file."""
        today = date.today() if on is None else on
        leap, eop, eph = self.leap_seconds, self.earth_orientation, self.ephemeris
        expires = None if leap.expires_mjd is None else mjd_date(leap.expires_mjd)
        facts = [
            _facts("leap seconds", leap, mjd_date(leap.start_mjd), expires, expires, today),
            _facts("Earth orientation", eop, mjd_date(eop.span[0]), mjd_date(eop.span[1]), None, today),
        ]
        facts += [
            _facts(table.scale, table, mjd_date(table.span[0]), mjd_date(table.span[1]), None, today)
            for table in self.tt_bipm
        ]
        for title, kernel in (("ephemeris", eph), ("time ephemeris", self.time_ephemeris)):
            start, end = (str(Instants.from_seconds(int(np.ceil(s)), scale="TDB").to_iso(0))[:10] for s in kernel.span)
            facts.append(_facts(title, kernel, start, end, None, today))
        return facts

    def __repr__(self) -> str:
        given = [f"{part}={value!r}" for part, value in self._given.items() if value]
        return f"ReferenceData({', '.join(given) or 'default tables'})"


def _facts(title: str, table: Any, start: str, end: str | None, expires: str | None, today: date) -> TableFacts:
    issued = getattr(table, "issued", None)
    try:
        age = (today - date.fromisoformat(issued)).days if issued else None
    except ValueError:  # some issuers write a number of a bulletin here, not a day
        age = None
    return TableFacts(title, table.name, start, end, issued, expires, age, table.sha256, getattr(table, "path", None))


def _check(part: str, value: object, kind: type) -> None:
    if value is not None and not isinstance(value, kind):
        raise InvalidInput(
            f"{part} must be {kind.__name__}, got {type(value).__name__}; use ReferenceData.load to read it from a path"
        )


def _rebuild(given: dict[str, Any]) -> ReferenceData:
    return _DEFAULT if not any(given.values()) else ReferenceData(**given)


_DEFAULT = ReferenceData()
