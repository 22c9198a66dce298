"""A hash of what a value holds: equal for equal sites, orbits, sources and logs on every machine and in every run."""

from __future__ import annotations

import dataclasses
import hashlib
from collections.abc import Mapping, Set
from pathlib import Path
from typing import Any, Final

import numpy as np

from ..errors import InvalidInput
from ..instants import Instants

__all__ = ["content_sha256"]

_LEFT_OUT: Final = ("name", "path", "files")  # of a file, which may have another name elsewhere


def content_sha256(*values: Any) -> str:
    """SHA-256 over values: numbers to the last bit, arrays, texts, mappings, and what an object holds.

    Names and paths of objects do not count. An object that has its own `sha256` and is no dataclass, such as a kernel,
    stands by that, and by the mass parameters given with it.

    Raises
    ------
    InvalidInput
        For a value whose content cannot be told, such as an open file.
    """
    digest = hashlib.sha256()
    for value in values:
        _add(digest, value)
    return digest.hexdigest()


def _add(digest: Any, value: Any) -> None:
    if value is None or isinstance(value, bool | int | str | bytes):
        _put(digest, type(value).__name__, repr(value))
    elif isinstance(value, float):
        _put(digest, "float", value.hex())
    elif isinstance(value, np.generic):
        _add(digest, value.item())
    elif isinstance(value, np.ndarray):
        # Little-endian whatever the machine.
        array = np.ascontiguousarray(value.astype(value.dtype.newbyteorder("<"), copy=False))
        _put(digest, array.dtype.str, repr(value.shape))
        digest.update(array.tobytes())
    elif isinstance(value, Instants):
        _put(digest, "instants", f"{value.scale} {value.place}")
        _add(digest, value.pair)
    elif isinstance(value, Path):
        _put(digest, "path", "")
    elif isinstance(value, Mapping):
        _put(digest, "mapping", str(len(value)))
        for key in sorted(value, key=repr):
            _add(digest, key)
            _add(digest, value[key])
    elif isinstance(value, tuple | list):
        _put(digest, "sequence", str(len(value)))
        for item in value:
            _add(digest, item)
    elif isinstance(value, Set):
        _put(digest, "set", "".join(sorted(content_sha256(item) for item in value)))
    elif dataclasses.is_dataclass(value) and not isinstance(value, type):
        _put(digest, "object", type(value).__qualname__)
        for item in dataclasses.fields(value):
            if item.init and item.name not in _LEFT_OUT:
                _put(digest, "field", item.name)
                _add(digest, getattr(value, item.name))
    elif isinstance(getattr(value, "sha256", None), str):
        _put(digest, type(value).__qualname__, value.sha256)
        _add(digest, dict(getattr(value, "given_gm_m3_s2", {})))
    elif callable(value) and hasattr(value, "__qualname__"):
        _put(digest, "callable", f"{value.__module__}.{value.__qualname__}")
    elif isinstance(getattr(value, "__dict__", None), dict):
        _put(digest, "object", type(value).__qualname__)
        _add(digest, {key: held for key, held in vars(value).items() if key not in _LEFT_OUT})
    else:
        raise InvalidInput(
            f"the content of a {type(value).__name__} cannot be told; make it a dataclass, or give it a sha256"
        )


def _put(digest: Any, kind: str, text: str) -> None:
    # The length tells where a text ends, so that no two contents run together.
    digest.update(f"{kind}:{len(text)}:{text};".encode())
