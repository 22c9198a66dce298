"""`tscale budget`: the uncertainty budget of a conversion at one date."""

from __future__ import annotations

import argparse
import json
from typing import TYPE_CHECKING, Any, Final

from .input_dates import add_text, dates_of_input
from .options import add_observer, add_tables
from .stated import add_stated, spoken, stated_of
from .streams import note, standard_output
from .supplies import supplied

if TYPE_CHECKING:
    from ..budget import Budget, MonteCarlo
    from ..chains import Chain
    from ..exact import FloatArray
    from ..instants import Instants

__all__ = ["add_parser", "run"]

_SHOWN: Final = 8

_EPILOG: Final = """\
One line for every source of uncertainty: its standard uncertainty, the sensitivity of the result to it, and its share
(GUM, JCGM 100:2008). What no table states counts only when it is given; what is not given stands below the table.

examples:
  tscale budget readings.csv --clock maser.csv --clock utc_krl.csv --site site.toml --source star.toml \\
    --to TDB@BARYCENTER --site-sigma-m 0.05 --source-position-sigma-mas 1
  tscale budget --date 2025-03-03T12:00:00 --to UT1 --draws 1000
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "budget",
        help="the uncertainty budget of a conversion at one date",
        description="Tell what the uncertainty of a conversion is made of, for the first date of INPUT or one given.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    when = parser.add_mutually_exclusive_group(required=True)
    when.add_argument("input", metavar="INPUT", nargs="?", help="CSV file with a header, or - for the standard input")
    when.add_argument("--date", metavar="DATE", help="ISO 8601 date on the scale of the start")
    parser.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    parser.add_argument("--to", dest="end", metavar="NODE", required=True, help="what is wanted")
    parser.add_argument("--covariance", action="store_true", help="of all dates of INPUT, and the mean's uncertainty")
    parser.add_argument("--draws", metavar="N", type=int, help="check it by Monte Carlo: run the chain N times")
    parser.add_argument("--json", action="store_true", help="the same as JSON")
    add_stated(parser)
    add_observer(parser)
    add_text(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Print the budget."""
    from ..errors import InvalidInput
    from ..instants import Instants

    standard_output()
    if args.covariance and args.date is not None:
        raise InvalidInput("--covariance is between dates: give two or more as INPUT")
    (chain,) = supplied(args).chains([args.end])
    scale, table = chain.start.scale.name, chain.reference.leap_seconds
    if args.date is not None:
        t = Instants.from_iso([args.date], scale, leap_seconds=table)
    else:
        t = dates_of_input(args, scale, table)[: None if args.covariance else 1]
    stated = stated_of(args)
    budget = chain.budget(t, **stated)
    covariance = budget.covariance() if args.covariance else None
    trials = _trials(args, chain, t, stated)
    if args.json:
        document = budget.to_dict()
        if covariance is not None:
            document |= {"covariance_s2": covariance.tolist(), "mean_sigma_s": budget.mean_sigma_s()}
        if trials is not None:
            document["monte_carlo"] = {
                "draws": trials.draws,
                "sigma_s": trials.sigma_s.tolist(),
                "statistical_error_s": trials.statistical_error_s.tolist(),
            }
        print(json.dumps(document, indent=2, allow_nan=False, ensure_ascii=False))
        return 0
    date = t[:1].to_iso(12, leap_seconds=table).tolist()[0]
    print(f"{chain.start} {date}\n")
    print(spoken(budget.table()))
    if covariance is not None:
        print("\n" + _between(budget, covariance))
    if trials is not None:
        print(f"\nlinear law and Monte Carlo (JCGM 101:2008):\n{trials.table()}")
    for text in chain.notes(t):
        note(text)
    return 0


def _trials(args: argparse.Namespace, chain: Chain, t: Instants, stated: dict[str, Any]) -> MonteCarlo | None:
    """The check by Monte Carlo that was asked for."""
    if args.draws is None:
        return None
    from ..budget import monte_carlo

    inputs = {name: value for name, value in stated.items() if name != "coverage_factor"}
    return monte_carlo(chain, t, draws=args.draws, **inputs)


def _between(budget: Budget, covariance: FloatArray) -> str:
    """Sigmas of all dates with what of their errors goes together, and the sigma of the mean."""
    import numpy as np

    sigma = np.sqrt(np.diag(covariance))
    scale = np.where(sigma > 0.0, sigma, 1.0)
    shown = (covariance / np.outer(scale, scale))[:_SHOWN, :_SHOWN]
    lines = [f"correlation between {len(sigma)} dates" + (f", the first {_SHOWN}" if len(sigma) > _SHOWN else "")]
    lines += [
        f"{number + 1:>3}  u = {u:.3e} s  " + " ".join(f"{value:+.3f}" for value in row)
        for number, (u, row) in enumerate(zip(sigma.tolist(), shown.tolist(), strict=False))
    ]
    return "\n".join([*lines, f"standard uncertainty of their mean  {budget.mean_sigma_s():.3e} s"])
