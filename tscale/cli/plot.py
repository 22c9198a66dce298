"""`tscale plot`: pictures of ledgers, budgets, clock logs, and of what other tables move."""

from __future__ import annotations

import argparse
import warnings
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

from .input_dates import add_span, add_text, drawn_dates
from .options import add_observer, add_tables
from .stated import add_stated, stated_of
from .streams import note
from .supplies import supplied
from .what_if import add_replacements, compared

if TYPE_CHECKING:
    from ..chains import Chain
    from ..instants import Instants
    from ..tables.clock_log import ClockLog
    from ..tables.clock_report import ClockReport

__all__ = ["add_parser", "run"]

_NOISES: Final = ("white_frequency", "flicker_frequency", "random_walk_frequency", "white_phase_s")

_SAID: Final = 8

_EPILOG: Final = """\
The name of FILE tells the kind of the picture: .png, .pdf or .svg. The same input gives the same bytes.

examples:
  tscale plot ledger --start 2025-03-03 --stop 2025-04-03 --to TDB@BARYCENTER --site site.toml --source star.toml \\
    --output ledger.png
  tscale plot budget readings.csv --clock maser.csv --clock utc_krl.csv --site site.toml --to TDB --output budget.pdf
  tscale plot log maser.csv --output maser.png
  tscale plot what-if readings.csv --site site.toml --to TDB --with-earth-orientation later.txt --output moved.svg
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "plot",
        help="pictures of ledgers, budgets, clock logs and changes",
        description="Draw a ledger or a budget over time, a clock log, or what other tables would move. Needs "
        "matplotlib (the extra `plot`).",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    kinds = parser.add_subparsers(dest="picture", metavar="PICTURE", required=True)
    ledger = _of_chain(kinds, "ledger", "every term over time, by size")
    ledger.set_defaults(run=run, draw=_ledger)
    budget = _of_chain(kinds, "budget", "standard uncertainties: bars for the first date, lines over time")
    add_stated(budget)
    budget.set_defaults(run=run, draw=_budget)
    moved = _of_chain(kinds, "what-if", "what other tables would move, term by term")
    add_replacements(moved)
    moved.set_defaults(run=run, draw=_what_if)
    _add_log(kinds)


def _of_chain(kinds: argparse._SubParsersAction[Any], name: str, words: str) -> argparse.ArgumentParser:
    parser: argparse.ArgumentParser = kinds.add_parser(
        name,
        help=words,
        description=f"Draw {words}. The dates are those of a column of INPUT, or evenly spaced.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("input", metavar="INPUT", nargs="?", help="CSV file with a header, or - for the standard input")
    parser.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    parser.add_argument("--to", dest="end", metavar="NODE", required=True, help="what is wanted")
    _add_output(parser)
    add_span(parser)
    add_observer(parser)
    add_text(parser)
    add_tables(parser)
    return parser


def _add_log(kinds: argparse._SubParsersAction[Any]) -> None:
    words = "comparisons of a clock, residuals, gaps, and what is odd"
    parser: argparse.ArgumentParser = kinds.add_parser(
        "log",
        help=words,
        description=f"Draw {words}. With --until and levels of noise the log is predicted past its last comparison.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("input", metavar="LOG", help="comparison log (CSV), or FILE:LAB of a BIPM Circular T")
    _add_output(parser)
    parser.add_argument("--interpolation", choices=("linear", "cubic", "step"), help="between comparisons")
    parser.add_argument("--max-gap-s", metavar="S", type=float, help="comparisons further apart leave a gap")
    parser.add_argument("--no-inspection", action="store_true", help="do not look for outliers, jumps and rate steps")
    ahead = parser.add_argument_group("prediction")
    ahead.add_argument("--until", metavar="DATE", help="where it ends, on the reference scale of the log")
    ahead.add_argument("--fit-s", metavar="S", type=float, help="stretch at the end that the rate is taken from, s")
    ahead.add_argument("--drift", action="store_true", help="take the drift from the stretch too")
    for name in _NOISES[:3]:
        words = f"level of {name.replace('_', ' ')} noise, an Allan deviation (at 1 s)"
        ahead.add_argument(f"--{name.replace('_', '-')}", metavar="X", type=float, default=0.0, help=words)
    ahead.add_argument("--white-phase-s", metavar="S", type=float, default=0.0, help="standard deviation of a reading")
    parser.add_argument("--leap-seconds", metavar="FILE", help="in place of the default table")
    parser.set_defaults(run=run, draw=_log)


def _add_output(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--output", metavar="FILE", required=True, help=".png, .pdf or .svg")
    parser.add_argument("--title", metavar="TEXT", default="", help="above the picture")


def run(args: argparse.Namespace) -> int:
    """Draw a picture."""
    from ..errors import ExtrapolationWarning
    from ..plots import check_picture

    check_picture(args.output)  # before any work
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", ExtrapolationWarning)  # the notes say the same
        notes = args.draw(args)
    for text in dict.fromkeys(notes):
        note(text)
    return 0


def _dates(args: argparse.Namespace) -> tuple[Chain, Instants]:
    (chain,) = supplied(args).chains([args.end])
    return chain, drawn_dates(args, chain)


def _ledger(args: argparse.Namespace) -> Sequence[str]:
    from ..plots import save_ledger_picture

    chain, t = _dates(args)
    ledger = chain.ledger(t)
    save_ledger_picture(ledger, t, args.output, args.title, [str(chain)])
    return ledger.notes


def _budget(args: argparse.Namespace) -> Sequence[str]:
    from ..plots import save_budget_picture

    chain, t = _dates(args)
    budget = chain.budget(t, **stated_of(args))
    save_budget_picture(budget, args.output, t, title=args.title, lines=[str(chain)])
    return chain.notes(t)


def _what_if(args: argparse.Namespace) -> Sequence[str]:
    from ..plots import save_what_if_picture

    _, t, found = compared(args, drawn_dates)
    save_what_if_picture(found, t, args.output, args.title)
    return [*found.before.notes, *found.after.notes]


def _log(args: argparse.Namespace) -> Sequence[str]:
    from ..plots import save_clock_log_picture

    log, report = _log_of(args)
    save_clock_log_picture(log, args.output, report, args.title)
    found = () if report is None else [finding for finding in report.findings if finding.severity != "note"]
    more = [f"{args.input}: {len(found) - _SAID} findings more, as in the picture"] if len(found) > _SAID else []
    return [*(f"{args.input}: {finding}" for finding in found[:_SAID]), *more]


def _log_of(args: argparse.Namespace) -> tuple[ClockLog, ClockReport | None]:
    """The log, predicted if that is asked for, and its inspection."""
    from ..errors import InvalidInput
    from ..formats.leap_seconds import LeapSeconds
    from ..tables.clock_log import ClockLog
    from ..tables.clock_noise import ClockNoise
    from .options import clocks_of

    reference = _reference(args)
    (log,) = clocks_of(argparse.Namespace(**{**vars(args), "clock": [args.input]}), reference)
    levels = {name: getattr(args, name) for name in _NOISES}
    if args.until is not None:
        if args.fit_s is None or not any(levels.values()):
            raise InvalidInput(
                "--until needs --fit-s S, the stretch that the rate is taken from, and a level of noise, such as "
                "--white-frequency 2e-13 --flicker-frequency 3e-15"
            )
        log = log.predicted(ClockNoise(**levels), fit_s=args.fit_s, until=args.until, drift=args.drift)
    elif args.fit_s is not None or args.drift:
        raise InvalidInput("--fit-s and --drift are for a prediction: say --until DATE")
    elif any(levels.values()):
        log = log.with_noise(ClockNoise(**levels))
    if args.no_inspection or log.path is None:
        return log, None
    table: LeapSeconds = reference.leap_seconds
    return log, ClockLog.inspect(log.path, max_gap_s=args.max_gap_s, leap_seconds=table)


def _reference(args: argparse.Namespace) -> Any:
    from ..tables.reference import ReferenceData

    return ReferenceData.load(leap_seconds=args.leap_seconds)
