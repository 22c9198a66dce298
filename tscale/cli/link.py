"""`tscale link`: when a signal sent from one end reaches the other, for one date or a table of dates."""

from __future__ import annotations

import argparse
import json
import re
import warnings
from typing import TYPE_CHECKING, Any, Final, TextIO

from .link_dates import blocks_of, date_of
from .link_ends import FORMS, end_of
from .link_rows import decimals, legs_of, plain, texts_of, total_s
from .options import add_tables, reference_of
from .streams import is_standard_output, note, standard_output, written

if TYPE_CHECKING:
    from collections.abc import Sequence

    from ..instants import Instants
    from ..link import LinkSolution, TwoWaySolution
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

    Solution = LinkSolution | TwoWaySolution

__all__ = ["add_parser", "run"]

# How errors that speak of arrays and arguments speak on the command line.
_SPOKEN: Final = (
    (r"^1 of 1 (link|round trip)s (.*?)have ", r"the \1 \2has "),
    (r" \(1\)(?=;|\. Leave)", ""),
    (
        r'Leave them out \(see the mask\), or give occultation="ignore" to have them marked only',
        "Say --occultation ignore to have that marked only",
    ),
    (r"leave (\S+) out of bodies=", r"say --without \1"),
)

_EPILOG: Final = (
    FORMS
    + """
Dates given are those of the event at --from (--transmit) or --to (--receive); with --two-way both are events at --from,
the station. UTC and its kin date events on and near the Earth, out to the Moon; elsewhere give --scale TDB. A table
has one row per date, with `blocked` where a body or the ground stands in the way.

examples:
  tscale link --from site.toml --to mars --transmit 2031-03-01T00:00:00
  tscale link --from orbiter.toml --to site.toml --receive 2031-03-01 --until 2031-03-02 --step 600 --output pass.csv
  tscale link --from site.toml --to moon --two-way --transmit 2031-03-01 --until 2031-03-31 --step 3600 --plot moon.png
"""
)


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "link",
        help="light time between sites, spacecraft and bodies",
        description="Find when a signal sent from one end reaches the other, with every term of its light time.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--from", dest="start", metavar="END", required=True, help="where the signal is sent")
    parser.add_argument("--to", dest="end", metavar="END", required=True, help="where it is received (or turned round)")
    when = parser.add_mutually_exclusive_group(required=True)
    when.add_argument("--transmit", metavar="DATE", help="ISO 8601 date of transmission")
    when.add_argument("--receive", metavar="DATE", help="ISO 8601 date of reception")
    parser.add_argument("--until", metavar="DATE", help="last date of a table; needs --step")
    parser.add_argument("--step", metavar="S", help="seconds between the dates of a table")
    parser.add_argument("--scale", metavar="SCALE", default="UTC", help="scale of the dates given (%(default)s)")
    parser.add_argument("--other-scale", metavar="SCALE", default="TDB", help="scale of the other event (%(default)s)")
    parser.add_argument("--two-way", action="store_true", help="to the other end and back")
    parser.add_argument("--turnaround", metavar="S", type=float, default=0.0, help="TDB seconds spent at the other end")
    parser.add_argument("--no-second-order", action="store_true", help="first-order gravitational delays only")
    parser.add_argument(
        "--without",
        metavar="BODY",
        action="append",
        default=[],
        help="a body whose gravity and shadow are left out; repeatable",
    )
    parser.add_argument(
        "--occultation",
        choices=("error", "ignore"),
        help="where a body or the ground is in the way: stop, or only say so (default: stop for one date only)",
    )
    parser.add_argument("--ledger", action="store_true", help="add a column for every term to a table, in seconds")
    parser.add_argument(
        "--output", metavar="FILE", default="-", help="CSV file of the table (default: standard output)"
    )
    parser.add_argument("--json", action="store_true", help="the link, or the rows of the table, as JSON")
    parser.add_argument("--plot", metavar="FILE", help="picture of the table: PNG, PDF or SVG (needs matplotlib)")
    parser.add_argument(
        "--clock",
        metavar="FILE",
        action="append",
        default=[],
        help="comparison log, for dates on its scale; repeatable",
    )
    parser.add_argument("--digits", metavar="N", type=int, default=12, help="decimals of the dates (%(default)s)")
    add_tables(parser)
    parser.set_defaults(run=run, interpolation=None, max_gap_s=None)


