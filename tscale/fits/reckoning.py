"""Numbers in a unit since a reference time, to exact counts and back: what a column TIME means."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import TYPE_CHECKING, Any, Final, Literal, TypeAlias

import numpy as np

from .. import exact
from ..constants import DAY_S, MJD_J2000
from ..errors import InvalidInput
from ..exact import Factor, FloatArray, Pair
from ..formats import labels
from ..formats.leap_seconds import LeapSeconds
from ..scales import Scale

if TYPE_CHECKING:
    from collections.abc import Callable

__all__ = ["Reckoning", "UtcRelative"]

UtcRelative: TypeAlias = Literal["elapsed", "labels"]
_MOST_S: Final = 2.0**61  # so that no sum of two leaves an int64


@dataclass(frozen=True)
class Reckoning:
    """How numbers date events: date = reference + zero + number x unit.

    Parameters
    ----------
    scale : Scale
    mjd : Fraction
        Reference time as a Modified Julian Date of the scale, exact.
    zero_s : Fraction
        Offset of all numbers, s.
    unit_s : Fraction
        Length of the unit, s.
    utc : {"elapsed", "labels"} or None
        For scales with leap seconds: seconds elapsed since the reference, or labels, a day always 86400 units of a
        second (fractions of a day that ends with a leap second fill it, as in Julian Dates). None: whole days and
        longer units are labels; seconds, minutes and hours may be either, so that where the two differ it is an error.
    leap_seconds : LeapSeconds or None
        None takes the default table.
    """

    scale: Scale
    mjd: Fraction
    zero_s: Fraction
    unit_s: Fraction
    utc: UtcRelative | None = None
    leap_seconds: LeapSeconds | None = None

    @property
    def _by_label(self) -> bool:
        return self.scale.utc_labels and (self.utc == "labels" or (self.utc is None and self.unit_s >= DAY_S))

    @property
    def _stretched(self) -> bool:
        """Whether a fraction of a day is one of its true length."""
        return self.unit_s >= DAY_S

    @cached_property
    def _origin(self) -> Pair:
        """Count at the number 0; where labels are counted, seconds of days of 86400 s since MJD 0."""
        seconds = self.mjd * DAY_S + self.zero_s
        if self._by_label:
            return _pair(seconds)
        if not self.scale.utc_labels:
            return _pair(seconds - Fraction(MJD_J2000 * DAY_S + DAY_S // 2))
        day = self.mjd.numerator // self.mjd.denominator
        whole, fraction = labels.count(self.scale, (_int(day), _int(0), np.array(0.0)), self.leap_seconds)
        of_day = (self.mjd - day) * DAY_S
        return _pair(Fraction(int(whole)) + Fraction(float(fraction)) + of_day + self.zero_s)

    @cached_property
    def _factor(self) -> Factor:
        return Factor.of(self.unit_s)

    def count(self, numbers: FloatArray) -> Pair:
        """Counts of the scale since 2000-01-01T12:00:00 for finite float64 numbers, rounded once.

        Raises
        ------
        InvalidInput
            Where UTC numbers can be read in two ways.
        """
        far = np.abs(numbers) * float(self.unit_s) >= _MOST_S
        if np.any(far):
            raise InvalidInput(
                f"{int(np.count_nonzero(far))} of {far.size} times are beyond 2**61 s (73 Gyr) from their reference: "
                "the column is damaged, or no time (see .mask)",
                mask=np.asarray(far),
            )
        total = exact.add(self._since(numbers), self._origin)
        if self._by_label:
            total = self._from_days(total)
        else:
            self._check_leaps(total)
        labels.warn_if_expired(self.scale, total, self.leap_seconds)
        return total

    def _since(self, numbers: FloatArray) -> Pair:
        if self.unit_s == 1:
            return exact.from_seconds(numbers)
        # Not by way of whole days and a fraction of them, which resolves 10 ps.
        product, error = exact.two_product(numbers, self._factor.high)
        carry = np.floor(product)
        return exact.normalise(carry.astype(np.int64), (product - carry) + (error + numbers * self._factor.low))

    def numbers(self, count: Pair) -> FloatArray:
        """The float64 nearest to the number of each count."""
        labels.warn_if_expired(self.scale, count, self.leap_seconds)
        if self._by_label:
            count = self._to_days(count)
        else:
            self._check_leaps(count)
        whole = count[0] - self._origin[0]
        fraction, rest = exact.two_sum(count[1], -self._origin[1])
        if self.unit_s == 1:
            # The whole part is exact as a float64: three terms, rounded once but for what is below 1e-32.
            high, low = exact.two_sum(whole.astype(np.float64), fraction)
            return np.asarray(high + (low + rest))
        unit = float(self.unit_s)
        first = (whole.astype(np.float64) + fraction) / unit
        back, error = exact.two_product(first, unit)
        left = ((whole.astype(np.float64) - back) - error) + fraction + rest
        return np.asarray(first + left / unit)

    def spacing_s(self, largest: float) -> float:
        """How far apart numbers of a size are, in seconds."""
        return float(np.spacing(np.float64(abs(largest)))) * float(self.unit_s) if largest else 0.0

    # ---- labels with leap seconds ----------------------------------------------------------------

    def _from_days(self, total: Pair) -> Pair:
        day, second = np.divmod(total[0], DAY_S)
        face = (day, second, total[1])
        if self._stretched:
            odd = self._odd_days(day)
            if odd.any():
                return self._mixed(odd, face, labels.count(self.scale, _where(odd, face), self.leap_seconds))
        return labels.count(self.scale, face, self.leap_seconds)

    def _mixed(self, odd: Any, face: Any, plain: Pair) -> Pair:
        from ..instants import Instants

        day, second, fraction = face
        part = (second[odd] + fraction[odd]) / DAY_S
        found = Instants.from_mjd(day[odd], part, self.scale.name, leap_seconds=self.leap_seconds)
        whole, rest = np.array(plain[0]), np.array(plain[1])
        whole[odd], rest[odd] = found.whole, found.fraction
        return whole, rest

    def _to_days(self, count: Pair) -> Pair:
        day, second, fraction = labels.label(self.scale, count, self.leap_seconds)
        if self._stretched:
            odd = self._odd_days(day)
            if odd.any():
                from ..instants import Instants

                t = Instants._of((count[0][odd], count[1][odd]), self.scale)
                days, part = t.to_mjd(leap_seconds=self.leap_seconds)
                second, fraction, day = np.array(second), np.array(fraction), np.array(day)
                second[odd], fraction[odd] = exact.multiply(exact.from_seconds(part), Factor.of(Fraction(DAY_S)))
                day[odd] = days
        elif np.any(second >= DAY_S):
            raise InvalidInput(
                "a date lies inside a leap second, which seconds counted by labels cannot say; use utc='elapsed', or "
                "another scale"
            )
        return day * DAY_S + second, fraction

    def _odd_days(self, day: Any) -> Any:
        length: Callable[[Any], Pair] = labels.day_length(self.scale, self.leap_seconds)
        whole, fraction = length(day)
        return (whole != DAY_S) | (fraction != 0.0)

    def _check_leaps(self, count: Pair) -> None:
        """Refuse UTC seconds where it matters whether leap seconds are counted, and nobody has said."""
        if not self.scale.utc_labels or self.utc is not None or not count[0].size:
            return
        at = [int(np.argmin(count[0])), int(np.argmax(count[0]))]
        ends = count[0].reshape(-1)[at], count[1].reshape(-1)[at]
        day, second, _ = labels.label(self.scale, ends, self.leap_seconds)
        by_label = _pair(self.mjd * DAY_S + self.zero_s)[0]
        apart = (ends[0] - self._origin[0]) - (day * DAY_S + second - by_label)
        if np.any(apart != 0):
            raise InvalidInput(
                f"numbers of {self.scale} since MJD {float(self.mjd):.10g} can be read in two ways, "
                f"{int(np.max(np.abs(apart)))} s apart: as seconds elapsed, leap seconds counted, or as days of "
                "86400 s. Say utc='elapsed' or utc='labels'"
            )


def _pair(seconds: Fraction) -> Pair:
    if abs(seconds) >= Fraction(_MOST_S):
        raise InvalidInput(f"a time of {float(seconds):.3g} s lies beyond 2**61 s (73 Gyr): the header is damaged")
    whole = seconds.numerator // seconds.denominator
    # Below 1 also where the rest rounds up to it.
    return exact.normalise(_int(whole), np.float64(float(seconds - whole)))


def _int(value: int) -> Any:
    return np.array(value, dtype=np.int64)


def _where(odd: Any, face: Any) -> Any:
    day, second, fraction = face
    return day, np.where(odd, 0, second), np.where(odd, 0.0, fraction)
