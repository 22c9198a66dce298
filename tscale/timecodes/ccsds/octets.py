"""Codes as arrays of octets, and their preamble fields."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeAlias

import numpy as np
import numpy.typing as npt

from ...errors import InvalidInput
from ...exact import IntArray

__all__ = ["Octets", "number", "split", "with_preamble"]

Octets: TypeAlias = npt.NDArray[np.uint8]


def _octets(code: Any) -> Octets:
    if isinstance(code, bytes | bytearray | memoryview):
        return np.frombuffer(bytes(code), dtype=np.uint8)
    if isinstance(code, list | tuple) and code and all(isinstance(item, bytes | bytearray) for item in code):
        lengths = {len(item) for item in code}
        if len(lengths) > 1:
            raise InvalidInput(f"codes in one list have the same length, got {sorted(lengths)} octets; read them apart")
        return np.stack([np.frombuffer(bytes(item), dtype=np.uint8) for item in code])
    array = np.asarray(code)
    if array.dtype != np.uint8 or array.ndim == 0:
        raise InvalidInput(
            f"a code is bytes, a list of bytes, or an array of uint8 with the octets on its last axis; got "
            f"{type(code).__name__} of {array.dtype}"
        )
    return array


def split(
    code: Any, p_field: bytes | int | None, kind: str, identifiers: tuple[int, ...], length: Callable[[bytes], int]
) -> tuple[bytes, Octets]:
    """The P-field and the T-fields of codes.

    Parameters
    ----------
    code : bytes, list of bytes, or uint8 array
    p_field : bytes or int, optional
        As agreed on; None where each code begins with it.
    kind : str
        For messages.
    identifiers : tuple of int
        Allowed values of the three bits of the code identification.
    length : callable
        Octets of the T-field for a P-field; it raises for one that is not understood.
    """
    octets = _octets(code)
    if p_field is None:
        first = octets.reshape(-1, octets.shape[-1])[:1] if octets.size else octets
        if first.size == 0:
            raise InvalidInput(f"no octets: a {kind} code that brings its P-field has one at least")
        size = _preamble_size(first[0])
        preamble = first[0][:size].tobytes()
        if np.any(octets[..., :size] != first[0][:size]):
            raise InvalidInput(f"the {kind} codes of one array have the same P-field; read those of other kinds apart")
        octets = octets[..., size:]
    else:
        preamble = bytes([p_field]) if isinstance(p_field, int) else bytes(p_field)
        if not preamble or len(preamble) != _preamble_size(np.frombuffer(preamble, np.uint8)):
            raise InvalidInput(
                f"{preamble.hex()!r} is no P-field: it has one octet, and one more after each with bit 0 set"
            )
    found = preamble[0] >> 4 & 0b111
    if found not in identifiers:
        allowed = " or ".join(f"{i:03b}" for i in identifiers)
        raise InvalidInput(f"P-field {preamble.hex()} has code identification {found:03b}; that of {kind} is {allowed}")
    wanted = length(preamble)
    if octets.shape[-1] != wanted:
        raise InvalidInput(
            f"a {kind} code with P-field {preamble.hex()} has {wanted} octets of time, got {octets.shape[-1]}"
        )
    return preamble, octets


def _preamble_size(octets: Octets) -> int:
    size = 1
    while size < len(octets) and octets[size - 1] & 0x80:
        size += 1
    return size


def with_preamble(preamble: bytes, fields: Octets, *, sent: bool) -> Octets:
    """Put the P-field before each T-field, if it is to be sent."""
    if not sent:
        return fields
    lead = np.broadcast_to(np.frombuffer(preamble, dtype=np.uint8), (*fields.shape[:-1], len(preamble)))
    return np.concatenate([lead, fields], axis=-1)


def number(octets: Octets) -> IntArray:
    """Whole numbers that up to 7 octets of the last axis hold, the first the most significant."""
    value = np.zeros(octets.shape[:-1], dtype=np.int64)
    for i in range(octets.shape[-1]):
        value = value * 256 + octets[..., i]
    return np.asarray(value)
