"""A clock that ticks its own proper time, as a piece of a chain."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np

from ..counts import tcg_from_tt
from ..earth.gravity.field import GravityField
from ..earth.observer import Observer
from ..earth.site import Site
from ..errors import InvalidInput, MissingPiece, ScaleMismatch
from ..exact import Pair
from ..instants import Instants
from ..scales import Scale
from ..tables.clock_arguments import kind_words
from ..tables.reference import ReferenceData
from ..transforms.barycentric import tdb_from_tt
from ..transforms.proper_models import model_of
from ..transforms.proper_tides import Tides, checked_tides
from ..transforms.proper_time import checked_gravity, geopotential_number_of, missing_potential
from .dates import tt_at

__all__ = ["ProperClock"]

_FASTEST: Final = 1e-3


@dataclass(frozen=True, eq=False)
class ProperClock:
    """An ideal clock at an observer: it was set once and has ticked its own proper time since.

    Give it to `tscale.chain` in `clocks=[...]`. Its readings are Instants of the scale PROPER(name), which has no
    leap seconds, and date events at the clock.

    Parameters
    ----------
    name : str
        `maser` or `PROPER(maser)`; without spaces and brackets.
    observer : Site, Trajectory or SurfaceSite
        Where the clock is. The chain's `site=` is the same one, or left out.
    coincidence : Instants, one
        When it was set, on a coordinate time: UTC, TAI, TT, TT(BIPM), UT1, a satellite-navigation time, TCG, TCB, TDB
        or, near the Moon, TCL (an event at the clock).
    reading : Instants, one, optional
        What it showed then, on PROPER(name); by default what TT showed, or TCG where the coincidence is given
        in it; of a clock that TT does not reach, what TDB showed.
    rate_offset : float
        Fractional frequency by which it is set fast: it shows (1 + rate_offset) s for 1 s of proper time.
    gravity : GravityField, optional
        See `proper_time.rate_terms`.
    tides : bool or str
        See `proper_time.rate_terms`.
    geopotential_sigma_m2_s2 : float
        Standard uncertainty of the potential at the clock, constant in time, m2/s2: 0.1 m2/s2 is 1.1e-18 in rate.

    Raises
    ------
    InvalidInput, ScaleMismatch
        Values that cannot be; the message says what can.
    MissingPiece
        For a site of unknown potential.
    """

    name: str
    observer: Observer
    coincidence: Instants
    reading: Instants | None = None
    rate_offset: float = field(default=0.0, kw_only=True)
    gravity: GravityField | None = field(default=None, kw_only=True)
    tides: Tides = field(default=True, kw_only=True)
    geopotential_sigma_m2_s2: float = field(default=0.0, kw_only=True)

    def __post_init__(self) -> None:
        if not isinstance(self.name, str):
            raise InvalidInput(f"the name of a clock is a text, got {kind_words(self.name)}")
        name = self.name[7:-1] if self.name.startswith("PROPER(") and self.name.endswith(")") else self.name
        try:
            Scale.parse(f"PROPER({name})")
        except InvalidInput as error:
            raise InvalidInput(
                f"the name of a clock stands in PROPER(name): no spaces, brackets or @, and not empty; got "
                f"{self.name!r:.60}"
            ) from error
        object.__setattr__(self, "name", name)
        if not isinstance(self.observer, Observer):
            raise InvalidInput(
                f"clock {name!r}: the observer is a Site, a Trajectory or a SurfaceSite, got "
                f"{kind_words(self.observer)}"
            )
        _check_one(name, "coincidence", self.coincidence)
        if self.reading is not None:
            _check_one(name, "reading", self.reading)
            if self.reading.scale != self.scale:
                raise ScaleMismatch(
                    f"clock {name!r}: its reading is on {self.scale}, got {self.reading.scale}; make it with "
                    f"Instants.from_iso(text, scale='{self.scale}')"
                )
        checked_gravity(self.gravity)
        model_of(self.observer, self.gravity, True)
        object.__setattr__(self, "tides", checked_tides(self.tides))
        if isinstance(self.observer, Site) and geopotential_number_of(self.observer) is None and self.gravity is None:
            raise MissingPiece(missing_potential(self.observer))
        rate = _number(name, "rate_offset", self.rate_offset)
        if abs(rate) > _FASTEST:
            raise InvalidInput(
                f"clock {name!r}: rate_offset is a fraction such as -4.4647e-10, at most {_FASTEST:g} in size; got "
                f"{rate!r}"
            )
        sigma = _number(name, "geopotential_sigma_m2_s2", self.geopotential_sigma_m2_s2)
        if sigma < 0.0:
            raise InvalidInput(f"clock {name!r}: geopotential_sigma_m2_s2 must be 0 or more, got {sigma!r}")
        object.__setattr__(self, "rate_offset", rate)
        object.__setattr__(self, "geopotential_sigma_m2_s2", sigma)

    @property
    def scale(self) -> str:
        """PROPER(name)."""
        return f"PROPER({self.name})"

    def coincidence_tt(self, reference: ReferenceData) -> Pair:
        """TT count of the coincidence, scalar.

        Raises
        ------
        MissingPiece
            For a realisation of TT whose table is not in `reference`.
        InvalidInput
            For a scale that is no coordinate time.
        """
        own = self.observer if self.dates_own_event else None
        return tt_at(Instants._of(_scalar(self.coincidence), self.coincidence.scale), own, reference)

    @property
    def dates_own_event(self) -> bool:
        """Whether TT and TCG reach the clock; else its events are dated in TDB (see `transforms.proper_models`)."""
        return model_of(self.observer, self.gravity, self.tides).dates_own_event

    def reading_at(self, coincidence_tt: Pair, reference: ReferenceData) -> Pair:
        """Count that the clock showed at the coincidence, of which the TT count is given."""
        if self.reading is not None:
            return _scalar(self.reading)
        if not self.dates_own_event:
            return tdb_from_tt(coincidence_tt, reference)
        return tcg_from_tt(coincidence_tt) if self.coincidence.scale == "TCG" else coincidence_tt


def _scalar(t: Instants) -> Pair:
    return t.whole.reshape(()), t.fraction.reshape(())


def _check_one(name: str, what: str, value: Any) -> None:
    if not isinstance(value, Instants) or value.size != 1:
        got = f"{value.size} instants" if isinstance(value, Instants) else kind_words(value)
        raise InvalidInput(f"clock {name!r}: the {what} is one instant, got {got}; make it with Instants.from_iso")
    if value.place not in (None, "TOPOCENTER"):
        raise ScaleMismatch(
            f"clock {name!r}: the {what} is an event at the clock, got one at {value.place}; leave the place out or "
            "state TOPOCENTER"
        )


def _number(name: str, what: str, value: Any) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float | np.integer | np.floating):
        raise InvalidInput(f"clock {name!r}: {what} must be a number, got {kind_words(value)}")
    if not math.isfinite(value):
        raise InvalidInput(f"clock {name!r}: {what} must be finite, got {value!r}")
    return float(value)
