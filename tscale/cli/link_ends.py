"""The ends of a link as words on the command line."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from ..link import Participant
    from ..tables.reference import ReferenceData
    from ..trajectory import Trajectory

__all__ = ["FORMS", "end_of"]

FORMS: Final = """\
An end of a link is one of
  moon, mars, 10 ...   the centre of a body of the ephemeris (a planet is its system's centre of mass)
  FILE.toml            [site] on the Earth, [surface] on the Moon, Mars, Venus or Mercury, or [orbit] of elements
  FILE.oem, FILE.xml   a CCSDS Orbit Ephemeris Message
  FILE.bsp:NUMBER      a body or spacecraft of an SPK kernel, by its NAIF number
"""

_ORBIT: Final = (
    "name",
    "epoch",
    "scale",
    "a_m",
    "e",
    "i_deg",
    "node_deg",
    "periapsis_deg",
    "mean_anomaly_deg",
    "center",
)


def end_of(text: str, reference: ReferenceData) -> Participant:
    """Read one end; see `FORMS`."""
    from ..ephemeris import BODY_IDS
    from ..errors import InvalidInput
    from ..tables.imported import resolved
    from ..trajectory import Trajectory

    if text.strip().lower() in BODY_IDS:
        return text
    if text.strip().lstrip("-").isdigit():
        return int(text)
    file, colon, number = text.rpartition(":")
    if colon and number.lstrip("-").isdigit():
        return Trajectory.from_spk(resolved(file), int(number))
    path = Path(text)
    if path.suffix.lower() == ".toml":
        return _from_toml(path, reference)
    if path.is_file():
        return Trajectory.from_oem(path, leap_seconds=reference.leap_seconds)
    raise InvalidInput(
        f"{text!r} is neither a body nor a file; bodies are {', '.join(BODY_IDS)} or a NAIF number, files are a TOML "
        "file with [site], [surface] or [orbit], an Orbit Ephemeris Message, or KERNEL.bsp:NUMBER"
    )


def _from_toml(path: Path, reference: ReferenceData) -> Participant:
    from ..earth.site import Site
    from ..errors import DataFileError
    from ..storage import read_toml
    from ..surface import SurfaceSite

    document = read_toml(path)
    kinds = [kind for kind in ("site", "surface", "orbit") if kind in document]
    if len(kinds) != 1:
        raise DataFileError(
            f"an end of a link needs one table of [site], [surface] and [orbit], got {kinds}", path=path
        )
    if kinds == ["site"]:
        return Site.load(path)
    if kinds == ["surface"]:
        return SurfaceSite.load(path)
    return _orbit(path, reference)


def _orbit(path: Path, reference: ReferenceData) -> Trajectory:
    from ..errors import DataFileError, TscaleError
    from ..instants import Instants
    from ..storage import toml_table
    from ..trajectory import Trajectory

    table = toml_table(path, "orbit", _ORBIT, _ORBIT)
    wrong = [key for key in _ORBIT[3:9] if isinstance(table[key], bool) or not isinstance(table[key], int | float)]
    if wrong:
        raise DataFileError(f"[orbit]: {', '.join(wrong)} must be numbers", path=path)
    try:
        epoch = Instants.from_iso(str(table["epoch"]), str(table["scale"]), leap_seconds=reference.leap_seconds)
        elements = {key: float(table[key]) for key in _ORBIT[3:9]}
        return Trajectory.from_kepler(epoch, **elements, center=table["center"], name=str(table["name"]))
    except TscaleError as error:
        raise DataFileError(f"[orbit]: {error}", path=path) from error
