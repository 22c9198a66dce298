"""`tscale convert` of Parquet and Arrow tables, by chains or by compiled ones."""

from __future__ import annotations

import argparse
import json
import os
from typing import Any, Final

from .rows_bar import RowsBar
from .streams import is_standard_output, standard_output, written
from .supplies import supplied

__all__ = ["is_table", "run_table"]

_ENDINGS: Final = (".parquet", ".arrow", ".feather")

_OF_INPUT: Final = {"input_format": "iso"}
_OF_OUTPUT: Final = {"output_format": "iso", "digits": None}


def is_table(source: str, target: str = "") -> bool:
    """Whether either name is that of a Parquet or Arrow table, or the input a folder (of tables)."""
    return source.lower().endswith(_ENDINGS) or target.lower().endswith(_ENDINGS) or os.path.isdir(source)


def run_table(args: argparse.Namespace) -> int:
    """Convert a table."""
    from ..errors import InvalidInput
    from ..files.csv_tables import TextLayout
    from ..files.delimited import delimiter_of
    from ..files.tables import convert_table

    for side, path, options in (("input", args.input, _OF_INPUT), ("output", args.output, _OF_OUTPUT)):
        for name, usual in options.items():
            if getattr(args, name) != usual and not path.lower().endswith(".csv"):
                raise InvalidInput(f"--{name.replace('_', '-')} is for text, and the {side} {path} is none")
    if args.provenance:
        raise InvalidInput("--provenance puts lines above a text; beside a table take --provenance-file FILE")
    if not args.output.lower().endswith(_ENDINGS) and is_standard_output(args.output):
        raise InvalidInput("a table is written to a file or a folder, not to the standard output: name one")
    mappings, leap_seconds = _mappings(args)
    report = None if args.quiet else standard_output()
    bar = RowsBar(args.no_progress)
    try:
        done = convert_table(
            mappings,
            args.input,
            args.output,
            column=args.column,
            ledger=args.ledger,
            sigma=args.sigma,
            rate=args.rate,
            leap_seconds=leap_seconds,
            text=TextLayout(args.input_format, args.output_format, args.digits, delimiter_of(args.delimiter)),
            threads=args.threads,
            progress=bar.tell,
        )
    finally:
        bar.close()
    if args.provenance_file is not None:
        if args.compiled:
            raise InvalidInput("a compiled chain tells what it was made of in its certificate (`tscale compile`)")
        from ..provenance import provenance_of

        found = {str(mapping.end): provenance_of(mapping).to_dict() for mapping in mappings}
        with written(args.provenance_file) as file:
            file.write(json.dumps({"results": found, "rows": done.rows}, sort_keys=True, indent=2) + "\n")
    if report is not None and args.json:
        facts = {"input": args.input, "output": args.output, "rows": done.rows, "rows_found": done.found}
        print(json.dumps({**facts, "chains": [str(mapping) for mapping in mappings]}, indent=2), file=report)
    elif report is not None:
        kept = f" ({done.found} were there already)" if done.found else ""
        print(f"{args.input}: {done.rows} rows{kept} to {args.output}", file=report)
        for mapping in mappings:
            print(f"  {mapping}", file=report)
    return 0


def _mappings(args: argparse.Namespace) -> tuple[list[Any], Any]:
    from ..compiled import load_compiled
    from ..errors import InvalidInput

    if not args.compiled:
        given = supplied(args)
        return list(given.chains(args.ends)), given.reference.leap_seconds
    if args.ends or args.start is not None:
        raise InvalidInput("a compiled chain has its own ends: give --compiled, or --from and --to, not both")
    from ..formats.leap_seconds import LeapSeconds
    from ..tables.imported import resolved

    leap_seconds = None if args.leap_seconds is None else LeapSeconds.load(resolved(args.leap_seconds))
    return [load_compiled(path) for path in args.compiled], leap_seconds
