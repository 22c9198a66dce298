"""DATASUM and CHECKSUM: the 32-bit ones' complement sum of a header and its data (FITS Standard 4.0, appendix J)."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

__all__ = ["BLANK_CHECKSUM", "added", "encoded", "summed"]

BLANK_CHECKSUM: Final = "0" * 16
_PUNCTUATION: Final = (*range(0x3A, 0x41), *range(0x5B, 0x61))  # between the digits and letters of ASCII


def summed(data: Any) -> int:
    """Ones' complement sum of bytes, whose number is a multiple of 4, as big-endian 32-bit words."""
    words = np.frombuffer(data, dtype=">u4")
    return _folded(int(words.sum(dtype=np.uint64)))


def added(one: int, other: int) -> int:
    """Sum of two sums."""
    return _folded(one + other)


def _folded(total: int) -> int:
    while total >> 32:
        total = (total & 0xFFFFFFFF) + (total >> 32)
    return total


def encoded(total: int) -> str:
    """The 16 characters that make the sum of an HDU, in which they stood as zeros, all ones."""
    value = 0xFFFFFFFF - total
    characters = [0] * 16
    for byte in range(4):
        part = value >> (24 - 8 * byte) & 0xFF
        four = [part // 4 + 0x30] * 4
        four[0] += part % 4
        while any(character in _PUNCTUATION for character in four):
            for at in (0, 2):
                if four[at] in _PUNCTUATION or four[at + 1] in _PUNCTUATION:
                    four[at] += 1
                    four[at + 1] -= 1
        for at in range(4):
            characters[4 * at + byte] = four[at]
    text = "".join(map(chr, characters))
    return text[-1] + text[:-1]  # the value of the card begins at the fourth byte of a word
