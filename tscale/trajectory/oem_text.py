"""The words of an Orbit Ephemeris Message, in either form, with the line that each stands on."""

from __future__ import annotations

import xml.sax
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Final

import numpy as np

from ..errors import DataFileError
from ..exact import FloatArray
from ..storage import read_bytes

__all__ = ["OEMSegment", "read_segments"]

_LARGEST: Final = 1 << 30

_VERSIONS: Final = ("1.0", "2.0", "3.0")
_HEADER: Final = ("CREATION_DATE", "ORIGINATOR", "CLASSIFICATION", "MESSAGE_ID")
_META: Final = (
    "OBJECT_NAME",
    "OBJECT_ID",
    "CENTER_NAME",
    "REF_FRAME",
    "REF_FRAME_EPOCH",
    "TIME_SYSTEM",
    "START_TIME",
    "USEABLE_START_TIME",
    "USEABLE_STOP_TIME",
    "STOP_TIME",
    "INTERPOLATION",
    "INTERPOLATION_DEGREE",
)
_STATE: Final = ("X", "Y", "Z", "X_DOT", "Y_DOT", "Z_DOT")
_UNITS: Final = {**dict.fromkeys(_STATE[:3], "km"), **dict.fromkeys(_STATE[3:], "km/s")}


@dataclass
class OEMSegment:
    """One segment: its metadata by keyword, and its states in km and km/s."""

    path: Path
    row: int
    facts: dict[str, tuple[str, int]] = field(default_factory=dict)
    epochs: list[str] = field(default_factory=list)
    rows: list[int] = field(default_factory=list)
    states: list[tuple[float, ...]] = field(default_factory=list)

    def add_fact(self, key: str, value: str, row: int) -> None:
        """Keep one keyword; doubles, unknown ones and empty values are errors."""
        if key not in _META:
            raise _fault(self.path, row, f"unknown keyword {key} in the metadata; allowed are {', '.join(_META)}")
        if key in self.facts:
            raise _fault(self.path, row, f"{key} is given twice in one segment (first in line {self.facts[key][1]})")
        if not value:
            raise _fault(self.path, row, f"{key} has no value")
        self.facts[key] = (value, row)

    def add_state(self, epoch: str, words: list[str], row: int) -> None:
        """Keep one state: position and velocity (accelerations that follow are dropped)."""
        if len(words) not in (6, 9):
            raise _fault(
                self.path,
                row,
                f"a state is an epoch and 6 numbers (km, km/s), or 9 with accelerations; got {len(words)} numbers",
            )
        try:
            self.states.append(tuple(float(word) for word in words[:6]))
        except ValueError as error:
            raise _fault(self.path, row, f"not a number in {' '.join(words)!r}") from error
        self.epochs.append(epoch)
        self.rows.append(row)

    def need(self, key: str) -> str:
        """Value of a keyword that must be there."""
        if key not in self.facts:
            raise _fault(self.path, self.row, f"the segment that starts here has no {key}")
        return self.facts[key][0]

    def row_of(self, key: str) -> int:
        """Line of a keyword, or of the segment's start."""
        return self.facts[key][1] if key in self.facts else self.row

    @property
    def states_km(self) -> FloatArray:
        """States (n, 6) in km and km/s."""
        return np.array(self.states, dtype=np.float64).reshape(-1, 6)


