"""`tscale clock`: the rate of a clock and its budget; two clocks compared; heights from a measured rate."""

from __future__ import annotations

import argparse
import json
import re
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

from ..options import add_tables, reference_of
from ..streams import is_standard_output, note, standard_output, written
from .answer import Answer
from .budget import add_uncertainties, budget_of
from .ends import FORMS, ClockEnd, clock_end
from .levelling import add_measured, checked_measured, levelled, with_potentials

if TYPE_CHECKING:
    from .orbit import OrbitSummary
    from .rates import Found, Model

__all__ = ["add_parser", "run"]

# How errors that speak of arrays and arguments speak on the command line.
_SPOKEN: Final = (
    (
        r"give the site geopotential_number_m2_s2= or height_above_geoid_m=, or give gravity=.*",
        "write geopotential_number_m2_s2 or height_above_geoid_m into its file, or give a gravity field by --gravity "
        "FILE",
    ),
    (
        r"^\d+ of \d+ dates of (the clock at .*) lie where (its .*) does not reach \((.*), without a gap [^)]*\)",
        r"--start or --stop is outside of what \2 reaches for \1, \3",
    ),
    (r"convert them with tscale\.chain first", "convert them with `tscale convert` first"),
    (r"against='([^']*)'", r"--against \1"),
    (r"^clock '.*': rate_offset ", "--set-offset "),
    (r": leave them out[^:]*$", ": choose --start and --stop within that"),
)
_TIDES: Final = ("zero_tide", "mean_tide", "tide_free")

