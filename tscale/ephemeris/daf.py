"""The container of SPK kernels: a file of named double-precision arrays, read with jplephem and checked."""

from __future__ import annotations

import hashlib
import re
import struct
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError

__all__ = ["Array", "Container", "check_sha256", "file_sha256", "mass_parameters", "read_container"]

_RECORD_BYTES: Final = 1024
_LONGEST_S: Final = 2.0**62
_TEXT_BYTES: Final = 1000  # of each comment record


@dataclass(frozen=True)
class Array:
    """One array of a container with its descriptor (NAIF SPK Required Reading, "Segment descriptors")."""

    name: str
    start_s: float
    end_s: float
    target: int
    center: int
    frame: int
    data_type: int
    words: npt.NDArray[Any]


@dataclass(frozen=True)
class Container:
    """The arrays and the comment text of one file."""

    path: Path
    arrays: tuple[Array, ...]
    comment: str


def file_sha256(path: Path) -> str:
    """SHA-256 of a file, hexadecimal."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def check_sha256(path: Path, expected: str) -> None:
    """Raise `DataFileError` unless a file has the SHA-256 expected."""
    try:
        found = file_sha256(path)
    except OSError as error:
        raise DataFileError(f"cannot read {path}: {error.strerror or error}", path=path) from error
    if found != expected:
        raise DataFileError(
            f"{path} is not the file that was in use: its SHA-256 is {found}, expected {expected}", path=path
        )


def read_container(path: Path) -> Container:
    """Read descriptors and comments and map the arrays; the file itself is closed again.

    Raises
    ------
    DataFileError
        For a file that is missing, is not an SPK kernel, is damaged or is shorter than its own descriptors say.
    """
    from jplephem.daf import DAF

    try:
        size = path.stat().st_size
        with path.open("rb") as file:
            start = file.read(16)
            header = start[:8]
            file.seek(0)
            if header not in (b"DAF/SPK ", b"NAIF/DAF"):
                raise DataFileError(
                    f"{path} starts with {header!r}, which is not an SPK kernel (DAF/SPK): give a binary .bsp file",
                    path=path,
                )
            if size % 8:
                raise _truncated(path, size, None)
            # Looked at before the reader takes them for the length of its records.
            if (2, 6) not in (struct.unpack(f"{order}ii", start[8:]) for order in "<>"):
                raise DataFileError(
                    f"{path} is damaged, or no SPK kernel: its arrays must have 2 + 6 descriptor numbers", path=path
                )
            daf = DAF(file)
            if 8 * (daf.free - 1) > size:
                raise _truncated(path, size, 8 * (daf.free - 1))
            # A damaged chain of descriptor records may run in a circle: no file holds more than these.
            most = size // _RECORD_BYTES * daf.summaries_per_record
            found = list(islice(daf.summaries(), most + 1))
            comment = b"".join(daf.read_record(n)[:_TEXT_BYTES] for n in range(2, daf.fward))
            endian = daf.endian
    except OSError as error:
        raise DataFileError(f"cannot read {path}: {error.strerror or error}", path=path) from error
    except (ValueError, struct.error) as error:
        if isinstance(error, DataFileError):
            raise
        raise DataFileError(f"{path} is damaged or cut short ({error}): fetch it again", path=path) from error
    words = np.memmap(path, dtype=np.dtype(f"{endian}f8"), mode="r")
    arrays = []
    for name, (start_s, end_s, target, center, frame, data_type, first, last) in found:
        if not (1 <= first <= last and -_LONGEST_S < start_s <= end_s < _LONGEST_S):
            raise DataFileError(f"{path}: the descriptor of body {target} is damaged: fetch the file again", path=path)
        if last > words.size:
            raise _truncated(path, size, 8 * last)
        part = np.asarray(words[first - 1 : last])
        text = name.decode("ascii", "replace")
        arrays.append(Array(text, start_s, end_s, target, center, frame, data_type, part))
    if len(arrays) > most or not arrays:
        raise DataFileError(f"{path} holds no readable segment: fetch the file again", path=path)
    text = comment.split(b"\4", 1)[0].replace(b"\0", b"\n").decode("ascii", "replace")
    return Container(path, tuple(arrays), text)


def _truncated(path: Path, size: int, needed: int | None) -> DataFileError:
    wanted = "a whole number of 8-byte words" if needed is None else f"{needed} bytes"
    return DataFileError(
        f"{path} is truncated: it has {size} bytes, its descriptors need {wanted}: fetch it again", path=path
    )


def mass_parameters(comment: str) -> Mapping[int, float]:
    """Mass parameters in a kernel's comment text, m3/s2 by NAIF number; empty if it states none.

    Reads the constants of the integration as planetary kernels list them: `GM1` to `GM9`, `GMB` (Earth + Moon) and
    `GMS` in AU**3/DAY**2, `AU` in km and `EMRAT`, the Earth/Moon mass ratio, each on a line of its own.
    """
    pattern = re.compile(r"^\s*(GM[1-9BS]|AU|EMRAT)\s+([-+]?[\d.]+[DE][-+]?\d+)\s*$", re.MULTILINE)
    constants = {name: float(value.replace("D", "E")) for name, value in pattern.findall(comment)}
    if "AU" not in constants:
        return {}
    unit = (constants["AU"] * 1e3) ** 3 / 86400.0**2
    numbers = {f"GM{n}": n for n in (1, 2, 4, 5, 6, 7, 8, 9)} | {"GMS": 10}
    masses = {number: constants[name] * unit for name, number in numbers.items() if name in constants}
    if "GMB" in constants and "EMRAT" in constants:
        both, ratio = constants["GMB"] * unit, constants["EMRAT"]
        masses |= {3: both, 399: both * ratio / (1 + ratio), 301: both / (1 + ratio)}
    return masses
