"""TT - TDB along a kernel: panels aligned with its records, integrated and pinned at one instant."""

from __future__ import annotations

import contextlib
import math
from collections.abc import Callable, Iterator
from typing import Final, NamedTuple

import numpy as np

from ..constants import L_B, L_G, T0_COUNT, TDB0_S
from ..errors import OutOfSpan
from ..exact import FloatArray, Pair
from .bodies import PLANETARY_BODIES, body_id, body_name
from .chebyshev import ChebyshevTable, date_text, span_text
from .coordinate_rate import coordinate_rate
from .integrator import Progress, integrate_panels
from .kernel import Ephemeris

__all__ = [
    "PANEL_S",
    "T0_TDB",
    "Pin",
    "integrate_tt_minus_tdb",
    "panels_of",
    "pin_at_t0",
    "progress_bar",
    "reaches_t0",
]

PANEL_S: Final = 4 * 86400.0
"""Longest panel, s: halving it moves the integral by less than 1e-4 ps over a century."""

T0_TDB: Final = (T0_COUNT[0], T0_COUNT[1] + TDB0_S)
"""T0 as a TDB count: TDB = T0 + TDB0 where TCB = T0."""

_L_G: Final = float(L_G)
_L_B: Final = float(L_B)
_L_B_MINUS_L_G: Final = float(L_B - L_G)


class Pin(NamedTuple):
    """An instant (TDB count) and TT - TDB there."""

    tdb: tuple[int, float]
    value_s: float


def integrate_tt_minus_tdb(
    ephemeris: Ephemeris,
    pin: Callable[[tuple[float, float]], Pin],
    progress: Progress | None = None,
    panel_s: float = PANEL_S,
) -> tuple[ChebyshevTable, Pin]:
    """Integrate d(TT - TDB)/dTDB at the geocentre over all of a kernel's span that whole panels fill.

    Parameters
    ----------
    ephemeris : Ephemeris
    pin : callable
        Given the span, chooses the instant at which the integral is pinned, and its value.
    progress : callable, optional
        Told the panels done and their total.
    panel_s : float
        Longest panel, s; the panel used is a whole part of the kernel's own records.

    Returns
    -------
    table : ChebyshevTable
        One component, s.
    pin : Pin
        As chosen.

    Notes
    -----
    TT - T0 = (1 - L_G)(TCG - T0) (IAU 2000 B1.9) and TDB - T0 = (1 - L_B)(TCB - T0) + TDB0 (IAU 2006 B3) give, with
    f = 1 - dTCG/dTCB, d(TT - TDB)/dTDB = [(L_B - L_G) - f (1 - L_G)]/(1 - L_B).
    """
    start_s, step_s, panels = panels_of(ephemeris, panel_s)
    chosen = pin((start_s, start_s + panels * step_s))

    def rate(tdb: Pair) -> FloatArray:
        slow = coordinate_rate(ephemeris, "earth", tdb)
        return (_L_B_MINUS_L_G - slow * (1.0 - _L_G)) / (1.0 - _L_B)

    records = integrate_panels(rate, start_s, step_s, panels, progress)
    name = f"time ephemeris of {ephemeris.name}"
    coefficients = records.coefficients[:, None, :]
    instant = (np.array(chosen.tdb[0]), np.array(chosen.tdb[1]))
    # Shifted once by the value at the pin, then by the rounding that is left there.
    for _ in range(2):
        at_pin = float(ChebyshevTable(start_s, step_s, coefficients, name).value(instant)[0])
        coefficients[:, 0, 0] += chosen.value_s - at_pin
    return ChebyshevTable(start_s, step_s, coefficients, name), chosen


def pin_at_t0(span: tuple[float, float]) -> Pin:
    """TT - TDB = -TDB0 where TCB = TCG = T0 (IAU 2006 Resolution B3).

    Raises
    ------
    OutOfSpan
        If the span does not reach T0.
    """
    count_s = T0_TDB[0] + T0_TDB[1]
    if not span[0] <= count_s <= span[1]:
        raise OutOfSpan(
            f"the kernel covers {span_text(span)} TDB and so does not reach T0, {date_text(count_s)}, where "
            "TT - TDB is defined: use a kernel that reaches it, or continue a time ephemeris that overlaps it, as "
            "TimeEphemeris.of(kernel, anchor=TimeEphemeris.of(Ephemeris.default()))"
        )
    return Pin(T0_TDB, -TDB0_S)


def reaches_t0(ephemeris: Ephemeris) -> bool:
    """Whether the whole panels of a kernel reach T0, where TT - TDB is defined."""
    start_s, step_s, panels = panels_of(ephemeris, PANEL_S)
    return start_s <= T0_TDB[0] + T0_TDB[1] <= start_s + panels * step_s


def panels_of(ephemeris: Ephemeris, panel_s: float, body: str | int = "earth") -> tuple[float, float, int]:
    """Start, length and number of the panels, edges on the record edges of the motion of the Earth or another body.

    Raises
    ------
    OutOfSpan
        For a kernel shorter than one panel.
    """
    span = ephemeris.span_of(PLANETARY_BODIES)
    grid_s, record_s = ephemeris.record_grid(body)
    step_s = record_s / math.ceil(record_s / panel_s)
    start_s = grid_s + step_s * math.ceil((span[0] - grid_s) / step_s)
    panels = math.floor((span[1] - start_s) / step_s)
    if panels < 1:
        raise OutOfSpan(
            f"{ephemeris.name} covers only {span_text(span)} TDB; a time ephemeris needs {step_s / 86400.0:g} days "
            f"within one record of the motion of {body_name(body_id(body))}: use a longer kernel"
        )
    return start_s, step_s, panels


@contextlib.contextmanager
def progress_bar(progress: Progress | bool | None) -> Iterator[Progress | None]:
    """Turn `True` into a progress bar; a callable or None passes through."""
    if progress is None or callable(progress):
        yield progress
        return
    if progress is False:
        yield None
        return
    from tqdm import tqdm

    with tqdm(desc="time ephemeris", unit="panel") as bar:

        def tell(done: int, total: int) -> None:
            bar.total = total
            bar.update(done - bar.n)

        yield tell