def read_segments(path: Path) -> list[OEMSegment]:
    """Read the file in whichever form it has.

    Raises
    ------
    DataFileError
        With the line.
    """
    try:
        content = read_bytes(path, _LARGEST)
        text = content.decode("utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        raise DataFileError(f"cannot read the orbit ephemeris message {path}: {error}", path=path) from error
    segments = _read_xml(path, content) if text.lstrip().startswith("<") else _read_kvn(path, text)
    if not segments:
        raise DataFileError(f"{path} holds no segment of states", path=path)
    for segment in segments:
        if not segment.states:
            raise _fault(path, segment.row, "the segment that starts here has no states")
    return segments


def _fault(path: Path, row: int, message: str) -> DataFileError:
    return DataFileError(f"{path}, line {row}: {message}", path=path, row=row)


def _check_version(path: Path, row: int, version: str) -> None:
    if version not in _VERSIONS:
        raise _fault(path, row, f"version {version!r} of the message is not understood; known: {', '.join(_VERSIONS)}")


def _read_kvn(path: Path, text: str) -> list[OEMSegment]:
    """Key-value form (502.0-B, 5.2 and 7.3 to 7.4)."""
    segments: list[OEMSegment] = []
    part, row = "start", 0  # start, header, metadata, states, covariance
    for row, raw in enumerate(text.splitlines(), start=1):
        line = raw.strip()
        if not line or line == "COMMENT" or line.startswith("COMMENT "):
            continue
        key, separator, value = (word.strip() for word in line.partition("="))
        if part == "start":
            if key != "CCSDS_OEM_VERS":
                raise _fault(path, row, "an orbit ephemeris message starts with CCSDS_OEM_VERS = ...")
            _check_version(path, row, value)
            part = "header"
        elif part == "covariance":
            part = "states" if line == "COVARIANCE_STOP" else part
        elif line == "META_START" and part in ("header", "states"):
            segments.append(OEMSegment(path, row))
            part = "metadata"
        elif line == "META_STOP" and part == "metadata":
            part = "states"
        elif line == "COVARIANCE_START" and part == "states":
            part = "covariance"
        elif part == "metadata" and separator:
            segments[-1].add_fact(key, value, row)
        elif part == "header" and separator and key in _HEADER:
            continue
        elif part == "states" and not separator:
            epoch, *words = line.split()
            segments[-1].add_state(epoch, words, row)
        else:
            raise _fault(path, row, f"{line[:60]!r} does not belong here (in the {part} part of the message)")
    if part in ("metadata", "covariance"):
        raise _fault(path, row, f"the file ends within its {part}: it is cut off")
    return segments


def _read_xml(path: Path, content: bytes) -> list[OEMSegment]:
    """XML form (502.0-B, chapter 8; CCSDS 505.0-B)."""
    handler = _Handler(path)
    try:
        xml.sax.parseString(content, handler)
    except xml.sax.SAXParseException as error:
        row = error.getLineNumber() or 1
        raise _fault(path, row, f"not well-formed XML: {error.getMessage()}") from error
    except DataFileError:  # of the handler, and a ValueError as well
        raise
    except (xml.sax.SAXException, LookupError, ValueError) as error:
        # An encoding that Python does not know, or one of several bytes that the parser cannot take.
        raise DataFileError(f"cannot read the XML of {path}: {error}; save it as UTF-8", path=path) from error
    if not handler.messages:
        raise DataFileError(f"{path} holds no <oem> element: it is not an orbit ephemeris message", path=path)
    return handler.segments


class _Handler(xml.sax.ContentHandler):
    """Collects segments; elements that carry nothing needed here (comments, covariances) pass by."""

    def __init__(self, path: Path) -> None:
        super().__init__()
        self._path = path
        self._text: list[str] = []
        self._trail: list[str] = []
        self._state: dict[str, str] = {}
        self._state_row = 0
        self._locator: Any = None
        self.messages = 0
        self.segments: list[OEMSegment] = []

    def setDocumentLocator(self, locator: Any) -> None:  # noqa: N802 -- named by the SAX interface
        self._locator = locator

    @property
    def _row(self) -> int:
        return int(self._locator.getLineNumber() or 1)

    def startElement(self, name: str, attributes: Any) -> None:  # noqa: N802
        self._trail.append(name)
        self._text = []
        if name == "oem":
            self.messages += 1
            if self.messages > 1:
                raise _fault(self._path, self._row, "a second <oem>: split the file, one message each")
            _check_version(self._path, self._row, attributes.get("version", "(none)"))
        elif name == "segment" and "oem" in self._trail:
            self.segments.append(OEMSegment(self._path, self._row))
        elif name == "stateVector":
            self._state, self._state_row = {}, self._row
        elif name in _UNITS and self._parent == "stateVector":
            units = attributes.get("units", _UNITS[name])
            if units != _UNITS[name]:
                raise _fault(self._path, self._row, f"{name} is in {units!r}; allowed is {_UNITS[name]!r}")

    def characters(self, content: str) -> None:
        self._text.append(content)

    def endElement(self, name: str) -> None:  # noqa: N802
        value = "".join(self._text).strip()
        parent = self._parent
        if parent == "metadata" and name != "COMMENT" and self.segments:
            self.segments[-1].add_fact(name, value, self._row)
        elif parent == "stateVector" and name != "COMMENT":
            if name in self._state:
                raise _fault(self._path, self._row, f"{name} is given twice in one state vector: keep one of them")
            self._state[name] = value
        elif name == "stateVector" and self.segments:
            missing = [key for key in ("EPOCH", *_STATE) if not self._state.get(key)]
            if missing:
                raise _fault(self._path, self._state_row, f"a state vector without {', '.join(missing)}")
            self.segments[-1].add_state(self._state["EPOCH"], [self._state[key] for key in _STATE], self._state_row)
        self._trail.pop()
        self._text = []

    @property
    def _parent(self) -> str:
        return self._trail[-2] if len(self._trail) > 1 else ""
