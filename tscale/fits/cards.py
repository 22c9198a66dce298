"""The cards of a FITS header: values by the digits they are written with, and changes that leave all other bytes alone.

FITS Standard 4.0, section 4: a card has 80 characters; numbers may carry more digits than a float64 holds, and are
given here as exact decimals.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from decimal import Decimal
from typing import Any, Final, TypeAlias

from ..errors import DataFileError, InvalidInput

__all__ = ["CARD", "Cards", "Value"]

CARD: Final = 80
Value: TypeAlias = "str | bool | int | float | Decimal"

_STRING: Final = re.compile(r" *'((?:[^']|'')*)' *(?:/.*)?\Z")
_OTHER: Final = re.compile(r" *([^ /']*) *(?:/.*)?\Z")
_NUMBER: Final = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[EeDd][+-]?\d+)?\Z")
_KEYWORD: Final = re.compile(r"[A-Z0-9_-]{1,8}\Z")
_LARGEST_EXPONENT: Final = 330  # those of a float64 end at 308 and -324
_TEXT_WIDTH: Final = 72  # of a commentary card


class Cards:
    """The cards of one header.

    Parameters
    ----------
    images : iterable of str
        Cards of 80 characters, without END.
    where : str
        The HDU, for messages.
    path : str or None
        The file, for messages.
    given : mapping, optional
        Values that stand in place of those in the header.
    """

    def __init__(
        self,
        images: Iterable[str],
        where: str = "header",
        path: Any = None,
        given: Mapping[str, Value] | None = None,
    ) -> None:
        self.images = list(images)
        self.where, self.path = where, path
        self.given = {key.upper(): value for key, value in (given or {}).items()}
        self._places: dict[str, list[int]] = {}
        self._index()

    @classmethod
    def of(cls, header: Any, given: Mapping[str, Value] | None = None) -> Cards:
        """Take cards as they are, the bytes or the text of a header, an astropy Header, or a mapping."""
        if isinstance(header, Cards):
            return cls(header.images, header.where, header.path, {**header.given, **(given or {})})
        if isinstance(header, bytes | bytearray):
            header = bytes(header).decode("ascii", errors="replace")
        tostring = getattr(header, "tostring", None)
        if tostring is not None:
            header = tostring(sep="", endcard=False, padding=False)
        if isinstance(header, str):
            if len(header) % CARD:
                raise InvalidInput(f"the text of a header is cards of {CARD} characters; got {len(header)} characters")
            images = [header[i : i + CARD] for i in range(0, len(header), CARD)]
            ends = [i for i, image in enumerate(images) if image.rstrip() == "END"]
            return cls(images[: ends[0]] if ends else images, given=given)
        if isinstance(header, Mapping):
            made = cls([], given=given)
            for key, value in header.items():
                made.set(str(key).upper(), value)
            return made
        raise InvalidInput(
            f"a header is an astropy Header, a mapping, or the text or bytes of its cards; got {type(header).__name__}"
        )

    def _index(self) -> None:
        self._places = {}
        for at, image in enumerate(self.images):
            if image[8:10] == "= ":
                self._places.setdefault(image[:8].rstrip(), []).append(at)

    def __contains__(self, keyword: str) -> bool:
        return keyword in self.given or keyword in self._places

    def __iter__(self) -> Any:
        return iter(dict.fromkeys([*self._places, *self.given]))

    # ---- values ----------------------------------------------------------------------------------

    def token(self, keyword: str) -> str | None:
        """The value of a number or logical as it is written; None where the card is missing or has no value."""
        if keyword in self.given:
            return _token(self.given[keyword])
        found = dict.fromkeys(self._read(at, keyword)[0] for at in self._places.get(keyword, ()))
        if len(found) > 1:
            values = ", ".join(map(str, found))
            raise self.fault(
                f"{keyword} stands there several times, with the values {values}. Say which holds, by "
                f"cards={{'{keyword}': ...}}"
            )
        return next(iter(found), None)

    def _read(self, at: int, keyword: str) -> tuple[str | None, bool]:
        """(value, whether it is a string)."""
        text = self.images[at][10:]
        quoted = _STRING.match(text)
        if quoted:
            value = quoted[1].replace("''", "'").rstrip()
            following = at + 1
            while value.endswith("&") and following < len(self.images):
                more = _STRING.match(self.images[following][8:].lstrip())
                if not self.images[following].startswith("CONTINUE") or more is None:
                    break
                value, following = value[:-1] + more[1].replace("''", "'").rstrip(), following + 1
            return value, True
        plain = _OTHER.match(text)
        if plain is None:
            raise self.fault(f"the card of {keyword} cannot be read: {self.images[at].rstrip()!r}")
        return plain[1] or None, False

    def text(self, keyword: str) -> str | None:
        """A string, without blanks behind it; None where it is missing or blank."""
        value = self.token(keyword)
        if value is None:
            return None
        if keyword not in self.given and not self._read(self._places[keyword][0], keyword)[1]:
            raise self.fault(f"{keyword} must be a string in quotes, and is {value}")
        return value.strip() or None

    def number(self, keyword: str) -> Decimal | None:
        """A number by all its digits; None where it is missing."""
        value = self.token(keyword)
        if value is None:
            return None
        if not _NUMBER.match(value):
            raise self.fault(f"{keyword} must be a number, and is {value!r}")
        number = Decimal(value.upper().replace("D", "E"))
        if number and not -_LARGEST_EXPONENT < number.adjusted() <= _LARGEST_EXPONENT:
            raise self.fault(f"{keyword} is beyond the numbers of a float64: {value}")
        return number

    def integer(self, keyword: str, least: int | None = None, most: int = 2**62) -> int:
        """A whole number that must be there."""
        value = self.number(keyword)
        if value is None:
            raise self.fault(f"{keyword} is missing")
        if value != int(value) or value > most or (least is not None and value < least):
            allowed = "" if least is None else f" from {least} to {most}"
            raise self.fault(f"{keyword} must be a whole number{allowed}, and is {value}")
        return int(value)

    def true(self, keyword: str) -> bool:
        """Whether a logical is there and T."""
        return self.token(keyword) == "T"

    def fault(self, message: str) -> DataFileError:
        """An error that names the file and the HDU."""
        place = self.where if self.path is None else f"{self.path}, {self.where}"
        return DataFileError(f"{place}: {message}", path=self.path)

    def contradiction(self, message: str, *keywords: str) -> DataFileError:
        """A fault of keywords that do not go together, with what to do about it."""
        ways = " or ".join(f"cards={{'{keyword}': ...}}" for keyword in dict.fromkeys(keywords))
        return self.fault(f"{message}. Give the one that is wrong its right value, by {ways}")

    def order(self, keywords: Iterable[str]) -> list[str]:
        """Those keywords that are there, as they follow each other."""
        there = [keyword for keyword in keywords if keyword in self._places]
        return sorted(there, key=lambda keyword: self._places[keyword][0])

    # ---- changes ---------------------------------------------------------------------------------

    def copy(self) -> Cards:
        """The same cards, to be changed."""
        return Cards(self.images, self.where, self.path)

    def set(self, keyword: str, value: Value, comment: str = "", after: str | None = None) -> None:
        """Give a keyword a value: in its place, behind another one, or at the end."""
        if not _KEYWORD.match(keyword):
            raise InvalidInput(f"{keyword!r} is no FITS keyword: up to 8 of A-Z, 0-9, - and _")
        image = _image(keyword, value, comment)
        there = self._places.get(keyword, [])
        if there:
            first = there[0]
            self.delete(keyword)
            self.images.insert(first, image)
        elif after is not None and after in self._places:
            self.images.insert(self._places[after][-1] + 1, image)
        else:
            self.images.insert(self._end(), image)
        self._index()

    def delete(self, keyword: str) -> None:
        """Take a card out, wherever it stands, with what continues it."""
        for at in reversed(self._places.get(keyword, [])):
            del self.images[at]
            while at < len(self.images) and self.images[at].startswith("CONTINUE"):
                del self.images[at]
        self._index()

    def add_history(self, lines: Iterable[str]) -> None:
        """Put HISTORY cards at the end, long lines folded between words."""
        folded = [part for line in lines for part in _folded(line)]
        at = self._end()
        self.images[at:at] = [f"HISTORY {line}".ljust(CARD) for line in folded]
        self._index()

    def _end(self) -> int:
        """Where new cards go: before blank ones that were left for them."""
        at = len(self.images)
        while at and not self.images[at - 1].strip():
            at -= 1
        return at

    def to_bytes(self) -> bytes:
        """The whole header: cards, END, and blanks up to a multiple of 2880 bytes."""
        text = "".join(self.images) + "END".ljust(CARD)
        return (text + " " * (-len(text) % 2880)).encode("ascii")


def _token(value: Value) -> str:
    if isinstance(value, bool):
        return "T" if value else "F"
    if isinstance(value, float):
        return repr(value).upper()
    return str(value)


def _image(keyword: str, value: Value, comment: str) -> str:
    if isinstance(value, str):
        if not (value.isascii() and value.isprintable()) or len(value) > 66:
            raise InvalidInput(f"{keyword} takes up to 66 printable ASCII characters, got {value!r}")
        quoted = "'" + value.replace("'", "''").ljust(8) + "'"
        text = f"{keyword:<8}= {quoted:<20}"
    else:
        text = f"{keyword:<8}= {_token(value):>20}"
    return (f"{text} / {comment}" if comment else text)[:CARD].ljust(CARD)


def _folded(line: str) -> list[str]:
    """Lines of up to 72 characters; what goes on is set in by two."""
    plain = "".join(c if " " <= c <= "~" else c.encode("unicode_escape").decode() for c in line)
    found, rest = [], plain
    while len(rest) > _TEXT_WIDTH:
        cut = rest.rfind(" ", 3, _TEXT_WIDTH + 1)
        cut = _TEXT_WIDTH if cut < 0 else cut
        found.append(rest[:cut].rstrip())
        rest = "  " + rest[cut:].lstrip()
    return [*found, rest.rstrip()]
