"""CompiledChain: a chain as certified polynomials, evaluated, kept in files and sent around without its tables."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError, InvalidInput, OutOfSpan
from ..exact import FloatArray, IntArray, Pair
from ..instants import Instants
from ..scales import Node
from ..storage import write_atomically
from .arguments import check_kind, check_out, checked_counts, checked_threads, overwritten
from .certificate import Certificate
from .container import from_bytes, to_bytes
from .piece_table import BLOCK, OutsidePieces, PieceTable, Scratch

__all__ = ["CompiledChain", "load_compiled"]

_SHARE: Final = 16 * BLOCK
"""Instants that a thread takes at a time, in blocks that are longer than those of one thread alone: between two
operations on a block the threads wait for each other."""

_THREAD_BLOCK: Final = 4 * BLOCK

_FEW: Final = 8
"""Instants up to which one after the other is quicker than arrays."""


class CompiledChain:
    """A chain over a span of dates as piecewise polynomials; made by `Chain.compile` or `load_compiled`.

    Call it to map instants, `inverse` to map them back. It holds no tables, reads no file, and is immutable: threads
    share it, processes receive it by pickle, with the same results to the last bit wherever an instant is evaluated,
    alone or among others.

    Attributes
    ----------
    start, end : Node
        Scale and place at both ends.
    certificate : Certificate
        How well it keeps to the chain it was made from, and which tables that read.

    Notes
    -----
    The error is that of the certificate, within its tolerance, and one rounding of the fraction (0.1 fs). Where the
    chain itself rounds by more (by femtoseconds at 1 au), results lie nearer to the chain's mean than its own
    single values do. Dates that the chain refuses inside the span (gaps of a log) are refused here.
    """

    def __init__(
        self, start: Node, end: Node, span: tuple[Pair, Pair], tables: tuple[PieceTable, PieceTable], facts: Certificate
    ) -> None:
        self.start, self.end = start, end
        self.certificate = facts
        self._span = span
        self._tables = tables
        for pair in span:
            for part in pair:
                part.flags.writeable = False

    # ---- mapping ---------------------------------------------------------------------------------

    def __call__(self, t: Instants, *, threads: int = 1) -> Instants:
        """Map instants of the start node to the end node; shape is kept, the place is stamped.

        Raises
        ------
        OutOfSpan
            For instants outside the span or in a gap of it, with the mask.
        ScaleMismatch
            For instants of another scale or place.
        """
        return self._mapped(t, 0, threads)

    def inverse(self, t: Instants, *, threads: int = 1) -> Instants:
        """Map instants of the end node back to the start node; errors as for a call."""
        return self._mapped(t, 1, threads)

    def rate(self, t: Instants) -> FloatArray:
        """d(out)/d(in) - 1 at instants of the start node, from the derivatives of the polynomials.

        `certificate.rate_error` tells how far it was found from the chain's own.
        """
        check_kind(t, self.start, self)
        found = self._tables[0].slope(t.whole.reshape(-1), t.fraction.reshape(-1)).reshape(t.shape)
        if np.isnan(found).any():
            raise self._outside(0, t.whole, t.fraction)
        return found

    def evaluate(
        self,
        whole: npt.ArrayLike,
        fraction: npt.ArrayLike,
        out: tuple[IntArray, FloatArray] | None = None,
        threads: int = 1,
    ) -> tuple[IntArray, FloatArray]:
        """Map counts as plain arrays: nothing is copied, and nothing but the result is made.

        Parameters
        ----------
        whole : int64 array
            Whole seconds since 2000-01-01T12:00:00 of the start scale.
        fraction : float64 array
            Fractions in [0, 1), in a shape that broadcasts with that of `whole`.
        out : (int64 array, float64 array), optional
            Contiguous arrays of the shape of the result to write into; they may be the input itself. After an
            error part of them may be written.
        threads : int
            Threads to use; results are the same for any number.

        Returns
        -------
        whole, fraction : int64 array, float64 array
            Counts of the end scale, normalised.

        Raises
        ------
        OutOfSpan
            For instants outside the span or in a gap, with the mask.
        InvalidInput
            Fractions outside [0, 1) or NaN, and arrays of the wrong kind or shape.
        """
        return self._evaluated(0, whole, fraction, out, threads)

    def evaluate_inverse(
        self,
        whole: npt.ArrayLike,
        fraction: npt.ArrayLike,
        out: tuple[IntArray, FloatArray] | None = None,
        threads: int = 1,
    ) -> tuple[IntArray, FloatArray]:
        """Map counts of the end scale back; as `evaluate`."""
        return self._evaluated(1, whole, fraction, out, threads)

    def _mapped(self, t: Instants, way: int, threads: int) -> Instants:
        first, last = (self.start, self.end) if way == 0 else (self.end, self.start)
        check_kind(t, first, self)
        place = last.place or t.place
        if t.ndim == 0:
            try:
                pair = self._tables[way].one(int(t.whole), float(t.fraction))
            except OutsidePieces:
                raise self._outside(way, t.whole, t.fraction) from None
            return _adopted(np.array(pair[0], dtype=np.int64), np.array(pair[1]), last, place)
        return _adopted(*self._evaluated(way, t.whole, t.fraction, None, threads), last, place)

    def _evaluated(
        self, way: int, whole: Any, fraction: Any, out: tuple[IntArray, FloatArray] | None, threads: int
    ) -> tuple[IntArray, FloatArray]:
        w, f = checked_counts(whole, fraction)
        if out is None:
            out = np.empty(w.shape, dtype=np.int64), np.empty(w.shape)
        else:
            check_out(out, w.shape)
        count = checked_threads(threads)
        flat = w.reshape(-1), f.reshape(-1)
        flat_out = out[0].reshape(-1), out[1].reshape(-1)
        try:
            if w.size <= _FEW and _one_by_one(self._tables[way], flat, flat_out):
                return out
            if overwritten((w, f), out):
                flat = flat[0].copy(), flat[1].copy()
            _in_shares(self._tables[way], flat, flat_out, count)
        except OutsidePieces:
            raise self._outside(way, w, f) from None
        except InvalidInput:
            bad = ~((f >= 0.0) & (f < 1.0))
            raise InvalidInput(
                f"{int(np.count_nonzero(bad))} of {bad.size} fractions are not in [0, 1): normalise the pairs first, "
                "as Instants do (see .mask)",
                mask=np.asarray(bad),
            ) from None
        return out

    def _outside(self, way: int, whole: Any, fraction: Any) -> OutOfSpan:
        w, f = np.broadcast_arrays(np.asarray(whole), np.asarray(fraction))
        inside = self._tables[way].inside(w.reshape(-1), f.reshape(-1)).reshape(w.shape)
        first, last = self.certificate.span
        where = f"{first} to {last} {self.certificate.chain.split(' -> ')[0]}"
        if way == 1:
            where = f"what {where} is mapped to"
        return OutOfSpan(
            f"{int(np.count_nonzero(~inside))} of {inside.size} instants are outside the span of this compiled chain, "
            f"{where}, or in a gap of it; compile the chain for a span that covers them (see .mask)",
            mask=np.asarray(~inside),
        )

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def span(self) -> Instants:
        """First and last instant at the start node."""
        return _ends(self._span[0], self.start)

    @property
    def inverse_span(self) -> Instants:
        """First and last instant at the end node."""
        return _ends(self._span[1], self.end)

    @property
    def notes(self) -> tuple[str, ...]:
        """What a reader should know of the results: values predicted, held, or past a table's expiry, and gaps."""
        return self.certificate.notes

    def __str__(self) -> str:
        return self.certificate.chain

    def __repr__(self) -> str:
        first, last = self.certificate.span
        return f"<CompiledChain {self}, {first} to {last}, to {self.certificate.tolerance_s:.3g} s>"

    # ---- files -----------------------------------------------------------------------------------

    def save(self, path: str | Path) -> None:
        """Write a file that `load_compiled` reads with numpy alone, whole or not at all.

        A zip archive of numpy arrays and a header in JSON, with the SHA-256 of all of it as its comment; equal inputs
        give equal bytes.

        Raises
        ------
        DataFileError
            Where the file cannot be written.
        """
        target = Path(path).expanduser()
        try:
            write_atomically(target, self.to_bytes())
        except OSError as error:
            raise DataFileError(f"cannot write {target}: {error.strerror or error}", path=target) from error

    def to_bytes(self) -> bytes:
        """The bytes of the file."""
        return to_bytes(self.start, self.end, self._span, self._tables, self.certificate)

    def __reduce__(self) -> tuple[Any, ...]:
        return CompiledChain, (self.start, self.end, self._span, self._tables, self.certificate)


