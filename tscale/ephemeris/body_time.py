"""A body's own coordinate time (TCL for the Moon) at its centre, integrated from the planetary ephemeris itself."""

from __future__ import annotations

import math
from fractions import Fraction
from functools import lru_cache
from typing import Any, Final

import numpy as np

from .. import exact
from ..constants import L_B, T0_COUNT, TDB0_S
from ..errors import InvalidInput, OutOfSpan
from ..exact import Factor, FloatArray, Pair
from .bodies import PLANETARY_BODIES, body_id, body_name
from .body_time_file import Integrated, kept
from .chebyshev import ChebyshevTable, broadcast_pair, date_text, span_text
from .coordinate_rate import coordinate_rate
from .integrator import Progress, integrate_panels
from .kernel import Ephemeris
from .time_integral import PANEL_S, T0_TDB, panels_of, progress_bar, reaches_t0

__all__ = ["BodyTimeEphemeris"]

_TCB_GAIN: Final = L_B / (1 - L_B)
_SAMPLES: Final = 512
_KEPT_PANELS: Final = 30_000
"""From this number of panels on (three centuries) an integral is kept on disk: a shorter one takes less time than to
look it up by the SHA-256 of its kernel."""
_PLANET_ONLY: Final = {199: 1, 299: 2, 499: 4}
"""Planets that stay within 0.5 m of the centre of mass of their system, which planetary kernels hold."""


