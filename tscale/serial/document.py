"""Objects to JSON documents and back: the head of a document, its hash, and the errors of a damaged one."""

from __future__ import annotations

import hashlib
import json
from functools import partial
from pathlib import Path
from typing import Any, Final, Literal, NoReturn

from ..errors import DataFileError, InvalidInput, ScaleMismatch, TscaleError
from ..tables.reference import ReferenceData
from .dated import DATED
from .kind import Context, Kind
from .moving import MOVING
from .results import RESULTS, OtherTables
from .values import damaged, decoded, encoded

__all__ = ["VERSION", "OtherTables", "from_json", "to_json"]

VERSION: Final = 1
"""Version of the layout. A reader understands its own and all before it."""

_BY_CLASS: Final[dict[type, Kind]] = {kind.cls: kind for kind in (*DATED, *MOVING, *RESULTS)}
_BY_NAME: Final[dict[str, Kind]] = {kind.name: kind for kind in _BY_CLASS.values()}
_HASH: Final = "document_sha256"
_OFFERED: Final = (
    "Instants, Site, SurfaceSite, Source, ClockLog, ClockNoise, ProperClock, Trajectory, ZonalField, HarmonicField, "
    "Chain, Ledger, Budget, WhatIf, Provenance, LinkSolution, TwoWaySolution, ClockComparison, Residuals and "
    "Explanation"
)
_TABLES: Final = "Tables are kept as files, and a chain's document names them with their hashes"
_ELSEWHERE: Final = {
    "CompiledChain": "keep it with its own save(path) and read it with tscale.load_compiled(path)",
    "ReferenceData": (
        "its tables are files: keep those, read them with ReferenceData.load, and give the bundle to from_json with "
        "reference=. A chain's document names the tables it reads with their hashes; to_json(chain.provenance()) "
        "writes that record alone"
    ),
    "LibraryReport": "it writes itself, with its own to_json()",
}
_HEAD: Final = ("kind", "version", _HASH)


def to_json(obj: Any, indent: int | None = None) -> str:
    """Write an object as a JSON document, ASCII, without an end of line.

    Parameters
    ----------
    obj : object
        `Instants`, `Site`, `SurfaceSite`, `Source`, `ClockLog`, `ClockNoise`, `ProperClock`, `Trajectory`, gravity
        fields, `Chain`; results: `Ledger`, `Budget`, `WhatIf`, `Provenance`, link solutions, clock comparisons,
        `Residuals` and `Explanation` of a cross-check.
    indent : int, optional
        Spaces a level; None writes one line.

    Returns
    -------
    str
        The same object gives the same bytes, on every machine. Floats read back to the last bit.

    Raises
    ------
    InvalidInput
        An object of another kind. Tables are files and named by their hashes; a compiled chain has its own `save`.
    TscaleError
        For a chain, what a table that it reads raises where it cannot be read.

    Notes
    -----
    An SPK kernel that a trajectory comes from is named by path and hash, everything else is in the text. A gravity
    field, a log or a path is there with all its numbers, and the name and hash of its file, if any; where that lay is
    not written, so that a log or an orbit that is read back has no `path`.
    """
    if type(obj) not in _BY_CLASS:
        _unknown(obj)
    body = encoded(obj, _object)
    document = {"kind": body.pop("kind"), "version": VERSION, **body}
    document[_HASH] = _digest(document)
    separators = (",", ":") if indent is None else (",", ": ")
    return json.dumps(document, indent=indent, separators=separators, allow_nan=False)


