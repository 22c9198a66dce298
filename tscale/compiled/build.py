"""Compiling: find where a chain breaks, fit it between, cut the fits into pieces, and check them against the chain."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..errors import InvalidInput, NotConverged, gathered_extrapolations
from ..exact import Pair
from ..instants import Instants
from ..scales import Node
from .arguments import check_kind
from .breaks import Section, accepts, sections
from .certificate import Certificate, Check, TableUsed
from .checks import check_pieces, draws_for
from .compiled_chain import CompiledChain
from .direct import Direct
from .fits import SIZES_S, Fitter
from .hints import Count, needs_ephemeris
from .piece_table import PieceTable
from .pieces import pieces_of_fits

if TYPE_CHECKING:
    from ..chains import Chain

__all__ = ["compile_chain"]

_LEAST_TOLERANCE_S: Final = 1e-15
_MOST_TOLERANCE_S: Final = 1.0
_HALF_DAY_S: Final = 43200
_NOISE_SITES: Final = 24
_ROUNDS: Final = len(SIZES_S)
_PATIENCE: Final = 3
_LOOKS: Final = 1000
_RATES: Final = 256

_Way = tuple[PieceTable, Check, list[Section]]


def compile_chain(
    chain: Chain, start: str | Instants, stop: str | Instants, *, tolerance_s: float = 1e-13
) -> CompiledChain:
    """Turn a chain into certified polynomials between two dates, in both directions.

    Parameters
    ----------
    chain : Chain
    start, stop : str or Instants
        First and last date, on the chain's start scale (ISO 8601 texts, or single instants).
    tolerance_s : float
        Largest error allowed, s; 1e-15 or more. Where the chain's own rounding (some fs at 1 au) is not small beside
        it, what counts is the mean of several values of the chain within seconds.

    Returns
    -------
    CompiledChain

    Raises
    ------
    NotConverged
        Where the tolerance cannot be shown to be kept; says where, or what the chain's own rounding is.
    OutOfSpan
        For a date in the span that the chain refuses. Gaps and steps of clock logs inside the span become gaps of
        the compiled chain.
    InvalidInput
        For dates in the wrong order or a tolerance out of range.

    Notes
    -----
    What is extrapolated on the way (held Earth orientation, an expired leap-second table) is said once, as a warning,
    and kept in `notes`.
    """
    tolerance = _checked_tolerance(tolerance_s)
    with gathered_extrapolations(repeats=True):
        first, last = (_date(chain, name, given) for name, given in (("start", start), ("stop", stop)))
        if not _before(first, last):
            raise InvalidInput(f"stop must be after start, got {start!r} and {stop!r}")
        onward, back = Direct(chain, onward=True), Direct(chain, onward=False)
        for end in (first, last):
            accepts(onward, end)
        span = _joined(first, last)
        forward = _way(onward, span, tolerance)
        inverse_span = onward(span)
        inverse = _way(back, inverse_span, tolerance)
        facts = _certificate(chain, span, tolerance, forward, inverse)
    return CompiledChain(chain.start, chain.end, (span, inverse_span), (forward[0], inverse[0]), facts)


def _way(direct: Direct, span: Pair, tolerance_s: float) -> _Way:
    """Compile one direction."""
    first, last = ((int(span[0][k]), float(span[1][k])) for k in (0, 1))
    noise_s = _noise_s(direct, first, last)
    if draws_for(noise_s, tolerance_s) is None:
        raise NotConverged(
            f"{direct.start} -> {direct.end} cannot be certified to {tolerance_s:.3g} s: the chain itself rounds by "
            f"{noise_s:.2g} s rms; ask for tolerance_s={4.0 * noise_s:.1g} or more"
        )
    found, bends = sections(direct, first, last, max(tolerance_s / 4.0, 12.0 * noise_s))
    origin = _grid_origin((*(section.first for section in found[1:]), *bends), first)
    fitter = Fitter(direct, bends, origin, tolerance_s, noise_s)
    fits = fitter.fit(found)
    # All dates that bound what one polynomial of the chain may be: breaks, bends and ends.
    marks = sorted({*bends, *(end for section in found for end in section)})
    errors: list[float] = []
    for _ in range(_ROUNDS):
        table, parents = pieces_of_fits(fits, origin, tolerance_s)
        check, bad = check_pieces(direct, table, noise_s, tolerance_s, marks)
        if not bad.size:
            return table, check, found
        errors.append(check.max_error_s)
        if len(errors) > _PATIENCE and errors[-1] > 0.7 * errors[-1 - _PATIENCE]:
            break  # shorter intervals do not help: what is left is rounding
        missed = np.zeros(len(fits.size), dtype=np.bool_)
        missed[parents[bad]] = True
        fits = fitter.again(fits, missed)
    raise NotConverged(
        f"{direct.start} -> {direct.end} cannot be certified to {tolerance_s:.3g} s: it is off by "
        f"{check.max_error_s:.3g} s at {check.at[0]} + {check.at[1]:.9f} s of {direct.start.scale} (since "
        "2000-01-01T12:00:00); ask for a larger tolerance_s"
    )


def _grid_origin(breaks: tuple[Count, ...], first: Count) -> int:
    """A whole count from which grids start: so that most breaks at whole seconds are edges of a grid of half days."""
    whole = [count[0] for count in breaks if count[1] == 0.0]
    if not whole:
        return first[0]
    phases, counts = np.unique(np.array(whole) % _HALF_DAY_S, return_counts=True)
    return int(phases[np.argmax(counts)])


def _noise_s(direct: Direct, first: Count, last: Count) -> float:
    (aw, af), (bw, bf) = first, last
    length = (bw - aw) + (bf - af)
    rng = np.random.default_rng(_NOISE_SITES)
    x = af + length * rng.uniform(0.01, 0.99, _NOISE_SITES)
    whole = np.floor(x)
    found = direct.noise_s((aw + whole.astype(np.int64), x - whole))
    # A date beside a break scatters about no parabola; the median of the upper half is not moved by a few of those.
    return float(np.quantile(found, 0.75)) * 1.05 if found.size else 0.0


# ---- arguments -------------------------------------------------------------------------------------


def _checked_tolerance(tolerance_s: Any) -> float:
    try:
        value = float(tolerance_s)
    except (TypeError, ValueError):
        value = math.nan
    if not _LEAST_TOLERANCE_S <= value <= _MOST_TOLERANCE_S:
        raise InvalidInput(
            f"tolerance_s is a number of seconds from {_LEAST_TOLERANCE_S:g} (a few roundings of a fraction) to "
            f"{_MOST_TOLERANCE_S:g}, got {tolerance_s!r}"
        )
    return value


def _date(chain: Chain, name: str, given: Any) -> Count:
    node: Node = chain.start
    if isinstance(given, str):
        given = Instants.from_iso(given, node.scale.name, leap_seconds=chain.reference.leap_seconds)
    if not isinstance(given, Instants) or given.size != 1:
        raise InvalidInput(f"{name} is one date, as ISO 8601 text or Instants of {node}; got {given!r}")
    check_kind(given, node, chain)
    one = given.reshape(1)[0]
    return int(one.whole), float(one.fraction)


def _before(first: Count, last: Count) -> bool:
    return (last[0] - first[0]) + (last[1] - first[1]) > 1e-6


def _joined(first: Count, last: Count) -> Pair:
    return np.array([first[0], last[0]], dtype=np.int64), np.array([first[1], last[1]])


# ---- certificate -----------------------------------------------------------------------------------


def _certificate(chain: Chain, span: Pair, tolerance_s: float, forward: _Way, inverse: _Way) -> Certificate:
    from .. import __version__

    supplies: Any = chain._supplies
    table = forward[0]
    start = chain.start.scale
    ends = Instants._of(span, start).to_iso(9, leap_seconds=chain.reference.leap_seconds)
    looks = _regular(span, _LOOKS)
    inside = table.inside(*looks)
    t = Instants._of((looks[0][inside], looks[1][inside]), start, chain.start.place)
    notes = [f"at {t.size} regular dates of the span: {note}" for note in chain.notes(t)]
    holes = len(forward[2]) - 1 - _touching(forward[2])
    if holes:
        notes.append(f"{holes} gaps inside the span, in which the chain has no answer")
    some = t[:: max(1, t.size // _RATES)]
    slope = table.slope(some.whole, some.fraction)
    return Certificate(
        chain=str(chain),
        site=None if supplies.site is None else str(supplies.site.name),
        source=None if supplies.source is None else repr(supplies.source),
        span=(str(ends[0]), str(ends[1])),
        tolerance_s=tolerance_s,
        forward=forward[1],
        inverse=inverse[1],
        rate_error=float(np.max(np.abs(slope - chain.rate(some)), initial=0.0)),
        tables=tuple(_tables_used(chain)),
        notes=tuple(notes),
        version=__version__,
    )


def _touching(found: list[Section]) -> int:
    return sum(abs((b.first[0] - a.last[0]) + (b.first[1] - a.last[1])) < 1e-15 for a, b in pairwise(found))


def _regular(span: Pair, count: int) -> Pair:
    length = (span[0][1] - span[0][0]) + (span[1][1] - span[1][0])
    x = span[1][0] + length * (np.arange(count) + 0.5) / count
    whole = np.floor(x)
    return span[0][0] + whole.astype(np.int64), x - whole


def _tables_used(chain: Chain) -> list[TableUsed]:
    tables, supplies = chain.reference, chain._supplies
    site: Any = supplies.site
    nodes = [chain.start, *(step.end for step in chain.steps)]
    scales = {node.scale.name for node in nodes}
    found = [
        TableUsed(f"clock log {log.scale}", log.name, log.sha256) for log in supplies.clocks if log.scale in scales
    ]
    if any(node.scale.utc_labels for node in nodes):
        found.append(TableUsed("leap seconds", tables.leap_seconds.name, tables.leap_seconds.sha256))
    dated = needs_ephemeris(chain.steps)
    if "UT1" in scales or (dated and site is not None and getattr(site, "uses_earth_orientation", True)):
        found.append(TableUsed("Earth orientation", tables.earth_orientation.name, tables.earth_orientation.sha256))
    found += [TableUsed(table.scale, table.name, table.sha256) for table in tables.tt_bipm if table.scale in scales]
    if dated:
        found.append(TableUsed("ephemeris", tables.ephemeris.name, tables.ephemeris.sha256))
        found.append(TableUsed("time ephemeris", tables.time_ephemeris.name, tables.time_ephemeris.sha256))
    return found
