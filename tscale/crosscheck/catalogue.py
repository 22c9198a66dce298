"""The catalogue: every signature that a chain gives occasion for, and what each does at some instants."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np

from .. import exact
from ..constants import JULIAN_YEAR_S
from ..errors import TscaleError
from ..exact import FloatArray
from .clock_faces import face_signatures
from .coordinate_times import coordinate_time_signatures
from .front import Front, wavefront_step_number
from .ground import ground_signatures
from .path import Path
from .signature import Signature
from .sky import sky_signatures

__all__ = ["Columns", "catalogue", "columns"]


_SAME_S: Final = 1e-12
"""Below which a constant put in last is the same as on the way."""


class Columns(NamedTuple):
    """Signatures that do something at the instants at hand, as a design matrix."""

    signatures: tuple[Signature, ...]
    values: FloatArray
    """(instants, signatures): seconds for an amplitude of 1."""
    idle: tuple[str, ...]
    """Names of those that do nothing there."""
    unknown: tuple[tuple[str, str], ...]
    """Names of those that could not be evaluated, and why."""


def catalogue(path: Path) -> list[Signature]:
    """Every signature for a chain."""
    found = [*face_signatures(path), *coordinate_time_signatures(path)]
    found += [*(signature.last for signature in found if signature.constant), *_plain(path)]
    number = wavefront_step_number(path)
    if number is not None:
        front = Front(path, number)
        found += sky_signatures(path, number, front)
        if front.site is not None:
            found += ground_signatures(path, number, front)
        return found
    for number, step in enumerate(path.steps, start=1):
        names = {step.start.scale.name, step.end.scale.name}
        if step.start.place == "TOPOCENTER" and names & {"TCB", "TDB"} and names & {"TT", "TCG"}:
            found += ground_signatures(path, number, None)
            break
    return found


def _plain(path: Path) -> list[Signature]:
    """An offset and a drift, so that nothing with a name is taken for them."""
    start, last = path.t[0], len(path.steps)
    return [
        Signature(
            "an offset", "constant", lambda a, b: np.ones(b.shape), last, None, unit="s", at_node=True, named=False
        ),
        Signature(
            "a drift",
            "from the first date on",
            lambda a, b: exact.seconds(exact.subtract(b.pair, start.pair)) / JULIAN_YEAR_S,
            last,
            None,
            unit="s/yr",
            at_node=True,
            named=False,
        ),
    ]


def columns(path: Path, signatures: Sequence[Signature], least_s: float) -> Columns:
    """Evaluate signatures; one that reaches `least_s` nowhere says nothing and is set aside.

    One that is put in last is left out where that makes no difference.
    """
    kept, values, idle, unknown = [], [], [], []
    for signature in signatures:
        try:
            value = path.column(signature)
        except TscaleError as error:
            unknown.append((signature.name, str(error)))
            continue
        biggest = max(map(abs, signature.allowed)) if signature.allowed else 1.0
        if signature.last_of and float(np.max(np.abs(value * (path.gain(signature.station) - 1.0)))) <= _SAME_S:
            continue
        if float(np.max(np.abs(value), initial=0.0)) * biggest <= least_s:
            idle.append(signature.name)
            continue
        kept.append(signature)
        values.append(value)
    matrix = np.stack(values, axis=-1) if values else np.zeros((*path.t.shape, 0))
    return Columns(tuple(kept), matrix, tuple(idle), tuple(unknown))
