"""Instants: arrays of dated events, exact to 0.1 fs, that know their scale and place."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from . import exact
from .errors import InvalidInput, ScaleMismatch, TscaleError
from .exact import BoolArray, FloatArray, IntArray, Pair
from .formats import iso8601, julian, labels
from .formats.checks import Label, together
from .scales import Node, Scale, check_place

if TYPE_CHECKING:
    from .formats.leap_seconds import LeapSeconds

__all__ = ["Instants"]

Seconds: TypeAlias = "float | int | npt.ArrayLike | tuple[npt.ArrayLike, npt.ArrayLike]"
UtcDay: TypeAlias = Literal["true", "86400"]


class Instants:
    """An immutable array of instants of one scale at one place.

    Stored as `whole` (int64 seconds) and `fraction` (float64 in [0, 1)), counted from the label
    2000-01-01T12:00:00 of the scale. For UTC and clocks labelled like UTC the count is SI seconds
    elapsed, so that it never repeats or jumps at a leap second; the leap-second table is needed only
    where a label is read or written.

    Parameters
    ----------
    whole : int array
        Whole seconds: integers, or integral floats up to 2**53.
    fraction : float array
        Fraction of a second, finite; any size is carried into `whole`.
    scale : str
        `UTC`, `TAI`, `TT`, `TDB`, `UTC(KST)`, `CLOCK(maser)` ... (see `tscale.scales`).
    place : str or None
        `TOPOCENTER`, `GEOCENTER`, `BARYCENTER` ...; None leaves it unstated.

    Raises
    ------
    InvalidInput
        NaN or infinity (with the mask), shapes that do not broadcast, unknown scale or place.
    """

    __slots__ = ("_fraction", "_place", "_scale", "_whole")
    _whole: IntArray
    _fraction: FloatArray
    _scale: Scale
    _place: str | None

    def __init__(self, whole: npt.ArrayLike, fraction: npt.ArrayLike, scale: str, place: str | None = None) -> None:
        pair = exact.normalise(*exact.checked_parts(whole, fraction))
        self._set(pair, Scale.parse(scale), check_place(place))

    def _set(self, pair: Pair, scale: Scale, place: str | None) -> None:
        whole = np.array(pair[0], dtype=np.int64)
        fraction = np.array(pair[1], dtype=np.float64)
        if not np.isfinite(fraction).all():
            raise InvalidInput("a date came out as NaN or infinite (see .mask)", mask=~np.isfinite(fraction))
        whole.flags.writeable = False
        fraction.flags.writeable = False
        object.__setattr__(self, "_whole", whole)
        object.__setattr__(self, "_fraction", fraction)
        object.__setattr__(self, "_scale", scale)
        object.__setattr__(self, "_place", place)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"Instants are immutable; cannot set {name!r}. Use .at(place) or .shifted(seconds)")

    def __reduce__(self) -> tuple[Any, ...]:
        return (Instants, (self._whole, self._fraction, self.scale, self._place))

    @classmethod
    def _of(cls, pair: Pair, scale: Scale | str, place: str | None = None) -> Instants:
        """Build from a pair that is known to be normalised: no checks, used by the transforms."""
        self = cls.__new__(cls)
        self._set(pair, scale if isinstance(scale, Scale) else Scale.parse(scale), place)
        return self

    # ---- ways in ---------------------------------------------------------------------------------

    @classmethod
    def from_seconds(
        cls, whole: npt.ArrayLike, fraction: npt.ArrayLike = 0.0, scale: str = "TT", place: str | None = None
    ) -> Instants:
        """Count of seconds since 2000-01-01T12:00:00 of the scale, as whole + fraction."""
        return cls(whole, fraction, scale, place)

    @classmethod
    def from_iso(
        cls,
        text: str | Sequence[str] | npt.NDArray[np.str_],
        scale: str,
        place: str | None = None,
        *,
        leap_seconds: LeapSeconds | None = None,
    ) -> Instants:
        """Read ISO 8601 texts with up to 18 decimals (see `formats.iso8601` for the accepted layouts).

        Raises
        ------
        TextError
            For a text that is not a date, or a label that does not exist, such as 23:59:60 on an ordinary day.
        OutOfSpan
            For UTC labels before the leap-second table.
        """
        kind = Scale.parse(scale)
        parsed = iso8601.parse(
            text, allow_z=kind.utc_labels, allow_second_60=kind.utc_labels, label_offset_s=kind.label_offset_s
        )
        return cls._read(kind, parsed, leap_seconds, place)

    @classmethod
    def from_mjd(
        cls,
        day: npt.ArrayLike,
        fraction: npt.ArrayLike,
        scale: str,
        place: str | None = None,
        *,
        utc_day: UtcDay = "true",
        leap_seconds: LeapSeconds | None = None,
    ) -> Instants:
        """Read Modified Julian Dates given as whole day + fraction of that day.

        A float64 fraction of a day resolves 10 ps. With `utc_day="true"` a UTC day with a leap second is 86401 s
        long (the IAU SOFA habit); `utc_day="86400"` reads the fraction in units of 86400 s always, under which
        nothing can be dated inside a leap second.
        """
        kind = Scale.parse(scale)
        label = julian.label_from_mjd(day, fraction, labels.day_length(kind, leap_seconds, utc_day))
        return cls._read(kind, label, leap_seconds, place)

    @classmethod
    def from_jd(
        cls,
        day: npt.ArrayLike,
        fraction: npt.ArrayLike,
        scale: str,
        place: str | None = None,
        *,
        utc_day: UtcDay = "true",
        leap_seconds: LeapSeconds | None = None,
    ) -> Instants:
        """Read Julian Dates given as whole day + fraction; as `from_mjd`, with days that start at noon."""
        kind = Scale.parse(scale)
        label = julian.label_from_jd(day, fraction, labels.day_length(kind, leap_seconds, utc_day))
        return cls._read(kind, label, leap_seconds, place)

    @classmethod
    def _read(cls, kind: Scale, label: Label, table: LeapSeconds | None, place: str | None) -> Instants:
        pair = labels.count(kind, label, table)
        labels.warn_if_expired(kind, pair, table)
        return cls._of(pair, kind, check_place(place))

    def _label(self, table: LeapSeconds | None) -> Label:
        labels.warn_if_expired(self._scale, self.pair, table)
        return labels.label(self._scale, self.pair, table)

    @classmethod
    def concatenate(cls, parts: Sequence[Instants]) -> Instants:
        """Join one-dimensional Instants of the same scale and place."""
        if not parts:
            raise InvalidInput("nothing to concatenate: give at least one Instants")
        first = parts[0]
        for other in parts:
            first._same_kind(other, "join")
            if other.ndim != 1:
                raise InvalidInput(f"only one-dimensional Instants are joined, got shape {other.shape}; use .ravel()")
        pair = (np.concatenate([p._whole for p in parts]), np.concatenate([p._fraction for p in parts]))
        return cls._of(pair, first._scale, first._place)

    # ---- ways out --------------------------------------------------------------------------------

    def to_iso(self, digits: int = 12, *, leap_seconds: LeapSeconds | None = None) -> npt.NDArray[np.str_]:
        """Write ISO 8601 texts with 0 to 18 decimals, rounded to nearest, in the shape of the instants."""
        return iso8601.format(
            *self._label(leap_seconds), digits, day_length=labels.day_length(self._scale, leap_seconds, "true")
        )

    def to_mjd(
        self, *, utc_day: UtcDay = "true", leap_seconds: LeapSeconds | None = None
    ) -> tuple[IntArray, FloatArray]:
        """Modified Julian Dates as (int64 day, float64 fraction in [0, 1)); the fraction resolves 10 ps."""
        return julian.mjd_from_label(*self._label(leap_seconds), labels.day_length(self._scale, leap_seconds, utc_day))

    def to_jd(
        self, *, utc_day: UtcDay = "true", leap_seconds: LeapSeconds | None = None
    ) -> tuple[IntArray, FloatArray]:
        """Julian Dates as (int64 day that starts at noon, float64 fraction in [0, 1))."""
        return julian.jd_from_label(*self._label(leap_seconds), labels.day_length(self._scale, leap_seconds, utc_day))

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def whole(self) -> IntArray:
        """Whole seconds of the count (read-only)."""
        return self._whole

    @property
    def fraction(self) -> FloatArray:
        """Fraction of a second in [0, 1) (read-only)."""
        return self._fraction

    @property
    def pair(self) -> Pair:
        """`(whole, fraction)`."""
        return self._whole, self._fraction

    @property
    def scale(self) -> str:
        """Name of the scale."""
        return self._scale.name

    @property
    def place(self) -> str | None:
        """Name of the place, or None where it is unstated."""
        return self._place

    @property
    def node(self) -> Node:
        """Scale and place together."""
        return Node(self._scale, self._place)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array."""
        return self._whole.shape

    @property
    def ndim(self) -> int:
        """Number of dimensions."""
        return self._whole.ndim

    @property
    def size(self) -> int:
        """Number of instants."""
        return self._whole.size

    def __len__(self) -> int:
        return len(self._whole)

    def __iter__(self) -> Iterator[Instants]:
        for index in range(len(self)):
            yield self[index]

    def __getitem__(self, key: Any) -> Instants:
        return Instants._of((self._whole[key], self._fraction[key]), self._scale, self._place)

    def reshape(self, *shape: int) -> Instants:
        """The same instants in another shape."""
        return Instants._of((self._whole.reshape(*shape), self._fraction.reshape(*shape)), self._scale, self._place)

    def ravel(self) -> Instants:
        """The same instants as a one-dimensional array."""
        return self.reshape(-1)

    # ---- arithmetic ------------------------------------------------------------------------------

    def at(self, place: str | None) -> Instants:
        """The same dates with the place stated."""
        return Instants._of(self.pair, self._scale, check_place(place))

    def shifted(self, seconds: Seconds) -> Instants:
        """The instants later by `seconds` of their own scale: float64, or an (int64, float64) pair."""
        if isinstance(seconds, tuple):
            if len(seconds) != 2:
                raise InvalidInput(f"a shift is seconds or a (whole, fraction) pair, got a tuple of {len(seconds)}")
            step = exact.normalise(*exact.checked_parts(*seconds))
        else:
            step = exact.from_seconds(exact.checked_parts(0, seconds)[1])
        together(self._whole, step[0])
        moved = exact.add(self.pair, step)
        far = np.abs(moved[0] + (moved[0] < 0)) >= exact.MOST_S
        if np.any(far):
            raise InvalidInput("shifted beyond 2**62 s (146 Gyr) from 2000, as far as counts go", mask=np.asarray(far))
        return Instants._of(moved, self._scale, self._place)

    def minus_exact(self, other: Instants) -> Pair:
        """`self - other` in seconds of the scale as (int64, float64 in [0, 1))."""
        self._same_kind(other, "compare or subtract")
        together(self._whole, other._whole)
        return exact.subtract(self.pair, other.pair)

    def minus(self, other: Instants) -> FloatArray:
        """`self - other` in seconds of the scale as float64, rounded once."""
        return exact.seconds(self.minus_exact(other))

    def _same_kind(self, other: object, verb: str) -> None:
        if not isinstance(other, Instants):
            raise ScaleMismatch(f"cannot {verb} Instants and {type(other).__name__}; make Instants of it first")
        if other._scale != self._scale or other._place != self._place:
            raise ScaleMismatch(
                f"cannot {verb} {self.node} and {other.node}: convert one with tscale.chain, "
                "or state the place with .at(...)"
            )

    def __add__(self, seconds: Seconds) -> Instants:
        return self.shifted(seconds)

    def __sub__(self, other: Instants | float) -> FloatArray | Instants:
        if isinstance(other, Instants):
            return self.minus(other)
        return self.shifted(-exact.checked_parts(0, other)[1])

    def __eq__(self, other: object) -> BoolArray:  # type: ignore[override]
        if not isinstance(other, Instants):
            return NotImplemented
        whole, fraction = self.minus_exact(other)
        return np.asarray((whole == 0) & (fraction == 0.0))

    def __ne__(self, other: object) -> BoolArray:  # type: ignore[override]
        if not isinstance(other, Instants):
            return NotImplemented
        return ~self.__eq__(other)

    def __lt__(self, other: Instants) -> BoolArray:
        return np.asarray(self.minus_exact(other)[0] < 0)

    def __ge__(self, other: Instants) -> BoolArray:
        return ~self.__lt__(other)

    def __gt__(self, other: Instants) -> BoolArray:
        return other.__lt__(self) if isinstance(other, Instants) else self.__lt__(other)

    def __le__(self, other: Instants) -> BoolArray:
        return ~self.__gt__(other)

    __hash__ = None  # type: ignore[assignment]

    def __repr__(self) -> str:
        flat = self.ravel()
        shown = flat if flat.size <= 4 else Instants.concatenate([flat[:2], flat[-1:]])
        try:
            label = labels.label(shown._scale, shown.pair)
            length = labels.day_length(shown._scale, None)
            texts = [str(text) for text in iso8601.format(*label, 12, day_length=length)]
        except TscaleError:  # a label outside the leap-second table: the count says as much
            texts = [f"{w}+{f!r}" for w, f in zip(shown.whole.tolist(), shown.fraction.tolist(), strict=True)]
        if flat.size > 4:
            texts.insert(2, "...")
        return f"<Instants {self.node} shape={self.shape} [{', '.join(texts)}]>"
