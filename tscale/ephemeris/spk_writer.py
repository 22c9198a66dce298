"""The bytes of an SPK kernel with one Chebyshev segment (NAIF DAF and SPK Required Reading)."""

from __future__ import annotations

import hashlib
import re
import struct
from typing import Final

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray

__all__ = ["CHECKSUM_LINE", "spk_bytes"]

CHECKSUM_LINE: Final = re.compile(r"^SHA-256 of the segment: ([0-9a-f]{64})\n?", re.MULTILINE)
"""The line of the comment text that holds the checksum of the segment's words."""

_RECORD: Final = 1024
_TEXT: Final = 1000
_TRANSFER_TEST: Final = b"FTPSTR:\r:\n:\r\n:\r\x00:\x81:\x10\xce:ENDFTP"
_ND, _NI = 2, 6
_SUMMARY_BYTES: Final = 40
_CHEBYSHEV_POSITIONS: Final = 2
_ICRF_FRAME: Final = 1


def spk_bytes(
    *, title: str, comment: str, target: int, center: int, start_s: float, step_s: float, coefficients: FloatArray
) -> bytes:
    """Write one type-2 segment as a little-endian SPK kernel.

    Parameters
    ----------
    title : str
        Name of file and segment, at most 40 ASCII characters.
    comment : str
        Text of the comment area, ASCII, whole lines; the checksum of the segment is added.
    target, center : int
        NAIF numbers.
    start_s, step_s : float
        TDB count of the first record's start, and length of a record, s.
    coefficients : float array (records, 3, degree + 1)
        In the units the kernel is to have.
    """
    if len(title) > _SUMMARY_BYTES or not (title + comment).isascii():
        raise InvalidInput(f"title {title!r} and comment must be ASCII, the title at most {_SUMMARY_BYTES} characters")
    records, components, terms = coefficients.shape
    if components != 3:
        raise InvalidInput(f"coefficients have shape {coefficients.shape}; allowed is (records, 3, degree + 1)")
    rows = np.empty((records, 2 + 3 * terms), dtype="<f8")
    rows[:, 0] = start_s + step_s * (np.arange(records) + 0.5)
    rows[:, 1] = step_s / 2.0
    rows[:, 2:] = coefficients.reshape(records, -1)
    data = rows.tobytes() + struct.pack("<4d", start_s, step_s, rows.shape[1], records)

    comment += f"SHA-256 of the segment: {hashlib.sha256(data).hexdigest()}\n"
    text = comment.replace("\n", "\0").encode("ascii") + b"\4"
    blocks = [text[i : i + _TEXT].ljust(_RECORD, b"\0") for i in range(0, len(text), _TEXT)]
    summaries = 2 + len(blocks)  # record number; the names follow, then the data
    first_word = (summaries + 1) * (_RECORD // 8) + 1
    last_word = first_word + len(data) // 8 - 1
    name = title.encode("ascii")
    header = struct.pack(
        "<8sII60sIII8s603s28s297s",
        b"DAF/SPK ",
        _ND,
        _NI,
        name.ljust(60),
        summaries,
        summaries,
        last_word + 1,
        b"LTL-IEEE",
        b"",
        _TRANSFER_TEST,
        b"",
    )
    summary = struct.pack(
        "<3d2d6i",
        0.0,
        0.0,
        1.0,
        start_s,
        start_s + step_s * records,
        target,
        center,
        _ICRF_FRAME,
        _CHEBYSHEV_POSITIONS,
        first_word,
        last_word,
    )
    body = b"".join([header, *blocks, summary.ljust(_RECORD, b"\0"), name.ljust(_RECORD), data])
    return body.ljust(-(-len(body) // _RECORD) * _RECORD, b"\0")
