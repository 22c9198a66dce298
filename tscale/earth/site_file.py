"""The TOML file of a site.

Layout::

    [site]
    name = "Tern Rock"
    itrf = { x_m = -4052051.8, y_m = 4212836.1, z_m = -2545106.0 }
    # or: geodetic = { lon_deg = 133.88, lat_deg = -23.67, height_m = 189.3 }   on WGS84
    velocity_m_yr = [-0.04, -0.005, 0.05]     # the rest is optional
    epoch_jyear = 2010.0
    frame = "ITRF2020"
    geopotential_number_m2_s2 = 1840.5
    height_above_geoid_m = 188.0
    solid_tide = true                         # the Moon and the Sun move the site; false if left out
"""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, Final, TypeVar

from ..errors import DataFileError, InvalidInput
from ..storage import read_toml

__all__ = ["read_site", "site_text"]

_Made = TypeVar("_Made")

_ITRF: Final = ("x_m", "y_m", "z_m")
_GEODETIC: Final = ("lon_deg", "lat_deg", "height_m")
_OPTIONAL: Final = (
    "velocity_m_yr",
    "epoch_jyear",
    "frame",
    "geopotential_number_m2_s2",
    "height_above_geoid_m",
    "solid_tide",
)
_KEYS: Final = ("name", "itrf", "geodetic", *_OPTIONAL)


def read_site(path: Path, from_itrf: Callable[..., _Made], from_geodetic: Callable[..., _Made]) -> _Made:
    """Read the file and build a site with one of the two makers; every fault is a `DataFileError` with the path."""
    document = read_toml(path)
    _only(path, "the file", document, ("site",))
    table = document.get("site")
    if not isinstance(table, dict):
        raise DataFileError(f"site file {path} has no [site] table; it holds {', '.join(_KEYS)}", path=path)
    _only(path, "[site]", table, _KEYS, _advice(table))
    if "name" not in table:
        raise DataFileError(f"site file {path}: [site] needs a name", path=path)
    if ("itrf" in table) == ("geodetic" in table):
        raise DataFileError(
            f"site file {path}: [site] needs exactly one of itrf = {{ {', '.join(_ITRF)} }} and "
            f"geodetic = {{ {', '.join(_GEODETIC)} }}",
            path=path,
        )
    kind, keys, make = ("itrf", _ITRF, from_itrf) if "itrf" in table else ("geodetic", _GEODETIC, from_geodetic)
    place = table[kind]
    if not isinstance(place, dict) or any(key not in place for key in keys):
        raise DataFileError(f"site file {path}: {kind} needs all of {', '.join(keys)}, got {place!r}", path=path)
    _only(path, kind, place, keys)
    try:
        return make(table["name"], *(place[key] for key in keys), **{k: table[k] for k in _OPTIONAL if k in table})
    except InvalidInput as error:
        raise DataFileError(f"site file {path}: {error}", path=path) from error


def site_text(facts: Mapping[str, Any]) -> str:
    """Write the text of a site file; values of None are left out."""
    lines = ["[site]"]
    lines += [f"{key} = {_toml(value)}" for key, value in facts.items() if value is not None]
    return "\n".join(lines) + "\n"


def _toml(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        # Names are printable, and for printable text a JSON string is also a TOML basic string.
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{key} = {_toml(part)}" for key, part in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_toml(part) for part in value) + "]"
    return repr(float(value))


def _advice(table: Mapping[str, Any]) -> str:
    """The line to write where coordinates stand outside a table of theirs."""
    for kind, keys in (("geodetic", _GEODETIC), ("itrf", _ITRF)):
        if any(key in table for key in keys):
            return f"; write {kind} = {{ {', '.join(f'{key} = ...' for key in keys)} }}"
    return ""


def _only(path: Path, where: str, table: Mapping[str, Any], allowed: tuple[str, ...], advice: str = "") -> None:
    unknown = [key for key in table if key not in allowed]
    if unknown:
        raise DataFileError(
            f"site file {path}: unknown key {', '.join(unknown)} in {where}; allowed are {', '.join(allowed)}{advice}",
            path=path,
        )
