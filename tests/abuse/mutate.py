"""Damage done to good inputs: bits, pieces, and words that readers stumble over."""

from __future__ import annotations

import random
from collections.abc import Sequence

__all__ = ["damaged", "mutated"]

WORDS = tuple(
    word.encode("utf-8", "surrogateescape")
    for word in (
        *(
            "nan",
            "-inf",
            "1e999",
            "-1e-999",
            "9" * 400,
            "-0",
            "0x1p4",
            "1_000",
            "+",
            "-",
            ".",
            "1e",
            "\u0663\u0664",
            "½",
        ),
        *(
            "9223372036854775807",
            "-9223372036854775808",
            "9223372036854775808",
            "18446744073709551616",
            "4611686018427387904",
        ),
        *(
            "2016-12-31T23:59:60",
            "2016-12-31T23:59:61",
            "0000-00-00",
            "9999-12-31T24:00:00",
            "-292277022657-01-27",
            "1960-12-31",
        ),
        *(
            "\0",
            "\r",
            "\n",
            "\r\n",
            "\t",
            " ",
            "\u2028",
            "\x85",
            "\ufeff",
            "\udcff",
            "\ud7ff",
            "\U0010ffff",
            "\x1a",
            "\x0b",
            "\x0c",
        ),
        *(
            '"',
            "'",
            '"""',
            "#",
            ",",
            ";",
            "=",
            "[",
            "]",
            "{",
            "}",
            "[[",
            "..",
            "\\u0000",
            "\\",
            "/",
            "<",
            ">",
            "&",
            "&#0;",
            "<!--",
            "]]>",
        ),
        *("true", "null", "[[[[[[[[" * 40, '{"a":' * 60, "a" * 300, "D+99", "d-400", "END", "inf", "Infinity", "1D400"),
    )
)


def mutated(data: bytes, rng: random.Random, others: Sequence[bytes] = (), most: int = 1 << 16) -> bytes:
    """One to some changes at random places; `others` are inputs that pieces are taken from."""
    body = bytearray(data)
    for _ in range(1 + min(int(rng.expovariate(0.6)), 12)):
        _change(body, rng, others)
    return bytes(body[:most])


def _change(body: bytearray, rng: random.Random, others: Sequence[bytes]) -> None:
    size = len(body)
    at = rng.randrange(size + 1)
    end = min(size, at + 1 + int(rng.expovariate(0.1)))
    which = rng.randrange(10)
    if which == 0 and size:
        body[at % size] ^= 1 << rng.randrange(8)
    elif which == 1 and size:
        body[at % size] = rng.randrange(256)
    elif which == 2:
        del body[at:end]
    elif which == 3:
        body[at:at] = body[at:end] * rng.choice((1, 1, 2, 30))
    elif which == 4:
        del body[at:]
    elif which == 5 and others:
        other = rng.choice(others)
        start = rng.randrange(len(other) + 1)
        body[at:end] = other[start : start + 1 + int(rng.expovariate(0.05))]
    elif which == 6:
        body[at:end] = rng.randbytes(end - at)
    elif which == 7 and size:
        _number(body, rng)
    else:
        _word(body, rng, at, end)


def _word(body: bytearray, rng: random.Random, at: int, end: int) -> None:
    """Put a word in, or in the place of another."""
    word = rng.choice(WORDS)
    if rng.random() < 0.5:
        body[at:at] = word
        return
    ends = b" \t\r\n,;=<>[]{}\"':"
    start = at
    while start > 0 and body[start - 1] not in ends:
        start -= 1
    while at < len(body) and body[at] not in ends and at - start < 64:
        at += 1
    body[start:at] = word if start < at else body[at:end]


def _number(body: bytearray, rng: random.Random) -> None:
    """Make the bytes at a place that numbers of binary files begin at something extreme."""
    width = rng.choice((1, 2, 4, 8))
    if len(body) < width:
        return
    at = rng.randrange(len(body) // width) * width
    value = rng.choice((0, 1, -1, 2 ** (8 * width - 1) - 1, -(2 ** (8 * width - 1)), rng.randrange(-128, 128), 1 << 20))
    value &= (1 << 8 * width) - 1
    body[at : at + width] = value.to_bytes(width, rng.choice(("little", "big")))


def damaged(data: bytes, rng: random.Random) -> bytes:
    """A file as disks and lines damage it: cut, some bits turned, a block of zeros, or a block of another place."""
    body = bytearray(data)
    which = rng.randrange(4)
    if which == 0:
        return bytes(body[: rng.randrange(len(body))])
    if which == 1:
        for _ in range(rng.choice((1, 1, 1, 2, 8))):
            body[rng.randrange(len(body))] ^= 1 << rng.randrange(8)
        return bytes(body)
    size = min(rng.choice((1, 16, 512, 4096)), len(body))
    at, other = (rng.randrange(len(body) - size + 1) for _ in range(2))
    body[at : at + size] = bytes(size) if which == 2 else body[other : other + size]
    return bytes(body)
