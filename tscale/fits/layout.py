"""The layout of a FITS file: where each header and its data begin and end, and where the columns of a table stand."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, BinaryIO, Final

import numpy as np

from ..errors import DataFileError, InvalidInput
from .cards import CARD, Cards, Value

__all__ = ["BLOCK", "Column", "Hdu", "Layout", "find_hdu", "read_layout"]

BLOCK: Final = 2880
_LONGEST_HEADER: Final = 36 * 1000 * BLOCK  # none is longer by far: a file without END is not read to its end
_FORMAT: Final = re.compile(r"(\d*)([LXBIJKAEDCMPQ])")
_BYTES: Final = {"L": 1, "B": 1, "I": 2, "J": 4, "K": 8, "A": 1, "E": 4, "D": 8, "C": 8, "M": 16, "P": 8, "Q": 16}
_NUMBERS: Final = {"B": "u1", "I": ">i2", "J": ">i4", "K": ">i8", "E": ">f4", "D": ">f8"}
_ESSENTIAL: Final = ("SIMPLE", "XTENSION")


@dataclass(frozen=True)
class Column:
    """A column of a binary table: its number from 1, name, code and repeats of TFORM, and place in the row in bytes."""

    number: int
    name: str
    code: str
    repeat: int
    offset: int
    width: int

    @property
    def dtype(self) -> np.dtype[Any] | None:
        """Type of its numbers; None for what is no scalar number."""
        return np.dtype(_NUMBERS[self.code]) if self.code in _NUMBERS and self.repeat == 1 else None


@dataclass(frozen=True)
class Hdu:
    """A header and its data.

    Attributes
    ----------
    number : int
        From 0, the primary.
    cards : Cards
    start, data, end : int
        Bytes where the header and the data begin, and where the next header does.
    """

    number: int
    cards: Cards = field(repr=False)
    start: int
    data: int
    end: int

    @property
    def name(self) -> str:
        """EXTNAME in capitals; PRIMARY for the first."""
        return (self.cards.text("EXTNAME") or ("PRIMARY" if self.number == 0 else "")).upper()

    @property
    def version(self) -> int:
        """EXTVER, 1 by default."""
        return int(self.cards.number("EXTVER") or 1)

    @property
    def title(self) -> str:
        """For messages."""
        return f"HDU {self.number}" + (f" ({self.name})" if self.name else "")

    @property
    def is_table(self) -> bool:
        """Whether it is a binary table, and no image in the form of one."""
        return self.cards.text("XTENSION") == "BINTABLE" and not self.cards.true("ZIMAGE")

    @property
    def rows(self) -> int:
        """Rows of a table."""
        return self.cards.integer("NAXIS2", 0)

    @property
    def row_bytes(self) -> int:
        """Length of its rows."""
        return self.cards.integer("NAXIS1", 0)

    def columns(self) -> tuple[Column, ...]:
        """The columns of a table.

        Raises
        ------
        DataFileError
            Where TFORM cannot be read, or its columns do not add up to NAXIS1.
        """
        found, offset = [], 0
        for number in range(1, self.cards.integer("TFIELDS", 0, 999) + 1):
            text = self.cards.text(f"TFORM{number}") or ""
            match = _FORMAT.match(text)
            if match is None:
                raise self.cards.fault(f"TFORM{number} is {text!r}, no format of a binary table")
            repeat, code = int(match[1] or 1), match[2]
            width = -(-repeat // 8) if code == "X" else repeat * _BYTES[code]
            name = self.cards.text(f"TTYPE{number}") or ""
            found.append(Column(number, name, code, repeat, offset, width))
            offset += width
        if offset != self.row_bytes:
            raise self.cards.fault(
                f"the columns take {offset} bytes a row by their TFORM, and NAXIS1 says {self.row_bytes}: the header "
                "is damaged"
            )
        return tuple(found)

    def column(self, name: str) -> Column | None:
        """A column by its name in any case; None where there is none.

        Raises
        ------
        DataFileError
            Where two have the name.
        """
        found = [column for column in self.columns() if column.name.upper() == name.upper()]
        if len(found) > 1:
            raise self.cards.fault(f"{len(found)} columns are named {name}")
        return found[0] if found else None


@dataclass(frozen=True)
class Layout:
    """All HDUs of a file."""

    path: Path
    hdus: tuple[Hdu, ...]

    def __iter__(self) -> Iterator[Hdu]:
        return iter(self.hdus)


def read_layout(path: str | os.PathLike[str], cards: Mapping[str, Value] | None = None) -> Layout:
    """Read the headers of a file.

    Parameters
    ----------
    path : path
    cards : mapping, optional
        Values that stand in place of those in the headers.

    Raises
    ------
    DataFileError
        For what is no FITS file, is cut off, or has a header that does not fit its data.
    """
    path = Path(path)
    try:
        with open(path, "rb") as file:
            size = os.fstat(file.fileno()).st_size
            return Layout(path, tuple(_hdus(file, size, path, cards)))
    except OSError as error:
        raise DataFileError(f"cannot read {path}: {error.strerror or error}", path=path) from error


def _hdus(file: BinaryIO, size: int, path: Path, given: Mapping[str, Value] | None) -> Iterator[Hdu]:
    at = number = 0
    while at < size or not number:
        where = f"HDU {number}"
        images = _header(file, at, path, where, number)
        cards = Cards(images, where, path, given)
        data = file.tell()
        length = _data_bytes(cards, first=number == 0)
        end = data + -(-length // BLOCK) * BLOCK
        if end > size:
            raise DataFileError(
                f"{path}: the file is cut off: {where} needs {end} bytes by its header, and the file has {size}; "
                "get it again, or mend NAXIS, PCOUNT or GCOUNT",
                path=path,
            )
        cards.where = Hdu(number, cards, at, data, end).title
        yield Hdu(number, cards, at, data, end)
        at, number = end, number + 1


def _header(file: BinaryIO, at: int, path: Path, where: str, number: int) -> list[str]:
    file.seek(at)
    images: list[str] = []
    while True:
        block = file.read(BLOCK)
        if not images:
            _check_begin(block, path, where, number)
        if len(block) < BLOCK:
            raise DataFileError(f"{path}: the file is cut off in the header of {where}, before its END card", path=path)
        try:
            text = block.decode("ascii")
        except UnicodeDecodeError as error:
            raise DataFileError(
                f"{path}: the header of {where} holds bytes that are no ASCII (byte {at + error.start}): the file is "
                "damaged, or the END card is missing",
                path=path,
            ) from error
        for start in range(0, BLOCK, CARD):
            image = text[start : start + CARD]
            if image.rstrip() == "END":
                return images
            images.append(image)
        at += BLOCK
        if len(images) * CARD > _LONGEST_HEADER:
            raise DataFileError(f"{path}: the header of {where} has no END card", path=path)


def _check_begin(block: bytes, path: Path, where: str, number: int) -> None:
    word = _ESSENTIAL[number > 0]
    if block.startswith(f"{word:<8}= ".encode()):
        return
    if block.startswith(b"\x1f\x8b"):
        raise DataFileError(f"{path} is compressed by gzip; unpack it first", path=path)
    if number == 0:
        raise DataFileError(f"{path} is no FITS file: it does not begin with SIMPLE", path=path)
    raise DataFileError(
        f"{path}: where the header of {where} should begin there is none: the header before it gives a wrong size "
        f"(NAXIS, PCOUNT, GCOUNT), or the file is damaged",
        path=path,
    )


def _data_bytes(cards: Cards, first: bool) -> int:
    bits = cards.integer("BITPIX")
    if bits not in (8, 16, 32, 64, -32, -64):
        raise cards.fault(f"BITPIX is {bits}; allowed are 8, 16, 32, 64, -32 and -64")
    axes = [cards.integer(f"NAXIS{n}", 0) for n in range(1, cards.integer("NAXIS", 0, 999) + 1)]
    if not axes:
        return 0
    extra = 0 if first and "PCOUNT" not in cards else cards.integer("PCOUNT", 0)
    groups = 1 if first and "GCOUNT" not in cards else cards.integer("GCOUNT", 1)
    if first and axes[0] == 0 and cards.true("GROUPS"):
        axes = axes[1:]
    size = 1
    for axis in axes:
        size *= axis
    if cards.text("XTENSION") == "BINTABLE" and (bits != 8 or len(axes) != 2 or groups != 1):
        raise cards.fault("a binary table has BITPIX = 8, NAXIS = 2 and GCOUNT = 1, and this one has not")
    return abs(bits) // 8 * groups * (extra + size)


def find_hdu(layout: Layout, extension: str | int | tuple[str, int]) -> Hdu:
    """One HDU by its number, name, or name and EXTVER.

    Raises
    ------
    InvalidInput
        Where there is none, or several have the name.
    """
    if isinstance(extension, int) and not isinstance(extension, bool):
        found = [hdu for hdu in layout if hdu.number == extension]
    elif isinstance(extension, tuple):
        name, version = extension
        found = [hdu for hdu in layout if hdu.name == name.upper() and hdu.version == version]
    else:
        found = [hdu for hdu in layout if hdu.name == str(extension).upper()]
    if len(found) == 1:
        return found[0]
    there = ", ".join(f"{hdu.title}{f' EXTVER {hdu.version}' if hdu.version != 1 else ''}" for hdu in layout)
    what = "no extension is" if not found else f"{len(found)} extensions are"
    raise InvalidInput(
        f"{layout.path}: {what} {extension!r}; give a number, a name, or (name, EXTVER) of: {there}", path=layout.path
    )