class BodyTimeEphemeris:
    """Coordinate time T of a body's own reference system at its centre, as a function of TDB: immutable.

    T of the Earth is TCG (IAU 2000 Resolution B1.5), that of the Moon TCL (IAU 2024 Resolution II), that of any other
    body is formed the same way. The origin chosen here is that of TCG and TCB (IAU 1991 Resolution A4): **at the
    body's centre T reads T0 = 1977-01-01T00:00:32.184 at the event at which TCB reads T0** (and TDB reads
    T0 - 65.5 us). Another origin shifts T by a constant.

    T at the centre is kept as

        T - T0 = (1 + k)(TDB - T0 - TDB0) + P(TDB),    P(T0 + TDB0) = 0,

    with k a rational constant near the mean rate over the kernel and P a piecewise Chebyshev polynomial of
    milliseconds, so that no date loses its last bit to a drift of seconds. The panels converge: halving
    them moves P by less than 1e-15 s. Build one with `of`.

    Attributes
    ----------
    body : int
        NAIF number. A planet with moons is its system: its own potential and that of its moons are left out.
    name : str
        What it was built from.
    gain : fractions.Fraction
        k.
    anchor : str or None
        Name of the one that was continued, for a kernel that does not reach T0.
    """

    body: int
    name: str
    gain: Fraction
    anchor: str | None
    _ephemeris: Ephemeris
    _table: ChebyshevTable
    _forward: Factor
    _backward: Factor

    def __init__(self, ephemeris: Ephemeris, body: int, gain: Fraction, table: ChebyshevTable, anchor: str | None):
        values = {"body": body, "gain": gain, "anchor": anchor, "name": table.name}
        values |= {"_ephemeris": ephemeris, "_table": table}
        values |= {"_forward": Factor.of(gain), "_backward": Factor.of(-gain / (1 + gain))}
        for attribute, value in values.items():
            object.__setattr__(self, attribute, value)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"a BodyTimeEphemeris is immutable; cannot set {name!r}. Make another one with of")

    def __reduce__(self) -> tuple[Any, ...]:
        return BodyTimeEphemeris, (self._ephemeris, self.body, self.gain, self._table, self.anchor)

    def __repr__(self) -> str:
        return f"BodyTimeEphemeris({self.name!r}, {span_text(self.span)} TDB)"

    @classmethod
    def of(
        cls,
        ephemeris: Ephemeris,
        body: str | int,
        *,
        progress: Progress | bool | None = None,
    ) -> BodyTimeEphemeris:
        """Integrate the coordinate time of a body along a kernel, or take the one this process has made already.

        A century takes about 0.3 s (0.6 s for the Moon). What takes longer than some seconds is kept in the cache
        folder, as the time ephemeris is. A kernel that does not reach T0 continues the one of the shipped ephemeris
        where both overlap: two planetary ephemerides differ there by nanoseconds at most.

        Parameters
        ----------
        ephemeris : Ephemeris
            Must hold the Sun, the planets, the Earth, the Moon and Pluto.
        body : str or int
            Name or NAIF number: the Sun, a planet (or its system), the Earth, the Moon or Pluto's system.
        progress : bool or callable, optional
            True shows a progress bar while integrating; a callable is told the panels done and their total.

        Raises
        ------
        InvalidInput
            For something that is no Ephemeris, and for a body that has no coordinate time here.
        OutOfSpan
            For a kernel that neither reaches T0 nor overlaps the shipped one.
        MissingPiece
            For a kernel that lacks one of the bodies.

        Warns
        -----
        UserWarning
            If a damaged cache file was replaced, or the cache folder cannot be used.
        """
        if not isinstance(ephemeris, Ephemeris):
            raise InvalidInput(
                f"a coordinate time is integrated along an Ephemeris, got {ephemeris!r:.80}: use Ephemeris.open(path), "
                "or ReferenceData.ephemeris"
            )
        number = cls.number(body)
        if progress is None:
            return _made(ephemeris, number)
        return _found(ephemeris, number, progress)

    @staticmethod
    def number(body: str | int) -> int:
        """NAIF number of the body under which a coordinate time is kept: Mars (499) is its system (4).

        Raises
        ------
        InvalidInput
            For a body that has none.
        """
        number = body_id(body)
        number = _PLANET_ONLY.get(number, number)
        if number not in PLANETARY_BODIES:
            raise InvalidInput(
                f"no coordinate time for {body_name(number)}: allowed are "
                f"{', '.join(body_name(b) for b in PLANETARY_BODIES)}"
            )
        return number

    @property
    def _parts(self) -> Integrated:
        return Integrated(self.gain, self._table, self.anchor)

    @property
    def span(self) -> tuple[float, float]:
        """First and last TDB count covered, s."""
        return self._table.span

    def from_tdb(self, tdb: Pair) -> Pair:
        """Count of T at the body's centre when TDB reads `tdb`.

        Parameters
        ----------
        tdb : (int64 array, float64 array)
            TDB counts, any shape.

        Returns
        -------
        Pair
            Seconds since T read 2000-01-01T12:00:00, rounded to 0.1 fs.

        Raises
        ------
        OutOfSpan
            For dates outside `span`; the mask marks them.
        """
        tdb = broadcast_pair(tdb)
        periodic = self._table.value(tdb)[..., 0]
        return exact.add_seconds(exact.affine(tdb, _T0_TDB, self._forward, -TDB0_S), periodic)

    def to_tdb(self, count: Pair) -> Pair:
        """TDB count when T at the body's centre reads `count`; the inverse of `from_tdb` to 0.3 fs.

        One Newton step from the linear part leaves P'' P^2 / 2, below 1e-20 s.
        """
        near = exact.affine(broadcast_pair(count), _T0, self._backward, TDB0_S)
        value, rate = self._table.value_and_rate(near)
        return exact.add_seconds(near, -value[..., 0] / (1.0 + float(self.gain) + rate[..., 0]))

    def minus_tdb_s(self, tdb: Pair) -> FloatArray:
        """T - TDB at the body's centre, s: one float64, so seconds of drift are good to 0.4 fs; see `from_tdb`."""
        tdb = broadcast_pair(tdb)
        return exact.seconds(exact.subtract(self.from_tdb(tdb), exact.normalise(*tdb)))

    def rate(self, tdb: Pair) -> FloatArray:
        """dT/dTDB - 1 at the body's centre; see `from_tdb`."""
        rate: FloatArray = self._table.value_and_rate(broadcast_pair(tdb))[1][..., 0]
        return rate + float(self.gain)


_T0: Final = (np.asarray(T0_COUNT[0]), np.asarray(T0_COUNT[1]))
_T0_TDB: Final = (np.asarray(T0_TDB[0]), np.asarray(T0_TDB[1]))


@lru_cache(maxsize=32)
def _made(ephemeris: Ephemeris, body: int) -> BodyTimeEphemeris:
    return _found(ephemeris, body, None)