def run(args: argparse.Namespace) -> int:
    """Solve one link, or a table of links."""
    from ..errors import InvalidInput
    from ..formats.decimals import check_digits
    from .options import clocks_of

    check_digits(args.digits)
    if (args.until is None) != (args.step is None):
        raise InvalidInput("a table needs both --until and --step; one date needs neither")
    if args.turnaround and not args.two_way:
        raise InvalidInput("--turnaround is part of --two-way; add it or leave both")
    if args.until is None and (args.output != "-" or args.plot or args.ledger):
        raise InvalidInput("--output, --plot and --ledger belong to a table: give --until and --step")
    if is_standard_output(args.output):
        standard_output()  # asked for first, so that a closed one is found out before any work
    reference = reference_of(args)
    work = _Work(args, reference, clocks_of(args, reference))
    if args.until is None:
        solution = work.solve(work.first)
        print(json.dumps(work.record(solution), indent=2) if args.json else work.account(solution))
    else:
        work.table()
    return 0


class _Work:
    """One run of the command."""

    def __init__(self, args: argparse.Namespace, reference: ReferenceData, clocks: Sequence[ClockLog]) -> None:
        from ..body_shape import own_body
        from ..ephemeris import PLANETARY_BODIES, body_id, body_name
        from ..errors import InvalidInput

        self.args = args
        without = {own_body(body_id(int(text) if text.isdigit() else text)) for text in args.without}
        unknown = without.difference(PLANETARY_BODIES)
        if unknown:
            raise InvalidInput(
                f"--without {', '.join(map(body_name, sorted(unknown)))}: no such body delays the light; those that do "
                f"are {', '.join(body_name(body) for body in PLANETARY_BODIES)}"
            )
        self.bodies = [body for body in PLANETARY_BODIES if body not in without]
        self.reference = reference
        self.clocks = clocks
        self.ends = end_of(args.start, reference), end_of(args.end, reference)
        self.given = "transmit" if args.transmit is not None else "receive"
        self.first = date_of(args, self.given, reference)

    def solve(self, t: Instants) -> Solution:
        """Solve links at dates given."""
        from ..errors import GeometryError
        from ..link import one_way, two_way

        args = self.args
        common: dict[str, Any] = {
            self.given: t,
            "reference": self.reference,
            "clocks": self.clocks,
            "bodies": self.bodies,
            "second_order": not args.no_second_order,
            "occultation": args.occultation or ("error" if args.until is None else "ignore"),
        }
        try:
            if args.two_way:
                return two_way(station=self.ends[0], target=self.ends[1], turnaround_s=args.turnaround, **common)
            return one_way(transmitter=self.ends[0], receiver=self.ends[1], **common)
        except GeometryError as error:
            message = str(error)
            for pattern, words in _SPOKEN:
                message = re.sub(pattern, words, message)
            error.args = (message,)
            raise

    def _events(self, solution: Solution) -> dict[str, Instants]:
        """Dates of every event by the head of their column."""
        args = self.args
        if args.two_way:
            scales = {"transmit": args.scale, "bounce": args.other_scale, "receive": args.scale}
        else:
            other = "receive" if self.given == "transmit" else "transmit"
            order = ("transmit", "receive")
            scales = {event: {self.given: args.scale, other: args.other_scale}[event] for event in order}
        return {f"{event} ({scale})": getattr(solution, f"{event}_on")(scale) for event, scale in scales.items()}

    def _iso(self, t: Instants) -> list[str]:
        texts: list[str] = t.to_iso(self.args.digits, leap_seconds=self.reference.leap_seconds).reshape(-1).tolist()
        return texts

    def record(self, solution: Solution) -> dict[str, Any]:
        """One link for programs: the columns of a table with all terms, and the notes."""
        row = {name: plain(column[0]) for name, column in self._columns(solution, ledger=True).items()}
        return {**row, "notes": list(solution.notes)}

    def account(self, solution: Solution) -> str:
        """One link in words."""
        lines = [(head, self._iso(t)[0]) for head, t in self._events(solution).items()]
        legs = legs_of(solution)
        for name, leg in legs.items():
            lines.append((f"{name}range", f"{float(leg.range_m) / 1e3:.9f} km"))
            lines.append((f"{name}range rate", f"{float(leg.range_rate_m_s):.6f} m/s"))
            for event, height in (("transmit", leg.transmit_elevation_deg), ("receive", leg.receive_elevation_deg)):
                if height is not None:
                    lines.append((f"{name}elevation at {event}", f"{float(height):.4f} deg"))
            if bool(leg.occulted):
                lines.append((f"{name}path", "blocked by a body or the ground"))
        width = max(len(name) for name, _ in lines)
        total = total_s(solution)
        terms = [(name, decimals(value)[0]) for name, value in solution.ledger.items()]
        terms.append(("round trip" if len(legs) == 2 else "light time", decimals(total)[0]))
        left, right = max(len(name) for name, _ in terms), max(len(text) for _, text in terms)
        rule = f"{'-' * left}  {'-' * right}"
        table = [f"{name:<{left}}  {text:>{right}}" for name, text in terms]
        head = [f"{name:<{width}}  {text}" for name, text in lines]
        notes = [f"note: {text}" for text in solution.notes]
        return "\n".join(
            [
                *head,
                *["", f"{'term':<{left}}  {'TDB seconds':>{right}}", rule, *table[:-1], rule, table[-1]],
                *[*([""] if notes else []), *notes],
            ]
        )

    def table(self) -> None:
        """Write the table, and the picture if one is asked for."""
        from ..errors import ExtrapolationWarning
        from .walk import add_notes, note_texts

        if self.args.plot:
            from ..plots import check_picture

            check_picture(self.args.plot)
        solutions = []
        notes: dict[str, list[int]] = {}
        rows = 0
        with warnings.catch_warnings(), written(self.args.output) as target:
            # The notes say the same, once for the whole table.
            warnings.simplefilter("ignore", ExtrapolationWarning)
            for number, t in enumerate(blocks_of(self.args, self.first, self.reference)):
                solution = self.solve(t)
                self._write(target, solution, head=number == 0)
                add_notes(notes, solution.notes)
                rows += t.size
                if self.args.plot:
                    solutions.append(solution)
            if self.args.json:
                target.write("\n]\n")
            if self.args.plot:
                from ..plots import save_link_picture

                # Inside the block: when the picture fails there is no table either.
                save_link_picture(solutions, self.args.plot)
        for text in note_texts(notes, rows):
            note(text)

    def _columns(self, solution: Solution, *, ledger: bool) -> dict[str, list[Any]]:
        """Columns of a table by their heads: texts of dates, numbers, and words."""
        columns: dict[str, list[Any]] = {name: self._iso(t) for name, t in self._events(solution).items()}
        columns["round trip (TDB s)" if self.args.two_way else "light time (TDB s)"] = (
            total_s(solution).ravel().tolist()
        )
        for name, leg in legs_of(solution).items():
            columns[f"{name}range (m)"] = leg.range_m.ravel().tolist()
            columns[f"{name}range rate (m/s)"] = leg.range_rate_m_s.ravel().tolist()
            for event, height in (("transmit", leg.transmit_elevation_deg), ("receive", leg.receive_elevation_deg)):
                if height is not None:
                    columns[f"{name}elevation at {event} (deg)"] = height.ravel().tolist()
        columns["path"] = ["blocked" if x else "clear" for x in solution.occulted.ravel().tolist()]
        if ledger:
            for name, value in solution.ledger.items():
                # Names of the terms hold commas, which would need quotes in every reader.
                columns[f"{name.replace(',', '')} (s)"] = value.ravel().tolist()
        return columns

    def _write(self, target: TextIO, solution: Solution, head: bool) -> None:
        columns = self._columns(solution, ledger=self.args.ledger)
        if self.args.json:
            # Row by row, so that a long table is never in memory as a whole.
            for row in zip(*columns.values(), strict=True):
                target.write(("[\n" if head else ",\n") + json.dumps(dict(zip(columns, map(plain, row), strict=True))))
                head = False
            return
        if head:
            target.write(",".join(columns) + "\n")
        texts = [texts_of(name, column) for name, column in columns.items()]
        target.writelines(",".join(row) + "\n" for row in zip(*texts, strict=True))
