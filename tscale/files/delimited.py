"""Delimited text (RFC 4180) read in blocks, with the line of every row and its text as it stood.

Lines that begin with `#`, and blank lines, are no rows: they are kept at their place and handed on. A mark of byte
order is left out. Written rows end like the first line: with CRLF, or else with LF.
"""

from __future__ import annotations

import csv
import time
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from functools import partial
from typing import Final

from ..errors import DataFileError, InvalidInput

__all__ = ["DelimitedReader", "RowBlock", "delimiter_hint", "delimiter_of", "encode_row"]

_NAMED_DELIMITERS: Final = {"comma": ",", "semicolon": ";", "tab": "\t", "pipe": "|", "\\t": "\t"}
_LONGEST_WAIT_S: Final = 0.25
_LONGEST_ROW: Final = 1 << 24
"""Characters; what is longer is no row, and may have no end."""


def delimiter_of(text: str) -> str:
    """A delimiter by its name or as the character itself."""
    found = _NAMED_DELIMITERS.get(text, text)
    if len(found) != 1 or found in '\r\n"#' or found.isalnum():
        raise InvalidInput(f"a delimiter is one character or one of {', '.join(_NAMED_DELIMITERS)}; got {text!r}")
    return found


def delimiter_hint(header: Sequence[str]) -> str:
    """What to add to a complaint where the header is one name that holds a delimiter; else nothing."""
    for word, character in _NAMED_DELIMITERS.items():
        if len(header) == 1 and character in header[0]:
            return f" (the header holds {character!r}: --delimiter {word})"
    return ""


def encode_row(fields: Iterable[str], delimiter: str = ",") -> str:
    """Join fields to one line without its end, quoted where they must be."""
    return delimiter.join(
        '"' + text.replace('"', '""') + '"'
        if delimiter in text or '"' in text or "\n" in text or "\r" in text
        else text
        for text in fields
    )


@dataclass
class RowBlock:
    """Some rows that follow each other.

    Attributes
    ----------
    column : list of str
        The field asked for, by row.
    texts : list of str
        Each row as it stood, without its line end (a quoted field may span lines).
    lines : list of int
        Line of the file on which each row begins, from 1.
    aside : list of (int, str)
        Comments and blank lines, with the number of rows of this block before them.
    """

    column: list[str] = field(default_factory=list)
    texts: list[str] = field(default_factory=list)
    lines: list[int] = field(default_factory=list)
    aside: list[tuple[int, str]] = field(default_factory=list)

    def __len__(self) -> int:
        return len(self.texts)

    def merged(self, endings: Sequence[str], newline: str) -> str:
        """Text of the block with an ending put behind each row, comments at their place."""
        out: list[str] = []
        done = 0
        for before, text in self.aside:
            out.extend(row + end for row, end in zip(self.texts[done:before], endings[done:before], strict=True))
            out.append(text)
            done = before
        out.extend(row + end for row, end in zip(self.texts[done:], endings[done:], strict=True))
        return "".join(line + newline for line in out)


