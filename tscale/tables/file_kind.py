"""What a file of data is, by its content: the table or kernel that its reader takes without complaint."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any, Final

from ..errors import DataFileError, TscaleError

__all__ = ["kind_of_file"]

_KERNEL_MARKS: Final = (b"DAF/SPK ", b"NAIF/DAF")


def kind_of_file(path: Path) -> str:
    """One of `leap seconds`, `Earth orientation`, `TT(BIPM)`, `ephemeris`, `time ephemeris` and `trajectory`.

    Raises
    ------
    DataFileError
        For a file that is none of these, or damaged; it tells what each reader found.
    """
    with path.open("rb") as file:
        if file.read(8) in _KERNEL_MARKS:
            return _kind_of_kernel(path)
    from ..formats.leap_seconds import LeapSeconds
    from .earth_orientation import EarthOrientation
    from .tt_bipm import TTBIPM

    readers: dict[str, Callable[[Path], Any]] = {
        "leap seconds": LeapSeconds.load,
        "Earth orientation": EarthOrientation.load,
        "TT(BIPM)": TTBIPM.load,
    }
    refused = {}
    for kind, read in readers.items():
        try:
            read(path)
        except TscaleError as error:
            refused[kind] = str(error).replace(f"{path}, ", "").replace(f"{path} ", "it ")
    read_as = [kind for kind in readers if kind not in refused]
    if len(read_as) == 1:
        return read_as[0]
    reasons = "; ".join(f"as {kind}: {text}" for kind, text in refused.items())
    raise DataFileError(
        f"this is no table that is known here, and no SPK kernel: {reasons}"
        if not read_as
        else f"this could be a table of {' or '.join(read_as)}",
        path=path,
    )


def _kind_of_kernel(path: Path) -> str:
    from ..ephemeris.kernel import Ephemeris
    from ..ephemeris.time_ephemeris import TIME_TARGET, TimeEphemeris

    bodies = set(Ephemeris.open(path).bodies)
    if 10 in bodies and bodies & {3, 399}:
        return "ephemeris"
    if TIME_TARGET in bodies:
        TimeEphemeris.open(path)
        return "time ephemeris"
    return "trajectory"