def load_compiled(path: str | Path) -> CompiledChain:
    """Read what `CompiledChain.save` wrote; needs numpy alone: no kernel, no tables.

    Raises
    ------
    DataFileError
        For a file that is missing, damaged, of another kind, or of a newer version.
    """
    source = Path(path).expanduser()
    try:
        content = source.read_bytes()
    except OSError as error:
        raise DataFileError(f"cannot read {source}: {error.strerror or error}", path=source) from error
    return CompiledChain(*from_bytes(content, source))


# ---- inside ----------------------------------------------------------------------------------------


def _one_by_one(table: PieceTable, given: Pair, out: Pair) -> bool:
    """Evaluate few instants without the cost of arrays; not those with fractions outside [0, 1)."""
    found = []
    for whole, fraction in zip(given[0].tolist(), given[1].tolist(), strict=True):
        if not 0.0 <= fraction < 1.0:
            return False
        found.append(table.one(whole, fraction))
    for number, (whole, fraction) in enumerate(found):
        out[0][number], out[1][number] = whole, fraction
    return True


def _in_shares(table: PieceTable, given: Pair, out: Pair, threads: int) -> None:
    size = len(given[0])

    def work(start: int) -> None:
        part = slice(start, start + _SHARE)
        w = given[0][part]
        table.map(w, given[1][part], (out[0][part], out[1][part]), Scratch(min(len(w), _THREAD_BLOCK)))

    if threads == 1 or size <= _SHARE:
        table.map(*given, out, Scratch(min(size, BLOCK)))
        return
    with ThreadPoolExecutor(threads) as pool:
        jobs: list[Callable[[], object]] = [pool.submit(work, start).result for start in range(0, size, _SHARE)]
        try:
            for job in jobs:
                job()
        except BaseException:
            pool.shutdown(wait=True, cancel_futures=True)
            raise


def _adopted(whole: IntArray, fraction: FloatArray, node: Node, place: str | None) -> Instants:
    """Instants of arrays that are known to be good and that nobody else holds: without a copy."""
    whole.flags.writeable = False
    fraction.flags.writeable = False
    made = Instants.__new__(Instants)
    for name, value in (("_whole", whole), ("_fraction", fraction), ("_scale", node.scale), ("_place", place)):
        object.__setattr__(made, name, value)
    return made


def _ends(span: Pair, node: Node) -> Instants:
    return Instants._of(span, node.scale, node.place)
