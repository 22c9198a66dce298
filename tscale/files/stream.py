"""Dates by the million: streams of blocks through a chain, in order, in bounded memory, on several threads."""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from hashlib import sha256
from typing import Any, Protocol, TypeAlias, runtime_checkable

from ..errors import InvalidInput
from ..exact import Pair
from ..instants import Instants
from ..provenance import provenance_of
from ..scales import Node

__all__ = ["Evaluator", "Mapping", "evaluator", "in_order", "map_blocks", "mapping_digest"]

Evaluator: TypeAlias = Callable[[Pair], Pair]


@runtime_checkable
class Mapping(Protocol):
    """A chain, direct or compiled: from instants at one node to instants at another."""

    @property
    def start(self) -> Node:
        """Scale and place of what goes in."""
        ...

    @property
    def end(self) -> Node:
        """Scale and place of what comes out."""
        ...

    def __call__(self, t: Instants) -> Instants:
        """Map instants."""
        ...


def evaluator(mapping: Mapping) -> Evaluator:
    """The mapping as a function of counts: without the making of Instants where it is compiled."""
    if not isinstance(mapping, Mapping):
        raise InvalidInput(f"a stream needs a Chain or a compiled one, got {type(mapping).__name__}")
    evaluate: Any = getattr(mapping, "evaluate", None)
    if evaluate is not None:
        return lambda pair: evaluate(*pair)
    scale, place = mapping.start.scale, mapping.start.place
    return lambda pair: mapping(Instants._of(pair, scale, place)).pair


def mapping_digest(mapping: Mapping) -> str:
    """SHA-256 of what determines the results of a mapping: the bytes of a compiled one, the provenance of a chain."""
    content: Any = getattr(mapping, "to_bytes", None)
    if content is not None:
        return sha256(content()).hexdigest()
    chain: Any = mapping
    return str(provenance_of(chain).digest)


def map_blocks(mapping: Mapping, blocks: Iterable[Pair], *, threads: int = 1) -> Iterator[Pair]:
    """Map blocks of counts, and give the results in the order of the blocks.

    Parameters
    ----------
    mapping : Chain or CompiledChain
    blocks : iterable of (int64 array, float64 array)
        Normalised counts of the mapping's start scale; blocks of some 10^5 to 10^6 are quickest.
    threads : int
        Blocks worked on at once. Never more than `threads` + 1 are held, so memory stays bounded however long the
        stream is.

    Yields
    ------
    (int64 array, float64 array)
        Counts of the mapping's end scale, the same bytes with any number of threads.

    Raises
    ------
    TscaleError
        Whatever the mapping raises, in the turn of its block.
    """
    work = evaluator(mapping)
    return in_order(work, blocks, threads)


def in_order(work: Callable[[Any], Any], items: Iterable[Any], threads: int) -> Iterator[Any]:
    """Apply a function to items on several threads; results come in the order of the items."""
    if not isinstance(threads, int) or isinstance(threads, bool) or threads < 1:
        raise InvalidInput(f"threads must be a whole number from 1, got {threads!r}")
    return map(work, items) if threads == 1 else _threaded(work, items, threads)


def _threaded(work: Callable[[Any], Any], items: Iterable[Any], threads: int) -> Iterator[Any]:
    waiting: deque[Future[Any]] = deque()
    with ThreadPoolExecutor(threads, thread_name_prefix="tscale") as pool:
        try:
            for item in items:
                waiting.append(pool.submit(work, item))
                if len(waiting) > threads:
                    yield waiting.popleft().result()
            while waiting:
                yield waiting.popleft().result()
        finally:  # after an error, or where the reader has had enough
            for future in waiting:
                future.cancel()
