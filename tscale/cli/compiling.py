"""`tscale compile`: a whole chain as certified polynomials in a file of their own."""

from __future__ import annotations

import argparse
import json
from typing import Any, Final

from .options import add_observer, add_tables
from .streams import standard_output
from .supplies import supplied

__all__ = ["add_parser", "run"]

_EPILOG: Final = """\
The file holds the chain between two dates of its start, as polynomials that were compared with the chain itself at
points of their own; the certificate in it tells the largest difference and where it was. Reading it needs numpy alone:
no ephemeris, no tables. What cannot be certified is an error that says where.

example:
  tscale compile month.chain --from UTC --to TDB@BARYCENTER --site site.toml --source star.toml \\
    --start 2025-03-01 --stop 2025-04-01
  tscale convert events.parquet out.parquet --compiled month.chain --threads 2
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "compile",
        help="a chain as polynomials in a file, for very many dates",
        description="Turn a chain into certified polynomials between two dates, for very many dates or for answers in "
        "microseconds.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("output", metavar="OUTPUT", help="file to write")
    parser.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    parser.add_argument("--to", dest="end", metavar="NODE", required=True, help="what is wanted")
    parser.add_argument("--start", dest="first", metavar="DATE", required=True, help="first date, on the start's scale")
    parser.add_argument("--stop", dest="last", metavar="DATE", required=True, help="last date")
    parser.add_argument(
        "--tolerance-s", metavar="S", type=float, default=1e-13, help="largest difference from the chain (%(default)s)"
    )
    says = parser.add_mutually_exclusive_group()
    says.add_argument("--quiet", action="store_true", help="no certificate on the standard output")
    says.add_argument("--json", action="store_true", help="the certificate as JSON")
    add_observer(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Compile a chain."""
    report = None if args.quiet else standard_output()
    (chain,) = supplied(args).chains([args.end])
    compiled = chain.compile(args.first, args.last, tolerance_s=args.tolerance_s)
    compiled.save(args.output)
    if report is not None and args.json:
        print(json.dumps(compiled.certificate.to_dict(), indent=2, allow_nan=False), file=report)
    elif report is not None:
        print(compiled.certificate.table(), file=report)
    return 0
