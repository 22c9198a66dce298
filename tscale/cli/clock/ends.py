"""The clocks of `tscale clock` as words on the command line."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final, Literal, NamedTuple, TypeAlias

if TYPE_CHECKING:
    from ...earth.observer import Observer
    from ...tables.reference import ReferenceData

__all__ = ["FORMS", "ClockEnd", "clock_end"]

FORMS: Final = """\
A clock is one of
  FILE.toml            [site] on the Earth, [surface] on the Moon or Mars, or [orbit] of elements
  FILE.csv             a flight: way points in columns instant (UTC), lon_deg, lat_deg and height_m
  FILE.oem, FILE.xml   a CCSDS Orbit Ephemeris Message
  FILE.bsp:NUMBER      a spacecraft of an SPK kernel, by its NAIF number
The rate of a [site] needs its geopotential_number_m2_s2 or height_above_geoid_m, or --gravity.
"""

Kind: TypeAlias = Literal["site", "surface", "orbit", "flight", "spacecraft"]


class ClockEnd(NamedTuple):
    """A clock as given."""

    text: str
    """The word on the command line."""
    kind: Kind
    """`orbit` is about the Earth, `spacecraft` about anything else."""
    observer: Observer

    @property
    def name(self) -> str:
        """Of the clock, as its file says."""
        return str(self.observer.name)


def clock_end(text: str, reference: ReferenceData) -> ClockEnd:
    """Read a clock; see `FORMS`."""
    from ...earth.site import Site
    from ...errors import InvalidInput
    from ...surface import SurfaceSite
    from ...trajectory import Trajectory
    from ...transforms.proper_models import is_near_earth
    from ..link_ends import end_of

    path = Path(text)
    if path.suffix.lower() == ".csv":
        return ClockEnd(text, "flight", Trajectory.from_flight(path, leap_seconds=reference.leap_seconds))
    try:
        found = end_of(text, reference)
    except InvalidInput as error:
        if "neither a body nor a file" not in str(error):
            raise
        raise InvalidInput(
            f"{text!r} is no clock and no file; a clock is a TOML file with [site], [surface] or [orbit], a flight "
            "(FILE.csv), an Orbit Ephemeris Message, or KERNEL.bsp:NUMBER"
        ) from error
    if isinstance(found, Site):
        return ClockEnd(text, "site", found)
    if isinstance(found, SurfaceSite):
        return ClockEnd(text, "surface", found)
    if isinstance(found, Trajectory):
        return ClockEnd(text, "orbit" if is_near_earth(found) else "spacecraft", found)
    raise InvalidInput(
        f"{text!r} is the centre of a body, where no clock is: give a TOML file with a [surface] table for a clock on "
        "the Moon or Mars, or a [site] on the Earth"
    )
