"""Coordinate times of bodies that took long to integrate, kept in the user's cache folder."""

from __future__ import annotations

import hashlib
import re
import warnings
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np

from ..errors import DataFileError
from ..storage import write_atomically
from .cache import cache_folder, locked
from .chebyshev import ChebyshevTable
from .daf import read_container
from .kernel import Ephemeris
from .segments import ChebyshevSegment
from .spk_writer import CHECKSUM_LINE, spk_bytes

__all__ = ["VERSION", "Integrated", "kept"]

VERSION: Final = 2
"""Raised whenever the integrator would give other numbers or the layout changes: older files are then not used."""

_CENTER: Final = 1000000000
_GAIN: Final = re.compile(r"^Rate taken out: (-?\d+)/(\d+)$", re.MULTILINE)
_ANCHOR: Final = re.compile(r"^Anchor: (.+)$", re.MULTILINE)


class Integrated(NamedTuple):
    """What an integration gives: the rate taken out, the periodic part, and the anchor's name."""

    gain: Fraction
    table: ChebyshevTable
    anchor: str | None


def kept(ephemeris: Ephemeris, body: int, anchor_key: str, build: Callable[[], Integrated]) -> Integrated:
    """Take an integral from the cache folder, or build it and store it there, once for all processes.

    Found again by the kernel's SHA-256, the masses given, the body and `anchor_key`.

    Warns
    -----
    UserWarning
        If a damaged file was replaced, or the folder cannot be used.
    """
    masses = sorted((number, float(value).hex()) for number, value in ephemeris.given_gm_m3_s2.items())
    key = hashlib.sha256(f"{ephemeris.sha256}\n{masses!r}\n{body}\n{anchor_key}".encode()).hexdigest()
    found: Integrated | None = None
    folder: Path | str = "the cache folder"
    try:
        folder = cache_folder()
        path = folder / f"coordinate_time_{body}_{key[:32]}_v{VERSION}.bsp"
        found = _read(path, key, body)
        if found is not None:
            return found
        with locked(path):
            found = _read(path, key, body)  # another process may have built it meanwhile
            if found is None:
                found = build()
                write_atomically(path, _content(found, key, body))
            return found
    except OSError as error:
        warnings.warn(
            f"cannot store the coordinate time of a body in {folder} ({error.strerror or error}): it is built in "
            "memory each time; set TSCALE_CACHE to a folder that can be written",
            stacklevel=2,
        )
        return build() if found is None else found


def _content(found: Integrated, key: str, body: int) -> bytes:
    table = found.table
    coefficients = np.zeros((table.records, 3, table.coefficients.shape[2]))
    coefficients[:, 0] = table.coefficients[:, 0]
    comment = (
        f"{table.name.encode('ascii', 'replace').decode()}\n"
        "T - T0 less its mean rate on TDB, seconds, as the x component.\n"
        f"Rate taken out: {found.gain.numerator}/{found.gain.denominator}\n"
        f"Key: {key}\n"
    )
    if found.anchor is not None:
        comment += f"Anchor: {found.anchor.encode('ascii', 'replace').decode()}\n"
    comment += f"SHA-256 of the lines above: {hashlib.sha256(comment.encode()).hexdigest()}\n"
    return spk_bytes(
        title="coordinate time of a body (s)",
        comment=comment,
        target=_CENTER + body,
        center=_CENTER,
        start_s=table.start_s,
        step_s=table.step_s,
        coefficients=coefficients,
    )


def _read(path: Path, key: str, body: int) -> Integrated | None:
    """The content of a file that this module wrote for that key; None where there is none or it is damaged."""
    if not path.is_file():
        return None
    try:
        container = read_container(path)
        arrays = [array for array in container.arrays if (array.target, array.center) == (_CENTER + body, _CENTER)]
        comment = container.comment
        stated, gain = CHECKSUM_LINE.search(comment), _GAIN.search(comment)
        if len(arrays) != 1 or stated is None or gain is None or f"Key: {key}" not in comment.splitlines():
            raise DataFileError(f"{path} is not what its name says", path=path)
        lines, _, line_sum = comment.partition("SHA-256 of the lines above: ")
        if hashlib.sha256(lines.encode()).hexdigest() != line_sum.partition("\n")[0]:
            raise DataFileError(f"{path} is damaged: its comments do not fit their checksum", path=path)
        if hashlib.sha256(np.ascontiguousarray(arrays[0].words).tobytes()).hexdigest() != stated[1]:
            raise DataFileError(f"{path} is damaged: its numbers do not fit the checksum in its comments", path=path)
        whole = ChebyshevSegment(arrays[0], path.name, container).table
    except DataFileError as error:
        warnings.warn(f"{error}; the coordinate time of the body is built anew", stacklevel=3)
        return None
    # In memory: the file may be replaced while this value is in use.
    rows = np.array(whole.coefficients[:, :1], dtype=np.float64)
    anchor = _ANCHOR.search(comment)
    name = comment.splitlines()[0]
    return Integrated(
        Fraction(int(gain[1]), int(gain[2])),
        ChebyshevTable(whole.start_s, whole.step_s, rows, name),
        None if anchor is None else anchor[1],
    )
