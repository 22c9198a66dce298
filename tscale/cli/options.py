"""Options that several subcommands share, and what is made of them."""

from __future__ import annotations

import argparse
import os
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from ..earth.site import Site
    from ..source import Source
    from ..surface import SurfaceSite
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData
    from ..trajectory import Trajectory

__all__ = ["add_observer", "add_tables", "clocks_of", "observer_of", "reference_of", "source_of", "start_of"]


def add_tables(parser: argparse.ArgumentParser) -> None:
    """Add the options that replace a default table by a file."""
    parser.add_argument_group("project").add_argument(
        "--project",
        metavar="FILE",
        help="TOML file that names site, clocks, source and tables once, with the options' names as keys "
        "(clocks = [...]); options given win",
    )
    group = parser.add_argument_group(
        "tables", "each in place of the default one (see `tscale data`); imported:NAME for one that was imported"
    )
    group.add_argument("--ephemeris", metavar="FILE", help="SPK kernel; its time ephemeris is built once and kept")
    group.add_argument(
        "--time-ephemeris",
        metavar="FILE",
        help="SPK kernel with TT - TDB (body 1000000001), in place of the one built; without it a kernel that does not "
        "reach 1977 is anchored to the shipped one",
    )
    group.add_argument("--leap-seconds", metavar="FILE", help="IERS Leap_Second.dat or the leap-seconds.list layout")
    group.add_argument("--earth-orientation", metavar="FILE", help="IERS finals2000A or C04 file")
    group.add_argument(
        "--tt-bipm", metavar="FILE", action="append", default=[], help="BIPM table of TT(BIPMyy); repeatable"
    )
    group.add_argument(
        "--sub-daily",
        action=argparse.BooleanOptionalAction,
        help="add the tidal variations of Earth rotation within a day to the table (IERS 2010; 3 cm, 0.1 ns)",
    )


def add_observer(parser: argparse.ArgumentParser) -> None:
    """Add the options that say where the clock is, how it was compared, and where the signal comes from."""
    group = parser.add_argument_group("observer, clock and source")
    group.add_argument(
        "--site",
        metavar="FILE",
        help="TOML file with a [site] table, or a [surface] table for a place on the Moon or a planet; needed for TCB "
        "and TDB there",
    )
    group.add_argument(
        "--solid-tide",
        action=argparse.BooleanOptionalAction,
        help="let the site move with the tide of the solid Earth (IERS 2010; 0.4 m, 1.3 ns), as `solid_tide = true` in "
        "its file does",
    )
    group.add_argument(
        "--orbit",
        metavar="FILE",
        help="a moving observatory in place of --site: CCSDS Orbit Ephemeris Message, TOML file with an [orbit] table, "
        "or KERNEL.bsp:NUMBER",
    )
    group.add_argument(
        "--clock",
        metavar="FILE",
        action="append",
        default=[],
        help="comparison log, CSV with epoch, offset_s (clock minus reference), uncertainty_s, reference, clock; "
        "repeatable: CLOCK(x) by UTC(k), UTC(k) by UTC. Logs of one clock are joined. FILE:LAB takes UTC(LAB) out of a "
        "BIPM Circular T",
    )
    group.add_argument(
        "--interpolation",
        choices=("linear", "cubic", "step"),
        help="between comparisons of a log (default: what the log says, else linear)",
    )
    group.add_argument(
        "--max-gap-s", metavar="S", type=float, help="no interpolation between comparisons further apart than this"
    )
    group.add_argument("--source", metavar="FILE", help="TOML file with a [source] table; needed for another place")
    group.add_argument("--ra", metavar="DEG", type=float, help="ICRS right ascension of the source, degrees")
    group.add_argument("--dec", metavar="DEG", type=float, help="ICRS declination of the source, degrees")
    group.add_argument(
        "--second-order",
        action=argparse.BooleanOptionalAction,
        help="add the second-order gravitational delay of the Sun (18 ns at its limb)",
    )


def reference_of(args: argparse.Namespace) -> ReferenceData:
    """Build the tables that `add_tables` asked for."""
    from ..tables.reference import ReferenceData

    reference = ReferenceData.load(
        leap_seconds=args.leap_seconds,
        earth_orientation=args.earth_orientation,
        tt_bipm=args.tt_bipm,
        ephemeris=args.ephemeris,
        time_ephemeris=args.time_ephemeris,
    )
    if args.sub_daily:
        reference = reference.replace(earth_orientation=reference.earth_orientation.with_sub_daily())
    return reference


