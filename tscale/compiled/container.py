"""The file of a compiled chain: a zip archive of numpy arrays and a JSON header, sealed with a SHA-256.

Members are stored, not deflated, with fixed dates and attributes, so that equal content gives equal bytes on every
machine. The archive's comment holds the SHA-256 of every byte before it: a bit that is changed anywhere, and bytes that
are cut off or added, are found before anything is read. `numpy.load` opens the file too.
"""

from __future__ import annotations

import hashlib
import io
import json
import math
import zipfile
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError, TscaleError
from ..exact import Pair
from ..scales import Node
from .certificate import Certificate
from .piece_table import PieceTable

__all__ = ["FORMAT", "VERSION", "from_bytes", "to_bytes"]

FORMAT: Final = "tscale compiled chain"
VERSION: Final = 1

_SEAL: Final = b"tscale compiled chain sha256 "
_DIGITS: Final = 64
_HEADER: Final = "header.json"
_WAYS: Final = ("forward", "inverse")
_ARRAYS: Final = {
    "start_whole": np.dtype("<i8"),
    "start_fraction": np.dtype("<f8"),
    "center": np.dtype("<i8"),
    "shift_s": np.dtype("<i8"),
    "powers": np.dtype("<f8"),
}

_MOST_S: Final = 2**61
_LONGEST_S: Final = 2**51
"""Seconds below which those of a piece turn exactly into floats (see `piece_table`)."""

_UNREADABLE: Final = (
    KeyError, IndexError, ValueError, TypeError, AttributeError, ArithmeticError, RuntimeError, EOFError,
    zipfile.BadZipFile, TscaleError,
)  # fmt: skip
"""What comes of a file that was sealed by someone else; a RuntimeError of JSON that is nested too deeply."""

_Made = tuple[Node, Node, tuple[Pair, Pair], tuple[PieceTable, PieceTable], Certificate]


def to_bytes(
    start: Node, end: Node, span: tuple[Pair, Pair], tables: tuple[PieceTable, PieceTable], facts: Certificate
) -> bytes:
    """The content of a file."""
    ways: dict[str, Any] = {}
    members: list[tuple[str, bytes]] = []
    for way, table, ends in zip(_WAYS, tables, span, strict=True):
        ways[way] = {
            "origin": table.origin,
            "cell_s": table.cell_s,
            "first": [int(ends[0][0]), float(ends[1][0]).hex()],
            "last": [int(ends[0][1]), float(ends[1][1]).hex()],
        }
        for name, kind in _ARRAYS.items():
            members.append((f"{way}_{name}.npy", _npy(np.asarray(getattr(table, name)).astype(kind))))
    header = {
        "format": FORMAT,
        "version": VERSION,
        "start": str(start),
        "end": str(end),
        "ways": ways,
        "certificate": facts.to_dict(),
    }
    text = json.dumps(header, indent=1, sort_keys=True, ensure_ascii=True, allow_nan=False).encode()
    members.insert(0, (_HEADER, text))
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_STORED, allowZip64=True) as archive:
        for name, content in members:
            info = zipfile.ZipInfo(name, (1980, 1, 1, 0, 0, 0))
            info.create_system, info.external_attr = 3, 0o644 << 16
            archive.writestr(info, content)
        archive.comment = _SEAL + b"0" * _DIGITS
    body = buffer.getvalue()[:-_DIGITS]
    return body + hashlib.sha256(body).hexdigest().encode()


def from_bytes(content: bytes, path: Path) -> _Made:
    """Read the content of a file.

    Raises
    ------
    DataFileError
        For anything but the bytes that `to_bytes` made, and for a newer version.
    """
    body, digest = content[:-_DIGITS], content[-_DIGITS:]
    if not content.startswith(b"PK") or not body.endswith(_SEAL):
        raise DataFileError(
            f"{path} is not a compiled chain, or is cut short: give a file that CompiledChain.save wrote", path=path
        )
    if hashlib.sha256(body).hexdigest().encode() != digest:
        raise DataFileError(
            f"{path} is damaged: its bytes do not have the SHA-256 it was sealed with; copy it again or compile anew",
            path=path,
        )
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            header = json.loads(_member(archive, _HEADER))
            if header["format"] != FORMAT:
                raise ValueError(f"format {header['format']!r}")
            version = _whole_number(header, "version", 1, 2**31)
            if version > VERSION:
                raise DataFileError(
                    f"{path} is of version {version}, and this package reads up to {VERSION}: upgrade tscale",
                    path=path,
                )
            tables = tuple(_table(archive, way, header["ways"][way]) for way in _WAYS)
        spans = tuple(_ends(header["ways"][way]) for way in _WAYS)
        facts = Certificate.from_dict(header["certificate"])
        nodes = Node.parse(header["start"]), Node.parse(header["end"])
    except DataFileError:
        raise
    except _UNREADABLE as error:
        raise DataFileError(
            f"{path} is sealed but is not a compiled chain that can be read ({str(error) or type(error).__name__}): "
            "give a file that CompiledChain.save wrote, or compile anew",
            path=path,
        ) from error
    return *nodes, (spans[0], spans[1]), (tables[0], tables[1]), facts