def from_json(
    text: str | bytes,
    *,
    reference: ReferenceData | None = None,
    tables: Literal["same", "any"] = "same",
    folder: str | Path | None = None,
) -> Any:
    """Read what `to_json` wrote.

    Parameters
    ----------
    text : str or bytes
    reference : ReferenceData, optional
        Tables for a chain; `ReferenceData.default()` if not given.
    tables : {"same", "any"}
        Whether a chain's tables must have the hashes they had, or those of `reference` are taken as they are, with an
        `OtherTables` warning that lists which differ.
    folder : path, optional
        Where kernels are looked for by name, before their old place.

    Returns
    -------
    object
        As it was. Of `LinkSolution`, `TwoWaySolution`, `ClockComparison`, `Residuals` and `Explanation`, which hold on
        to tables, motions or a chain, a mapping of their numbers (with Instants and arrays), whose `kind` tells what it
        was.

    Raises
    ------
    DataFileError
        A text that is no such document, is damaged (its hash says so) or was written by a later version; a chain of
        other tables, all of which are listed; a kernel that is missing or another one.
    MissingPiece
        A chain through a table that `reference` lacks.

    Notes
    -----
    Blanks and the order of keys do not matter to the hash, but numbers do, and 1.0 is not 1. A document that was
    changed by hand is read if its `document_sha256` is taken out.
    """
    if tables not in ("same", "any"):
        raise InvalidInput(f"tables must be 'same' or 'any', got {tables!r}")
    if not isinstance(text, str | bytes):
        raise InvalidInput(f"from_json reads a text, got {type(text).__name__}; read a file with path.read_text()")
    if reference is not None and not isinstance(reference, ReferenceData):
        raise InvalidInput(f"reference= takes a ReferenceData, got {type(reference).__name__}")
    document = _parsed(text)
    _check_head(document)
    body = {"kind": document["kind"], **{key: value for key, value in document.items() if key not in _HEAD}}
    context = Context(reference, folder, tables == "any")
    try:
        return decoded(body, partial(_built, context=context))
    except TscaleError as error:
        # What files and tables say passes as it is.
        if not isinstance(error, InvalidInput | ScaleMismatch):
            raise
        raise damaged(f"its {document['kind']} cannot be made: {error}") from error
    except (TypeError, ValueError, LookupError, AttributeError, ArithmeticError) as error:
        raise damaged(f"its {document['kind']} is put together wrongly ({error})") from error
    except RecursionError as error:
        raise damaged("it is nested too deeply") from error


def _object(value: Any) -> dict[str, Any]:
    if type(value) not in _BY_CLASS:
        _unknown(value)
    kind = _BY_CLASS[type(value)]
    return {"kind": kind.name, **{name: encoded(held, _object) for name, held in kind.take(value).items()}}


def _built(body: dict[str, Any], context: Context) -> Any:
    name = body["kind"]
    if not isinstance(name, str) or name not in _BY_NAME:
        raise damaged(f"nothing is of the kind {name!r:.60}")
    fields = {key: decoded(held, partial(_built, context=context)) for key, held in body.items() if key != "kind"}
    return _BY_NAME[name].build(fields, context)


def _parsed(text: str | bytes) -> dict[str, Any]:
    try:
        document = json.loads(text, parse_constant=_no_constant, object_pairs_hook=_no_doubles)
    except RecursionError as error:
        raise damaged("it is nested too deeply") from error
    except ValueError as error:
        if isinstance(error, DataFileError):
            raise
        row = getattr(error, "lineno", None)
        raise DataFileError(
            f"no JSON document: {error}; give the text that tscale.serial.to_json wrote", row=row
        ) from error
    if not isinstance(document, dict):
        raise DataFileError(f"a document is a JSON object with kind and version, got {type(document).__name__}")
    return document


def _no_constant(text: str) -> Any:
    raise damaged(f"{text} is no JSON number")


def _no_doubles(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        names = [name for name, _ in pairs]
        raise damaged(f"{next(n for n in names if names.count(n) > 1)!r} stands in it twice")
    return found


def _check_head(document: dict[str, Any]) -> None:
    version = document.get("version")
    if not isinstance(document.get("kind"), str) or type(version) is not int or version < 1:
        raise DataFileError("a document of tscale says its kind (a text) and its version (a whole number from 1)")
    if version > VERSION:
        raise DataFileError(
            f"this {document['kind']:.60} has layout {version}, written by a later version of tscale; this one reads "
            f"up to {VERSION}: upgrade tscale"
        )
    if document["kind"] not in _BY_NAME:
        raise DataFileError(f"no document holds a {document['kind']:.60}; there are those of {_OFFERED}")
    stated = document.get(_HASH)
    if stated is not None and stated != _digest({key: v for key, v in document.items() if key != _HASH}):
        raise DataFileError(
            f"damaged document: the SHA-256 of this {document['kind']} does not fit what it holds. Write it anew with "
            "tscale.serial.to_json; if it was changed by hand and is to be read so, take document_sha256 out of it"
        )


def _digest(document: dict[str, Any]) -> str:
    """Over the content, whatever the order of keys and the blanks."""
    text = json.dumps(document, sort_keys=True, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()


def _unknown(value: Any) -> NoReturn:
    name = type(value).__name__
    remedy = _ELSEWHERE.get(name, f"it writes {_OFFERED}. {_TABLES}")
    raise InvalidInput(f"to_json has no layout for a {name}; {remedy}")
