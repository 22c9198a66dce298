"""Signatures of mistakes between TT, TCG, TCB and TDB: rates, epochs, constants, and the Einstein integral."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Final

import numpy as np

from .. import exact
from ..constants import JULIAN_YEAR_S, L_B, L_C, L_G, T0_COUNT, TDB0_S, TT_MINUS_TAI
from ..counts import tcb_from_tdb, tcg_from_tt, tdb_from_tcb, tt_from_tcg
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..transforms.barycentric import topocentric_terms
from .path import Path, is_onward
from .signature import Signature, bound

__all__ = ["coordinate_time_signatures", "periodic_terms_s", "seven_terms_s"]

_T0: Final = exact.normalise(*T0_COUNT)
_LATE_S: Final = TT_MINUS_TAI[0] + TT_MINUS_TAI[1]
_CENTURY_S: Final = 100.0 * JULIAN_YEAR_S
_ONE: Final = np.array([(0.001657, 628.3076, 6.2401)])
_SEVEN: Final = np.array(
    [
        (0.001657, 628.3076, 6.2401),
        (0.000022, 575.3385, 4.2970),
        (0.000014, 1256.6152, 6.1969),
        (0.000005, 606.9777, 4.0212),
        (0.000005, 52.9691, 0.4444),
        (0.000002, 21.3299, 5.5431),
    ]
)
_TCB_SCALES: Final = {
    "TDB": (tcb_from_tdb, "TCB"),
    "TCB": (tdb_from_tcb, "TDB"),
    "TT": (tcg_from_tt, "TCG"),
    "TCG": (tt_from_tcg, "TT"),
}
_RATES: Final = {"TDB": "L_B", "TCB": "L_B", "TT": "L_G", "TCG": "L_G"}


def coordinate_time_signatures(path: Path) -> Iterator[Signature]:
    """All that can go wrong between coordinate times along a chain."""
    steps = path.steps
    start, end = path.t.scale, path.chain.end.scale.name
    for name, station, words in ((start, 0, "at the start"), (end, len(steps), "in the result")):
        if name in _TCB_SCALES and (station or start != end):
            other = _TCB_SCALES[name][1]
            yield Signature(
                f"{other} in place of {name} {words} ({_RATES[name]})",
                f"the rate {_RATES[name]} left out or applied twice",
                _moved(name),
                station,
                (1.0, -1.0),
                at_node=True,
            )
    for number, step in enumerate(steps, start=1):
        names = {step.start.scale.name, step.end.scale.name}
        if ("TT" in names and names & {"TDB", "TCB"}) or names == {"TCG", "TCB"}:
            yield from _einstein(path, number)
        if number > 1 and names & {"TT"} and names & {"TDB", "TCB"} and is_onward(step):
            yield Signature(
                "TCG in place of TT on the way (L_G)",
                "the rate L_G left out or applied twice",
                _moved("TT"),
                number - 1,
                (1.0, -1.0),
                at_node=True,
            )
        if "TCB" in names:
            yield Signature(
                "mean rate of TCG against TCB (L_C) left out",
                "1.48e-8 (IERS Conventions 2010, Table 1.1)",
                lambda a, b: -L_C * _elapsed_s(b),
                number,
                (1.0, -1.0),
            )
        elif "TDB" in names and "TT" in names:
            yield Signature(
                "mean rate of TCG against TCB (L_C) left in",
                "TDB with the drift of TCB - TCG",
                lambda a, b: L_C * _elapsed_s(b),
                number,
                (1.0, -1.0),
            )
        yield from _epochs(number, names)


def _moved(name: str) -> Callable[[Instants, Instants], FloatArray]:
    convert: Callable[[Pair], Pair] = _TCB_SCALES[name][0]
    return lambda a, b: exact.seconds(exact.subtract(convert(b.pair), b.pair))


def _elapsed_s(t: Instants) -> FloatArray:
    return exact.seconds(exact.subtract(t.pair, _T0))


def _epochs(number: int, names: set[str]) -> Iterator[Signature]:
    """TDB0 and the epoch T0, in the steps that have them: from TT to TCG and TCB, and from TCB to TDB."""
    if "TDB" in names and names & {"TT", "TCB", "TCG"}:
        yield Signature(
            "TDB0 (65.5 us) left out",
            "the constant of IAU 2006 Resolution B3",
            lambda a, b: np.full(b.shape, -TDB0_S),
            number,
            (1.0, -1.0),
            constant=True,
        )
    if names == {"TT", "TCG"}:
        rate, label, sign = float(L_G), "L_G", 1.0
    elif names == {"TCB", "TDB"}:
        rate, label, sign = float(L_B), "L_B", -1.0
    elif names == {"TT", "TCB"}:
        rate, label, sign = float(L_B), "L_B", 1.0
    else:
        return
    late = sign * rate * _LATE_S
    yield Signature(
        "T0 without its 32.184 s",
        f"1977-01-01T00:00:00 of TT as the origin of the rate {label}",
        lambda a, b: np.full(b.shape, late),
        number,
        (1.0, -1.0),
        constant=True,
    )
    recent = sign * rate * (_T0[0] + float(_T0[1]))
    yield Signature(
        "J2000 in place of T0 (1977)",
        f"as the origin of the rate {label}",
        lambda a, b: np.full(b.shape, float(recent)),
        number,
        (1.0, -1.0),
        constant=True,
    )


def _einstein(path: Path, number: int) -> Iterator[Signature]:
    step, reference = path.steps[number - 1], path.chain.reference
    names = {step.start.scale.name, step.end.scale.name}
    site = path.chain._supplies.site if step.start.place == "TOPOCENTER" else None

    def topocentric_s(a: Instants, b: Instants) -> FloatArray:
        if site is None:
            return np.zeros(b.shape)
        tt = a.pair if a.scale == "TT" else tt_from_tcg(a.pair)
        tdb = b.pair if b.scale == "TDB" else tdb_from_tcb(b.pair)
        return topocentric_terms(reference.ephemeris, tdb, site.gcrs(tt, reference)[0]).total_s

    def geocentric_s(a: Instants, b: Instants) -> FloatArray:
        """TDB - TT of the model at the geocentre."""
        return -reference.time_ephemeris.tt_minus_tdb_s(b.pair if b.scale == "TDB" else tdb_from_tcb(b.pair))

    def short(a: Instants, b: Instants, terms: FloatArray, secular: float) -> FloatArray:
        return np.asarray(_series_s(b, terms, secular) - geocentric_s(a, b))

    if site is not None:
        yield Signature(
            "topocentric terms left out",
            "v.r/c^2, 2.1 us within the day (IAU 2000 B1.5)",
            lambda a, b: -topocentric_s(a, b),
            number,
        )
        yield Signature(
            "topocentric terms with the wrong sign",
            "v.r/c^2, 2.1 us within the day",
            lambda a, b: -2.0 * topocentric_s(a, b),
            number,
        )
    yield Signature(
        "Einstein integral (periodic terms) left out",
        f"{' and '.join(sorted(names))} without the 1.7 ms of the year",
        lambda a, b: -geocentric_s(a, b),
        number,
    )
    yield Signature(
        "Einstein integral (periodic terms) with the wrong sign",
        "3.3 ms through the year",
        lambda a, b: -2.0 * geocentric_s(a, b),
        number,
    )
    for words, terms, secular in (("one sine", _ONE, 0.0), ("seven terms", _SEVEN, 1e-5)):
        yield Signature(
            f"short series of {words} for the Einstein integral",
            "USNO Circular 179, eq. 2.6, cut to its first terms: 10 us and 40 us off at most",
            bound(short, terms, secular),
            number,
        )
    yield Signature(
        "analytic series of 787 terms for the Einstein integral",
        "Fairhead and Bretagnon 1990 as in ERFA's dtdb: 13 ns off at most since 1970",
        lambda a, b: periodic_terms_s(b) - geocentric_s(a, b),
        number,
    )
    yield Signature(
        "rate of another time ephemeris",
        "L_C is known to 2e-17 (IERS Conventions 2010, Table 1.1)",
        lambda a, b: 1e-17 * _elapsed_s(b),
        number,
        None,
        unit="1e-17",
        limit=100.0,
    )


def _series_s(t: Instants, terms: FloatArray, secular: float) -> FloatArray:
    century = (t.whole + t.fraction) / _CENTURY_S
    total = secular * century * np.sin(628.3076 * century + 4.2490)
    for amplitude, speed, phase in terms:
        total = total + amplitude * np.sin(speed * century + phase)
    return np.asarray(total)


def seven_terms_s(t: Instants) -> FloatArray:
    """TDB - TT at the geocentre by the short formula of USNO Circular 179, eq. 2.6, good to 10 us from 1600 to 2200."""
    return _series_s(t, _SEVEN, 1e-5)


def periodic_terms_s(t: Instants) -> FloatArray:
    """TDB - TT at the geocentre by ERFA's analytic series, for TDB or (within 1e-9 of it) TT and TCB dates."""
    import erfa

    pair = tdb_from_tcb(t.pair) if t.scale == "TCB" else t.pair
    return np.asarray(erfa.dtdb(2451545.0, (pair[0] + pair[1]) / 86400.0, 0.0, 0.0, 0.0, 0.0))
