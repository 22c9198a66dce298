"""Where a chain breaks: dates at which a table or a log goes over from one polynomial to the next, steps, or ends."""

from __future__ import annotations

from typing import Final, NamedTuple, TypeAlias

import numpy as np

from ..errors import TscaleError
from ..exact import FloatArray, IntArray, Pair
from .direct import Direct, moved
from .hints import Count, Hints, hints_inside

__all__ = ["Section", "accepts", "sections", "unexpected_jump"]

_REACH_S: Final = 2.0**-37
"""How far a jump may lie from where it is expected: 7 ps, many roundings of a date, and more than the 1 ps by which
the logs take dates beyond their ends."""

_APART_S: Final = 8.0 * _REACH_S
_LOOKS: Final = 64


class Section(NamedTuple):
    """A closed span of counts on which nothing breaks, other than gently."""

    first: Count
    last: Count


def sections(direct: Direct, first: Count, last: Count, jump_s: float) -> tuple[list[Section], tuple[Count, ...]]:
    """Cut a span at its breaks; what the chain refuses between two of them is left out.

    Parameters
    ----------
    direct : Direct
    first, last : (int, float)
        Ends of the span, both of which the chain accepts.
    jump_s : float
        Discontinuities below this are of no account.

    Returns
    -------
    sections : list of Section
    bends : tuple of (int, float)
        Where polynomials of tables meet that may be smooth enough to be taken for one.
    """
    hints = hints_inside(direct, first, last, _APART_S)
    ends, starts = _refined(direct, hints, jump_s)
    found: list[Section] = []
    bends: list[Count] = []
    open_at: Count | None = first
    for end, start, soft in zip(ends, starts, hints.gentle.tolist(), strict=True):
        if soft and end is not None and end == start:
            bends.append(end)
            continue
        if end is not None and open_at is not None and open_at < end:
            found.append(Section(open_at, end))
        open_at = start
    if open_at is not None and open_at < last:
        found.append(Section(open_at, last))
    return found, tuple(bends)


_Edges: TypeAlias = list[Count | None]


def _refined(direct: Direct, hints: Hints, jump_s: float) -> tuple[_Edges, _Edges]:
    """For each hint the last count of what comes before and the first of what comes after; None where nothing does.

    Both are the hint itself where the function goes on without a jump.
    """
    w, f = hints.at
    count = len(w)
    plain: list[Count] = list(zip(w.tolist(), f.tolist(), strict=True))
    if not count:
        return [], []
    reach = np.full(count, _REACH_S)
    shifts = np.stack([-3.0 * reach, -reach, hints.width_s + reach, hints.width_s + 3.0 * reach], axis=1)
    delta = direct.delta(moved((np.repeat(w, 4), np.repeat(f, 4)), shifts.reshape(-1)))
    base = delta.whole.reshape(count, 4)[:, 1]
    y = delta.less(np.repeat(base, 4)).reshape(count, 4)
    both = np.isfinite(y).all(axis=1)
    # A straight line through the two of each side, met in the middle.
    miss = np.abs((1.5 * y[:, 2] - 0.5 * y[:, 3]) - (1.5 * y[:, 1] - 0.5 * y[:, 0]))
    smooth = both & (np.where(both, miss, np.inf) <= jump_s)
    ends: _Edges = list(plain)
    starts: _Edges = list(plain)
    at = np.flatnonzero(~smooth)
    if at.size:
        here = w[at], f[at]
        left, right = y[at, 1], y[at, 2]
        low, high = shifts[at, 1], shifts[at, 2]
        before = _last_alike(direct, here, base[at], left, right, low, high, jump_s)
        after = _last_alike(direct, here, base[at], right, left, high, low, jump_s)
        for k, number in enumerate(at.tolist()):
            ends[number] = (int(before[0][k]), float(before[1][k])) if np.isfinite(left[k]) else None
            starts[number] = (int(after[0][k]), float(after[1][k])) if np.isfinite(right[k]) else None
    return ends, starts


def _last_alike(
    direct: Direct,
    at: Pair,
    base: IntArray,
    own: FloatArray,
    other: FloatArray,
    alike: FloatArray,
    unlike: FloatArray,
    jump_s: float,
) -> Pair:
    """The count nearest to the other side that still belongs to `own`'s, by bisection down to neighbouring floats."""
    # Nearer to its own side than to the other or, where there is none, near its own.
    limit = np.where(np.isfinite(other), 0.5 * np.abs(other - own), jump_s)
    while True:
        middle = 0.5 * (alike + unlike)
        close = (np.abs(alike - unlike) <= 2.0**-54) | (middle == alike) | (middle == unlike)
        if close.all():
            return moved(at, alike)
        value = direct.delta(moved(at, middle)).less(base)
        nearer = np.abs(value - own) < limit
        alike, unlike = np.where(nearer, middle, alike), np.where(nearer, unlike, middle)


def unexpected_jump(direct: Direct, first: Count, last: Count, jump_s: float) -> tuple[Count, Count] | None:
    """The counts on both sides of the largest jump within a span of a second or so, if it is larger than `jump_s`.

    Bodies that a line of sight enters or leaves make such jumps, which no table foretells.
    """
    length = (last[0] - first[0]) + (last[1] - first[1])
    x = np.linspace(0.0, length, _LOOKS)
    start = np.full(_LOOKS, first[0]), np.full(_LOOKS, first[1])
    delta = direct.delta(moved(start, x))
    y = delta.less(delta.whole[0])
    if not delta.valid.all():
        return None
    # By how much each step differs from the mean of those beside it.
    steps = np.diff(y)
    odd = np.abs(steps[1:-1] - 0.5 * (steps[:-2] + steps[2:]))
    k = int(np.argmax(odd)) + 1
    if odd[k - 1] <= 2.0 * jump_s:
        return None
    at = np.full(1, first[0]), np.full(1, first[1])
    base = delta.whole[:1]
    left, right = y[k : k + 1], y[k + 1 : k + 2]
    low, high = x[k : k + 1], x[k + 1 : k + 2]
    before = _last_alike(direct, at, base, left, right, low, high, jump_s)
    after = _last_alike(direct, at, base, right, left, high, low, jump_s)
    return (int(before[0][0]), float(before[1][0])), (int(after[0][0]), float(after[1][0]))


def accepts(direct: Direct, at: Count) -> None:
    """Let the chain map one count: it raises what it has to say against it."""
    try:
        direct((np.array([at[0]]), np.array([at[1]])))
    except TscaleError as error:
        error.args = (f"cannot compile {direct.chain}: {error.args[0]}", *error.args[1:])
        raise