_EPILOG: Final = (
    FORMS
    + """
One clock is compared with a coordinate time (TT is an ideal clock on the geoid), two with each other: CLOCK minus
CLOCK2, between the same two dates of that coordinate time. Without --start and --stop the dates are all that a flight
or an ephemeris covers. Of an orbit about the Earth the closed formulas are told as well, with the offset to set before
launch; of a clock on another body the mean and the periodic terms over whole periods.

examples:
  tscale clock laboratory.toml --start 2025-03-01 --stop 2025-04-01 --height-sigma 0.03
  tscale clock upper.toml lower.toml --start 2025-03-01 --stop 2025-03-08 --measured 1.652e-15 --measured-sigma 6e-18
  tscale clock flight.csv laboratory.toml --height-sigma 30,0.03 --speed-sigma 2,0 --plot flight.png
  tscale clock satellite.toml --start 2025-03-01 --stop 2025-03-11 --nominal-frequency 10.23e6
  tscale clock moon_base.toml --start 2025-01-01 --stop 2026-01-01 --json > moon_base.json
"""
)


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "clock",
        help="rates of clocks on the ground, in the air, in orbit and on other bodies",
        description="Tell the rate of a clock term by term with its uncertainty, or compare two clocks.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    # Else -4.4647e-10 would be taken for an option.
    parser._negative_number_matcher = re.compile(r"-(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$")
    parser.add_argument("one", metavar="CLOCK", help="a clock; see below")
    parser.add_argument("two", metavar="CLOCK2", nargs="?", help="what it is compared with")
    parser.add_argument("--start", metavar="DATE", help="first date, ISO 8601")
    parser.add_argument("--stop", metavar="DATE", help="last date")
    parser.add_argument("--step", metavar="S", help="seconds from date to date for extremes and pictures (400 dates)")
    parser.add_argument("--scale", metavar="SCALE", default="UTC", help="scale of the dates (%(default)s)")
    parser.add_argument(
        "--against",
        metavar="SCALE",
        default="TT",
        help="coordinate time: TT, TCG, TCB, TDB, or near the Moon TCL (%(default)s)",
    )
    parser.add_argument(
        "--set-offset", metavar="Y", type=float, default=0.0, help="fraction by which CLOCK is set fast"
    )
    parser.add_argument(
        "--nominal-frequency", metavar="HZ", type=float, help="of a clock in orbit, to tell what it is set to"
    )
    parser.add_argument("--output", metavar="FILE", help="CSV file of the rate by terms and the time gained, by date")
    parser.add_argument("--json", action="store_true", help="everything as JSON, in place of the text")
    parser.add_argument("--plot", metavar="FILE", help="picture: PNG, PDF or SVG (needs matplotlib)")
    physics = parser.add_argument_group("gravity and tides")
    physics.add_argument("--gravity", metavar="FILE", help="Earth's gravity field, ICGEM .gfc (default: J2 to J6)")
    physics.add_argument("--max-degree", metavar="N", type=int, help="of the field, where less than all will do")
    tides = physics.add_mutually_exclusive_group()
    tides.add_argument("--no-tides", action="store_true", help="leave the tides of Moon and Sun out")
    tides.add_argument("--tide-system", choices=_TIDES, help="of levelled heights and numbers (default: zero_tide)")
    add_uncertainties(parser)
    add_measured(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Tell the rate of one clock, or of two."""
    from ...errors import InvalidInput, MissingPiece, OutOfSpan
    from .orbit import body_summary, orbit_summary
    from .rates import of_one, of_two
    from .span import span_of

    _check(args)
    reference = reference_of(args)
    given = [clock_end(text, reference) for text in (args.one, args.two) if text is not None]
    checked_measured(args, given)
    model = _model(args, given, reference)
    ends, known = (given, True) if args.measured is None else with_potentials(given, model)
    span = span_of(args, ends, reference)
    try:
        found = of_one(ends[0], span, model) if len(ends) == 1 else of_two(ends[0], ends[1], span, model)
    except (InvalidInput, MissingPiece, OutOfSpan) as error:
        message = str(error)
        for pattern, words in _SPOKEN:
            message = re.sub(pattern, words, message)
        error.args = (message,)
        raise
    budget = budget_of(args, ends, found, model) if known else None
    orbits = [orbit_summary(end, found, model) for end in ends]
    bodies = [body_summary(end, found, model) for end in ends]
    levelling = None if args.measured is None else levelled(args, given, found, budget)
    _check_nominal(args, orbits)
    answer = Answer(given, found, model, _texts(found, model), budget, orbits, bodies, levelling)
    # What goes to files first: where one cannot be written there is no other output either.
    _write(args, answer)
    print(_json(answer) if args.json else _told(args, answer))
    return 0


def _json(answer: Answer) -> str:
    from .json import document

    return json.dumps(document(answer), indent=2)


def _check(args: argparse.Namespace) -> None:
    """What can be said before any work."""
    from ...errors import InvalidInput

    standard_output()
    if args.plot is not None:
        from ...plots import check_picture

        check_picture(args.plot)
    if args.max_degree is not None and args.gravity is None:
        raise InvalidInput("--max-degree is of a gravity field: give one by --gravity FILE")
    if args.output is not None and is_standard_output(args.output):
        raise InvalidInput("--output takes the name of a file: the standard output holds the tables")


def _model(args: argparse.Namespace, ends: Sequence[ClockEnd], reference: Any) -> Model:
    """What rates are taken by, with a word on what is not used."""
    from ...earth.gravity import HarmonicField
    from ...errors import InvalidInput
    from ...transforms.proper_time import geopotential_number_of
    from .rates import Model

    field = None
    if args.gravity is not None:
        near = [end for end in ends if end.kind not in ("surface", "spacecraft")]
        if not near:
            raise InvalidInput("--gravity is the Earth's field, which no clock given is in: leave it out")
        field = HarmonicField.load(args.gravity, args.max_degree)
        if all(geopotential_number_of(end.observer) is not None for end in near):
            note("--gravity was not used: a geopotential number or a height above the geoid comes first")
    tides = False if args.no_tides else args.tide_system or True
    return Model(args.against, field, tides, args.set_offset, reference)


def _check_nominal(args: argparse.Namespace, orbits: Sequence[OrbitSummary | None]) -> None:
    import math

    from ...errors import InvalidInput

    if args.nominal_frequency is None:
        return
    if all(orbit is None for orbit in orbits):
        raise InvalidInput("--nominal-frequency is of a clock in a closed orbit about the Earth, which none given is")
    if not (math.isfinite(args.nominal_frequency) and args.nominal_frequency > 0.0):
        raise InvalidInput(f"--nominal-frequency is in hertz and above zero, got {args.nominal_frequency!r}")


def _texts(found: Found, model: Model) -> tuple[str, str]:
    """First and last date."""
    table = model.reference.leap_seconds
    start, stop = (str(t.to_iso(3, leap_seconds=table)).removesuffix(".000") for t in found.span[:2])
    return start, stop


def _write(args: argparse.Namespace, answer: Answer) -> None:
    from ...errors import InvalidInput
    from .json import write_rows

    if answer.budget is None and (args.output is not None or args.plot is not None):
        raise InvalidInput(
            "--output and --plot show predicted rates, and the potential of a site is not known: give each site its "
            "geopotential_number_m2_s2 or height_above_geoid_m"
        )
    if args.plot is not None:
        _draw(args.plot, answer.found)
    if args.output is not None:
        with written(args.output) as target:
            write_rows(target, answer.found, answer.model)


def _draw(path: str, found: Found) -> None:
    from ...clocks import ClockComparison
    from ...plots import save_clock_picture, save_rate_picture

    if isinstance(found.drawn, ClockComparison):
        save_clock_picture(found.drawn, found.span.dates, path)
    else:
        save_rate_picture(found.drawn, found.span.dates, path)


def _told(args: argparse.Namespace, answer: Answer) -> str:
    from .text import body_text, budget_text, head_text, levelling_text, orbit_text, rate_text

    found = answer.found
    parts = [head_text(answer.ends, found, answer.dates)]
    if answer.budget is not None:
        parts += [rate_text(found, answer.budget.sigma), budget_text(answer.budget, found)]
    if answer.levelling is not None:
        parts.append(levelling_text(answer.levelling, found.names))
    parts += [orbit_text(orbit, args.nominal_frequency) for orbit in answer.orbits if orbit is not None]
    parts += [body_text(body, found) for body in answer.bodies if body is not None]
    return "\n\n".join(parts)
