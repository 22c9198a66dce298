"""Plain values to JSON and back without loss: numbers, texts, arrays, sequences and mappings.

A float64 is written as the shortest decimal that reads back to it, so it keeps every bit; an int64 is written whole.
What JSON has no word for is spelled out:

    an array               {"array": "float64", "shape": [2, 3], "values": [...]}     (or int64, bool)
    infinity, not a number {"float": "inf"}, in arrays of float64 the text "inf", "-inf" or "nan"
    a mapping              {"mapping": {"name": ...}}, or {"pairs": [[key, ...], ...]} where keys are no texts
    a path                 {"path": "..."}
    an object              {"kind": "Site", ...}

A sequence is a JSON array, and comes back as a tuple.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path
from types import MappingProxyType
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError, InvalidInput

__all__ = ["array_of", "damaged", "decoded", "encoded", "numbers_of", "shape_of"]

_SPECIAL: Final = {"inf": math.inf, "-inf": -math.inf, "nan": math.nan}
_DTYPES: Final = {"f": "float64", "i": "int64", "u": "int64", "b": "bool"}
_TYPES: Final[dict[str, set[type]]] = {"float64": {float, int, str}, "int64": {int}, "bool": {bool}}


def damaged(what: str) -> DataFileError:
    """The error for a document that does not hold what it should."""
    return DataFileError(f"damaged document: {what}; write it anew with tscale.serial.to_json")


def encoded(value: Any, known: Callable[[Any], dict[str, Any]]) -> Any:
    """A value as what the JSON writer takes; `known` turns objects into mappings with a `kind`.

    Raises
    ------
    InvalidInput
        Arrays of other types than float64, int64 and bool, and whatever `known` refuses.
    """
    if isinstance(value, np.generic):
        value = value.item()
    if value is None or isinstance(value, bool | int):
        return value
    if isinstance(value, str):
        return str(value)
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else {"float": _special(value)}
    if isinstance(value, np.ndarray):
        return {"array": _dtype(value), "shape": list(value.shape), "values": numbers_of(value)}
    if isinstance(value, Path):
        return {"path": str(value)}
    if isinstance(value, tuple | list) and not hasattr(value, "_fields"):
        return [encoded(item, known) for item in value]
    if type(value) in (dict, MappingProxyType):
        items = [(key, encoded(held, known)) for key, held in value.items()]
        if all(isinstance(key, str) for key in value):
            return {"mapping": {str(key): held for key, held in items}}
        return {"pairs": [[encoded(key, known), held] for key, held in items]}
    return known(value)


def numbers_of(array: npt.NDArray[Any]) -> list[Any]:
    """All items of an array, in C order."""
    if _dtype(array) == "float64" and not np.isfinite(array).all():
        return [v if math.isfinite(v) else _special(v) for v in array.ravel().tolist()]
    return list(array.ravel().tolist())


def _dtype(array: npt.NDArray[Any]) -> str:
    name = _DTYPES.get(array.dtype.kind, "")
    if not name or array.dtype.itemsize > 8 or (array.dtype == np.uint64 and bool(np.any(array > 2**63 - 1))):
        raise InvalidInput(f"arrays of float64, int64 and bool can be written, got {array.dtype}")
    return name


def _special(value: float) -> str:
    return "nan" if math.isnan(value) else "inf" if value > 0 else "-inf"


def decoded(value: Any, build: Callable[[dict[str, Any]], Any]) -> Any:
    """Undo `encoded`; `build` makes an object of a mapping with a `kind`.

    Raises
    ------
    DataFileError
        For anything that `encoded` does not write.
    """
    if value is None or isinstance(value, bool | int | str):
        return value
    if isinstance(value, float):
        if not math.isfinite(value):
            raise damaged("a number beyond the range of float64")
        return value
    if isinstance(value, list):
        return tuple(decoded(item, build) for item in value)
    if not isinstance(value, dict):
        raise damaged(f"a {type(value).__name__} where a value should stand")
    if "kind" in value:
        return build(value)
    keys = set(value)
    if keys == {"array", "shape", "values"}:
        return array_of(value["array"], value["shape"], value["values"])
    if keys == {"float"} and isinstance(value["float"], str) and value["float"] in _SPECIAL:
        return _SPECIAL[value["float"]]
    if keys == {"path"} and isinstance(value["path"], str):
        return Path(value["path"])
    if keys == {"mapping"} and isinstance(value["mapping"], dict):
        return {key: decoded(held, build) for key, held in value["mapping"].items()}
    if keys == {"pairs"} and isinstance(value["pairs"], list):
        return dict(_pair(item, build) for item in value["pairs"])
    raise damaged(f"nothing is written as a mapping of {', '.join(sorted(keys)) or 'nothing'}")


def _pair(item: Any, build: Callable[[dict[str, Any]], Any]) -> tuple[Any, Any]:
    if not isinstance(item, list) or len(item) != 2 or isinstance(item[0], dict | list):
        raise damaged("a pair of a mapping is not [key, value]")
    return item[0], decoded(item[1], build)


def shape_of(shape: Any) -> tuple[int, ...]:
    """A shape as a tuple of whole numbers."""
    if not isinstance(shape, list) or not all(type(n) is int and n >= 0 for n in shape):
        raise damaged(f"a shape is a list of whole numbers, got {shape!r:.60}")
    return tuple(shape)


def array_of(dtype: Any, shape: Any, values: Any) -> npt.NDArray[Any]:
    """An array from its type, its shape and its items."""
    if not isinstance(dtype, str) or dtype not in _TYPES:
        raise damaged(f"arrays are of {', '.join(_TYPES)}, got {dtype!r:.60}")
    size = shape_of(shape)
    if not isinstance(values, list) or len(values) != math.prod(size):
        count = len(values) if isinstance(values, list) else "no list of"
        raise damaged(f"{count} values for an array of shape {size}")
    types = set(map(type, values))
    if not types <= _TYPES[dtype]:
        raise damaged(f"values of an array of {dtype} are {', '.join(sorted(t.__name__ for t in types))}")
    if str in types:
        values = [_SPECIAL.get(v, v) if isinstance(v, str) else v for v in values]
    try:
        array = np.array(values, dtype=dtype).reshape(size)
    except (ValueError, OverflowError) as error:
        raise damaged(f"values of an array that are no {dtype} ({error})") from error
    if dtype == "float64" and str not in types and not np.isfinite(array).all():
        raise damaged("a number beyond the range of float64")
    return array
