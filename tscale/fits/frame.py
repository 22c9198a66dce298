"""TimeFrame: what the keywords of a header say about its times, checked for contradictions.

Rots et al. 2015, A&A 574, A36, section 4; FITS Standard 4.0, section 9.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import PLACES, Node, Scale
from . import words
from .cards import Cards, Value
from .header_times import HeaderTime, check_agreement, read_times
from .keywords import (
    bin_position_of,
    column_number_of,
    direction_of,
    ephemeris_of,
    offset_of,
    position_of,
    scale_of,
    seconds_of,
    stored_of,
    unit_of,
)
from .observer import observer_itrf_m
from .reckoning import Reckoning, UtcRelative
from .reference_time import reference_mjd

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = ["TimeFrame", "read_time_frame"]


@dataclass(frozen=True)
class TimeFrame:
    """The time frame of an HDU, or of one column of it.

    Attributes
    ----------
    scale : Scale
        TIMESYS, or TCTYPn.
    position : str
        TREFPOS, or TRPOSn: TOPOCENTER, GEOCENTER, BARYCENTER, or another word of the standard.
    mjd : Fraction
        Reference time as a Modified Julian Date of the scale, exactly as the header writes it.
    unit : str
        TIMEUNIT.
    column_unit : str
        TCUNIn or TUNITn of the column, else TIMEUNIT.
    offset_s : Fraction
        TIMEOFFS or TIMEZERO, s: to be added to all relative times.
    factor, zero : Fraction
        TSCALn and TZEROn of the column: value = zero + factor x what is stored.
    direction : tuple of str or None
        TREFDIR, or TRDIRn: keywords or columns with the direction to which path lengths were reduced.
    ephemeris : str or None
        PLEPHEM.
    bin_s, bin_position : float
        TIMEDEL in s (0 where it is not given), and TIMEPIXR: where in the bin a time stamp is, from 0 to 1.
    systematic_s, random_s : float or None
        TIMSYER and TIMRDER: standard uncertainties, s.
    observer_m : (float, float, float) or None
        OBSGEO: ITRS position, m.
    orbit : str or None
        OBSORBIT: the name of a file with the orbit.
    times : mapping of str to HeaderTime
        TSTART, DATE-BEG, MJD-OBS ... as instants.
    notes : tuple of str
        Defaults taken, old words.
    """

    scale: Scale
    position: str
    mjd: Fraction
    unit: str
    column_unit: str
    offset_s: Fraction = Fraction(0)
    factor: Fraction = Fraction(1)
    zero: Fraction = Fraction(0)
    direction: tuple[str, ...] | None = None
    ephemeris: str | None = None
    bin_s: float = 0.0
    bin_position: float = 0.5
    systematic_s: float | None = None
    random_s: float | None = None
    observer_m: tuple[float, float, float] | None = None
    orbit: str | None = None
    times: Mapping[str, HeaderTime] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    utc: UtcRelative | None = None
    leap_seconds: LeapSeconds | None = field(default=None, repr=False)

    @property
    def node(self) -> Node:
        """Scale and place as a chain names them.

        Raises
        ------
        InvalidInput
            For a reference position at which nothing here is dated, such as HELIOCENTER.
        """
        if self.position not in PLACES:
            raise InvalidInput(
                f"times at {self.position} are not known here; known places are {', '.join(PLACES)}. Where the header "
                "is wrong, say cards={'TREFPOS': ...}"
            )
        return Node(self.scale, self.position)

    @property
    def column_reckoning(self) -> Reckoning:
        """How stored numbers of the column count."""
        unit_s = words.UNITS_S[self.column_unit]
        zero_s = self.offset_s + self.zero * unit_s
        return Reckoning(self.scale, self.mjd, zero_s, self.factor * unit_s, self.utc, self.leap_seconds)

    @property
    def bin_centre_s(self) -> float:
        """From a time stamp to the centre of its bin, s."""
        return (0.5 - self.bin_position) * self.bin_s

    def instants(self, numbers: npt.ArrayLike) -> Instants:
        """Instants of stored numbers of the column, exact to the rounding of the fraction (0.1 fs).

        Raises
        ------
        InvalidInput
            For NaN and infinity, with the mask, and where UTC numbers can be read in two ways.
        """
        values = np.asarray(numbers, dtype=np.float64)
        bad = ~np.isfinite(values)
        if bad.any():
            raise InvalidInput(
                f"{int(np.count_nonzero(bad))} of {bad.size} times are undefined (NaN) or infinite; leave them out "
                "(see .mask)",
                mask=bad,
            )
        return Instants._of(self.count(values), self.scale, self.node.place)

    def count(self, numbers: FloatArray) -> Pair:
        """Counts of finite stored numbers."""
        return self.column_reckoning.count(numbers)

    def numbers(self, t: Instants) -> FloatArray:
        """The float64 nearest to the number that stands for each instant; undoes `instants`."""
        node = self.node
        if t.scale != node.scale.name or t.place not in (None, node.place):
            raise InvalidInput(f"this frame counts {node}, got instants of {t.node}; carry them there with a chain")
        return self.column_reckoning.numbers(t.pair)


def read_time_frame(
    header: Any,
    column: str | int | None = None,
    *,
    cards: Mapping[str, Value] | None = None,
    utc: UtcRelative | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> TimeFrame:
    """Read the time frame of a header.

    Parameters
    ----------
    header : astropy.io.fits.Header, mapping, str or bytes
        A header, or the text of its cards. Numbers are read by their digits, not by way of a float.
    column : str or int, optional
        Column of a table, whose own TCTYPn, TRPOSn, TRDIRn, TCUNIn, TUNITn, TSCALn and TZEROn then stand first.
    cards : mapping, optional
        Values in place of those in the header, where it is incomplete or wrong.
    utc : {"elapsed", "labels"}, optional
        How seconds of UTC since a reference are counted over leap seconds; see `Reckoning`.
    leap_seconds : LeapSeconds, optional
        For UTC.

    Raises
    ------
    DataFileError
        For words that the standard does not have and for contradictions; names the keywords.
    InvalidInput
        Where UTC times can be read in two ways.
    """
    found = Cards.of(header, cards)
    notes: list[str] = []
    number = column_number_of(found, column)
    scale = scale_of(found, number, notes)
    position = position_of(found, number, notes, scale)
    unit = unit_of(found, ("TIMEUNIT",), notes)
    own = (f"TCUNI{number}", f"TUNIT{number}")
    column_unit = unit if number is None else unit_of(found, (*own, "TIMEUNIT"), [])
    unit_s = words.UNITS_S[unit]
    years = sorted({unit, column_unit} & {"ta", "Ba"})
    notes.extend(f"a year {name} is taken as {float(words.UNITS_S[name]):.4f} s" for name in years)
    offset_s = offset_of(found) * unit_s
    mjd = reference_mjd(found, scale, notes, leap_seconds)
    relative = Reckoning(scale, mjd, offset_s, unit_s, utc, leap_seconds)
    times = read_times(found, relative)
    check_agreement(found, times)
    factor, zero = stored_of(found, number)
    trefdir = found.text("TREFDIR") if number is None else found.text(f"TRDIR{number}") or found.text("TREFDIR")
    return TimeFrame(
        scale,
        position,
        mjd,
        unit,
        column_unit,
        offset_s,
        factor,
        zero,
        direction_of(found, trefdir),
        found.text("PLEPHEM") or ephemeris_of(position, notes),
        seconds_of(found, "TIMEDEL", unit_s) or 0.0,
        bin_position_of(found),
        seconds_of(found, "TIMSYER", unit_s),
        seconds_of(found, "TIMRDER", unit_s),
        observer_itrf_m(found),
        found.text("OBSORBIT"),
        times,
        tuple(dict.fromkeys(notes)),
        utc,
        leap_seconds,
    )