def _npy(array: npt.NDArray[Any]) -> bytes:
    buffer = io.BytesIO()
    np.lib.format.write_array(buffer, np.ascontiguousarray(array), version=(1, 0), allow_pickle=False)
    return buffer.getvalue()


def _table(archive: zipfile.ZipFile, way: str, facts: dict[str, Any]) -> PieceTable:
    arrays = [_array(_member(archive, f"{way}_{name}.npy"), f"{way}_{name}", kind) for name, kind in _ARRAYS.items()]
    if len({array.shape[-1] for array in arrays}) != 1 or arrays[0].size < 3 or not arrays[-1].size:
        raise ValueError(f"columns of {way} differ in length, or are too short")
    starts, fractions, centers, shifts, powers = arrays
    first = int(starts[1])
    origin = _whole_number(facts, "origin", -_MOST_S, first)
    cell_s = _whole_number(facts, "cell_s", 1, _MOST_S)
    rising = (starts[1:] > starts[:-1]) | ((starts[1:] == starts[:-1]) & (fractions[1:] >= fractions[:-1]))
    if not (rising.all() and (fractions >= 0.0).all() and (fractions < 1.0).all()):
        raise ValueError(f"the pieces of {way} are not in order of their starts")
    if (
        any(part[1:].min() < -_MOST_S or part[1:].max() > _MOST_S for part in (starts, centers, shifts))
        or (np.abs(centers[1:-1] - starts[1:-1]) > _LONGEST_S).any()
    ):
        raise ValueError(f"{way} has dates out of all range")
    holes = np.isnan(powers).all(axis=0)
    if not (holes[0] and holes[-1] and (holes | (np.abs(powers) < _LONGEST_S).all(axis=0)).all()):
        raise ValueError(f"{way} has coefficients that are no numbers")
    return PieceTable(starts, fractions, centers, shifts, powers, origin, cell_s)


def _member(archive: zipfile.ZipFile, name: str) -> bytes:
    info = archive.getinfo(name)
    if info.compress_type != zipfile.ZIP_STORED:
        raise ValueError(f"{name} is deflated")
    return archive.read(info)


def _array(content: bytes, name: str, kind: np.dtype[Any]) -> npt.NDArray[Any]:
    """An array of a member, of the right kind and no longer than the member is."""
    stream = io.BytesIO(content)
    np.lib.format.read_magic(stream)
    shape, _, found = np.lib.format.read_array_header_1_0(stream)
    if found != kind or len(shape) != (2 if name.endswith("powers") else 1):
        raise ValueError(f"{name} is {found} of {len(shape)} dimensions")
    if math.prod(shape) * kind.itemsize != len(content) - stream.tell():
        raise ValueError(f"{name} is not as long as it says")
    stream.seek(0)
    array: npt.NDArray[Any] = np.lib.format.read_array(stream, allow_pickle=False)
    return array.astype(kind.newbyteorder("="))


def _whole_number(facts: dict[str, Any], name: str, least: int, most: int) -> int:
    value = facts[name]
    if isinstance(value, bool) or not isinstance(value, int) or not least <= value <= most:
        raise ValueError(f"{name} is a whole number from {least} to {most}, got {value!s:.40}")
    return value


def _ends(facts: dict[str, Any]) -> Pair:
    ends = facts["first"], facts["last"]
    whole = np.array([_whole_number({"an end": end[0]}, "an end", -_MOST_S, _MOST_S) for end in ends], dtype=np.int64)
    fraction = np.array([float.fromhex(end[1]) for end in ends])
    if not ((fraction >= 0.0) & (fraction < 1.0)).all() or not (whole[1] - whole[0]) + (fraction[1] - fraction[0]) > 0:
        raise ValueError("the ends of the span are not in order")
    return whole, fraction