def observer_of(args: argparse.Namespace, reference: ReferenceData) -> Site | SurfaceSite | Trajectory | None:
    """Read the site or the orbit, if one is given."""
    from ..errors import InvalidInput
    from ..storage import read_toml

    if args.orbit is not None:
        from ..trajectory import Trajectory
        from .link_ends import end_of

        if args.solid_tide:
            raise InvalidInput("--solid-tide is for a --site; an --orbit does not stand on the ground")
        if args.site is not None:
            raise InvalidInput("give the observer by --site FILE or by --orbit FILE, not by both")
        orbit = end_of(args.orbit, reference)
        if not isinstance(orbit, Trajectory):
            raise InvalidInput(
                f"--orbit {args.orbit} is not an orbit: give an Orbit Ephemeris Message, [orbit] or KERNEL.bsp:N"
            )
        return orbit
    if args.site is None:
        if args.solid_tide:
            raise InvalidInput("--solid-tide moves a site: give it by --site FILE")
        return None
    if "surface" in read_toml(Path(args.site)):
        from ..surface import SurfaceSite

        if args.solid_tide:
            raise InvalidInput(f"--solid-tide is of the Earth; {args.site} is a place on another body")
        return SurfaceSite.load(args.site)
    from ..earth.site import Site

    site = Site.load(args.site)
    return site if args.solid_tide is None else replace(site, solid_tide=args.solid_tide)


def source_of(args: argparse.Namespace) -> Source | None:
    """Make the source of `--source`, or of `--ra` and `--dec`."""
    from ..errors import InvalidInput
    from ..source import Source

    direction = (args.ra, args.dec)
    if args.source is not None:
        if direction != (None, None):
            raise InvalidInput("give the source by --source FILE, or by --ra and --dec, not by both")
        return Source.load(args.source)
    if direction == (None, None):
        return None
    if None in direction:
        raise InvalidInput("--ra and --dec belong together: give both, in degrees")
    return Source(ra_deg=args.ra, dec_deg=args.dec)


def clocks_of(args: argparse.Namespace, reference: ReferenceData) -> list[ClockLog]:
    """Read the logs in the order given; those of one clock are joined.

    Raises
    ------
    InvalidInput
        For logs of one clock against different references.
    """
    from ..errors import InvalidInput
    from ..tables.clock_log import ClockLog
    from .project import check_clocks, with_noise

    found: dict[str, list[tuple[str, ClockLog]]] = {}
    for path in args.clock:
        log = _circular(path, reference) or _csv(path, args, reference)
        others = found.setdefault(log.scale, [])
        if others and others[0][1].reference != log.reference:
            first, before = others[0]
            raise InvalidInput(
                f"{first} compares {log.scale} with {before.reference}, and {path} with {log.reference}: there "
                "would be two ways from it; give one of them"
            )
        others.append((path, log))
    check_clocks(args, set(found))
    return [
        with_noise(logs[0][1] if len(logs) == 1 else ClockLog.joined([log for _, log in logs]), args)
        for logs in found.values()
    ]


def _csv(path: str, args: argparse.Namespace, reference: ReferenceData) -> ClockLog:
    """A log of comparisons in a CSV file."""
    from ..errors import DataFileError
    from ..tables.clock_log import ClockLog

    try:
        return ClockLog.load(
            path,
            interpolation=args.interpolation,
            max_gap_s=args.max_gap_s,
            leap_seconds=reference.leap_seconds,
        )
    except DataFileError as error:
        if error.row is None:
            raise
        message = f"{error} (`tscale inspect LOG` lists all that is odd in it)"
        raise DataFileError(message, row=error.row, path=error.path, mask=error.mask) from error


def _circular(path: str, reference: ReferenceData) -> ClockLog | None:
    """The laboratory's log of a circular given as FILE:LAB; None for anything else."""
    file, colon, laboratory = path.rpartition(":")
    if not colon or not laboratory or os.path.exists(path) or not os.path.isfile(file):
        return None
    from ..tables.circular_t import read_circular

    return read_circular(file, laboratory, leap_seconds=reference.leap_seconds)


def start_of(clocks: Sequence[ClockLog]) -> str:
    """What dates are when nothing is said: of the one clock that is no other's reference, or UTC without clocks.

    Raises
    ------
    InvalidInput
        Where several clocks, or none, could be meant.
    """
    from ..errors import InvalidInput

    if not clocks:
        return "UTC"
    references = {log.reference for log in clocks}
    outer = [log.scale for log in clocks if log.scale not in references]
    if len(outer) != 1:
        known = ", ".join(outer or sorted({log.scale for log in clocks}))
        raise InvalidInput(f"the dates may be those of {known}: say which with --from")
    return outer[0]