class DelimitedReader:
    """Rows of a stream of delimited text; the header is read at once.

    Parameters
    ----------
    stream : iterable of str
        Lines with their ends, as from a file opened with `newline=""`.
    name : str
        For messages.
    column : str or None
        Name of the column wanted; None takes the first.
    delimiter : str
        One character.

    Attributes
    ----------
    header : list of str
        Names of the columns.
    header_text : str
        The header as it stood.
    header_line : int
        Its line, from 1.
    preamble : list of str
        Comments and blank lines above it.
    column : str
        Name of the column that is read.
    newline : str
        The line end in use.

    Raises
    ------
    DataFileError
        With the path and line: no header, a column missing or named twice, a row of another width, broken quotes.
    """

    def __init__(self, stream: Iterable[str], name: str, *, column: str | None = None, delimiter: str = ",") -> None:
        self.name = name
        self.delimiter = delimiter
        self.newline = "\n"
        self._line = 0
        self._start = 0
        self._fresh = True
        self._raw: list[str] = []
        self._aside: list[str] = []
        self._rows = csv.reader(self._feed(stream), delimiter=delimiter, strict=True)
        header = self._next()
        if header is None:
            raise DataFileError("the input is empty; it needs a header line and rows below it", path=name)
        self.header = [text.strip() for text in header]
        self.header_text = self._text()
        self.header_line = self._start
        self.preamble = self._aside
        self._aside = []
        self._index = self._find(column)
        self.column = self.header[self._index]

    def blocks(self, rows: int, ready: Callable[[], bool] | None = None) -> Iterator[RowBlock]:
        """Blocks of at most `rows` rows; the last one may hold comments alone.

        With `ready`, which says whether more lines are at hand, a block ends where the next row would have to be
        waited for, or after a quarter of a second.
        """
        width, index = len(self.header), self._index
        block = RowBlock()
        start = time.monotonic()
        while (fields := self._next()) is not None:
            if len(fields) != width:
                raise DataFileError(
                    f"this row has {len(fields)} {'field' if len(fields) == 1 else 'fields'}, the header has {width}: "
                    f"{', '.join(self.header)}{delimiter_hint(self.header)}",
                    path=self.name,
                    row=self._start,
                )
            if self._aside:
                self._hand_over(block)
            block.column.append(fields[index])
            block.texts.append(self._text())
            block.lines.append(self._start)
            full = len(block) == rows
            if full or (ready is not None and (time.monotonic() - start > _LONGEST_WAIT_S or not ready())):
                yield block
                block = RowBlock()
                start = time.monotonic()
        self._hand_over(block)
        if len(block) or block.aside:
            yield block

    def _hand_over(self, block: RowBlock) -> None:
        block.aside.extend((len(block), text) for text in self._aside)
        self._aside = []

    def _feed(self, stream: Iterable[str]) -> Iterator[str]:
        """Lines for the parser; comments and blank lines between rows are set aside."""
        size = 0
        # A line without an end would else be read until memory is.
        read = getattr(stream, "readline", None)
        for line in stream if read is None else iter(partial(read, _LONGEST_ROW + 1), ""):
            self._line += 1
            self._check(line)
            if self._line == 1:
                line = line.removeprefix("\ufeff")
                if line.endswith("\r\n"):
                    self.newline = "\r\n"
            if self._fresh:
                if line.startswith("#") or not line.strip():
                    self._aside.append(line.rstrip("\r\n"))
                    continue
                self._start = self._line
                self._fresh = False
                self._raw, size = [line], len(line)
            else:
                self._raw.append(line)
                size += len(line)
            if size > _LONGEST_ROW:
                raise DataFileError(
                    f"this row has more than {_LONGEST_ROW} characters; is a quote left open, or is the file no text?",
                    path=self.name,
                    row=self._start,
                )
            yield line

    def _check(self, line: str) -> None:
        """Refuse what is no text."""
        if "\0" in line:
            raise DataFileError("this line holds a NUL character: the file is no text", path=self.name, row=self._line)
        if line.isascii():
            return
        try:
            line.encode("utf-8")
        except UnicodeEncodeError as error:
            byte = ord(line[error.start]) & 0xFF
            raise DataFileError(
                f"this line is no UTF-8 text (byte 0x{byte:02x} after {error.start} characters); save the file as "
                "UTF-8",
                path=self.name,
                row=self._line,
            ) from error

    def _next(self) -> list[str] | None:
        """Fields of the next row, or None at the end."""
        self._fresh = True
        try:
            return next(self._rows, None)
        except csv.Error as error:
            # The parser's limit to a field is met where a quote is opened and never closed.
            why = f"{error}; is a quote left open?" if "limit" in str(error) or "end of data" in str(error) else error
            raise DataFileError(f"this row cannot be read: {why}", path=self.name, row=self._start) from error
        except UnicodeDecodeError as error:
            raise DataFileError(
                f"this is no UTF-8 text ({error.reason} near here); save the file as UTF-8",
                path=self.name,
                row=self._line + 1,
            ) from error

    def _text(self) -> str:
        return "".join(self._raw).rstrip("\r\n")

    def _find(self, column: str | None) -> int:
        if column is None:
            return 0
        places = [i for i, name in enumerate(self.header) if name == column]
        if len(places) != 1:
            how = "no column" if not places else f"{len(places)} columns"
            raise DataFileError(
                f"there is {how} called {column!r}; the header has {', '.join(self.header)}"
                + delimiter_hint(self.header),
                path=self.name,
                row=self._start,
            )
        return places[0]