def _found(ephemeris: Ephemeris, body: int, progress: Progress | bool | None) -> BodyTimeEphemeris:
    """Integrate, or take from the cache folder what is long enough to be kept there."""
    _, _, panels = panels_of(ephemeris, PANEL_S, body)
    if panels < _KEPT_PANELS:
        return _integrated(ephemeris, body, progress)
    anchor = "" if reaches_t0(ephemeris) else Ephemeris.default().sha256
    return BodyTimeEphemeris(
        ephemeris, body, *kept(ephemeris, body, anchor, lambda: _integrated(ephemeris, body, progress)._parts)
    )


def _integrated(
    ephemeris: Ephemeris, body: int, progress: Progress | bool | None, panel_s: float = PANEL_S
) -> BodyTimeEphemeris:
    """Integrate anew.

    With f = 1 - dT/dTCB of `coordinate_rate` and TDB - T0 - TDB0 = (1 - L_B)(TCB - T0) (IAU 2006 B3),
    dT/dTDB - 1 = (L_B - f)/(1 - L_B). The mean m of f/(1 - L_B) is taken out as a float64 and k = L_B/(1 - L_B) - m
    formed exactly, so that what is integrated, m - f/(1 - L_B), carries no rounded constant: one of 1e-8 would be 5 fs
    in a century.
    """
    panel_s = panel_s / 2.0 if body == 301 else panel_s  # for the Moon's own monthly terms
    start_s, step_s, panels = panels_of(ephemeris, panel_s, body)
    span = (start_s, start_s + panels * step_s)
    anchor = None if span[0] <= T0_TDB[0] + T0_TDB[1] <= span[1] else _shipped(ephemeris, body, span)
    if anchor is None:
        whole = np.linspace(math.ceil(span[0]), math.floor(span[1]), _SAMPLES).astype(np.int64)
        # Any constant near the mean serves; ten digits are the same on every machine.
        mean = float(f"{np.mean(coordinate_rate(ephemeris, body, (whole, np.zeros(_SAMPLES)))):.9e}")
        gain = _TCB_GAIN - Fraction(mean)
        pin, value_s = _T0_TDB, 0.0
    else:
        gain, mean = anchor.gain, float(_TCB_GAIN - anchor.gain)
        first, last = max(span[0], anchor.span[0]), min(span[1], anchor.span[1])
        pin = (np.asarray(round((first + last) / 2)), np.asarray(0.0))
        value_s = float(anchor._table.value(pin)[0])

    def rate(tdb: Pair) -> FloatArray:
        slow = coordinate_rate(ephemeris, body, tdb)
        return np.asarray((mean - slow) - slow * float(_TCB_GAIN))

    with progress_bar(progress) as tell:
        records = integrate_panels(rate, start_s, step_s, panels, tell)
    name = f"coordinate time of {body_name(body)} along {ephemeris.name}"
    if anchor is not None:
        name += f", anchored to that of {anchor._ephemeris.name}"
    coefficients = records.coefficients[:, None, :]
    # Shifted once by the value at the pin, then by the rounding that is left there.
    for _ in range(2):
        coefficients[:, 0, 0] += value_s - float(ChebyshevTable(start_s, step_s, coefficients, name).value(pin)[0])
    table = ChebyshevTable(start_s, step_s, coefficients, name)
    return BodyTimeEphemeris(ephemeris, body, gain, table, None if anchor is None else anchor.name)


def _shipped(ephemeris: Ephemeris, body: int, span: tuple[float, float]) -> BodyTimeEphemeris:
    """The one along the shipped kernel, to be continued where both overlap."""
    shipped = _made(Ephemeris.default(), body)
    if max(span[0], shipped.span[0]) + 2.0 < min(span[1], shipped.span[1]):
        return shipped
    raise OutOfSpan(
        f"{ephemeris.name} covers {span_text(span)} TDB: it reaches neither T0, {date_text(T0_TDB[0])}, where the "
        f"coordinate time of {body_name(body)} is set, nor the shipped kernel, {span_text(shipped.span)}: use a kernel "
        "that does",
        path=ephemeris.path,
    )
