"""`tscale data`: which tables are in use, how far they reach, how old they are."""

from __future__ import annotations

import argparse
from datetime import date
from typing import TYPE_CHECKING, Any, Final

from .options import add_tables, reference_of
from .streams import note, standard_output

if TYPE_CHECKING:
    from collections.abc import Sequence

    from ..tables.reference import TableFacts

__all__ = ["add_parser", "run"]

_HEADS: Final = ("table", "name", "from", "to", "issued", "expires", "age (d)", "SHA-256")
_SHORT_HASH: Final = 12
_FAILED: Final = 2


_EPILOG: Final = """\
Exit status: 0, or 2 where a table cannot be used (it is marked in the list).

examples:
  tscale data
  tscale data --verify
  tscale data --import finals2000A.all
  tscale convert readings.csv out.csv --site site.toml --to TDB --earth-orientation imported:finals2000A.all
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "data",
        help="list the tables in use",
        description="List the tables in use with span, date of issue, expiry, age and checksum. "
        "Nothing is fetched: leap seconds and Earth orientation come with the package astropy-iers-data "
        "(`pip install --upgrade astropy-iers-data` brings newer ones).",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    cache = parser.add_argument_group(
        "files of your own", "kept in the cache (TSCALE_CACHE, else the user's), and used only where asked for by name"
    ).add_mutually_exclusive_group()
    cache.add_argument(
        "--import",
        dest="new",
        metavar="FILE",
        nargs="+",
        help="read, check and keep leap seconds, Earth orientation, TT(BIPM) or an SPK kernel; use it as imported:NAME",
    )
    cache.add_argument("--imported", action="store_true", help="list what was imported")
    cache.add_argument("--remove", metavar="NAME", nargs="+", help="take it out again")
    parser.add_argument("--name", metavar="NAME", help="what the file of --import is to be called (default: its name)")
    look = parser.add_mutually_exclusive_group()
    look.add_argument("--full", action="store_true", help="whole checksums, and the path of every file")
    look.add_argument("--json", action="store_true", help="the same as JSON")
    parser.add_argument(
        "--verify", action="store_true", help="check shipped and imported files against their checksums"
    )
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Print the list; a table that cannot be used is marked in it, told on standard error, and gives status 2."""
    from ..errors import InvalidInput

    standard_output()
    if args.new or args.imported or args.remove:
        return _own_files(args)
    if args.name is not None:
        raise InvalidInput("--name goes with --import FILE")
    if args.verify:
        checked = _verify()
    facts = reference_of(args).describe()
    if args.json:
        import json

        print(json.dumps([{**fact._asdict(), "path": fact.path and str(fact.path)} for fact in facts], indent=2))
    else:
        _print_table(args, facts)
        if args.verify:
            print()
            for name in checked:
                print(f"verified: {name}")
    wrong = [fact for fact in facts if fact.error is not None]
    for fact in wrong:
        note(f"{fact.table}: {fact.error}", "error")
    return _FAILED if wrong else 0


def _own_files(args: argparse.Namespace) -> int:
    """Import files, remove them, or list those that are there."""
    from ..errors import InvalidInput
    from ..tables.imported import PREFIX, import_file, imported_files, remove_imported

    if args.name is not None and len(args.new or ()) != 1:
        raise InvalidInput("--name goes with --import and one FILE")
    if args.new:
        files = [import_file(path, name=args.name) for path in args.new]
    elif args.remove:
        files = [remove_imported(name) for name in args.remove]
    else:
        files = imported_files()
    if args.json:
        import json

        print(json.dumps([{**file._asdict(), "path": str(file.path)} for file in files], indent=2))
    elif args.imported:
        rows = [
            (PREFIX + file.name, file.kind, str(file.size), file.imported, file.sha256[: None if args.full else 12])
            for file in files
        ]
        heads = ("name", "table", "bytes", "imported", "SHA-256")
        print(_aligned([heads, *rows]) if rows else "nothing was imported; tscale data --import FILE does so")
        for file in files if args.full else ():
            print(f"{PREFIX}{file.name}: {file.path}, from {file.origin}")
    else:
        done = "removed" if args.remove else "there"
        for file in files:
            print(f"{done}: {PREFIX}{file.name} ({file.kind}, SHA-256 {file.sha256[:_SHORT_HASH]})")
    return 0


def _print_table(args: argparse.Namespace, facts: Sequence[TableFacts]) -> None:
    rows = [_row(fact, full=args.full) for fact in facts]
    print(_aligned([_HEADS, *rows]))
    for overdue in _overdue(facts, date.today()):
        print(f"note: {overdue}")
    if args.full:
        print()
        for fact in facts:
            print(f"{fact.table}: {fact.path or 'not from a file'}")


def _overdue(facts: Sequence[TableFacts], today: date) -> list[str]:
    """What to say of tables that do not reach today."""
    return [
        f"{fact.table}: {fact.name} ended on {fact.end}; load a newer one "
        "(pip install --upgrade astropy-iers-data brings those of the IERS)"
        for fact in facts
        if fact.end is not None and fact.end < today.isoformat()
    ]


def _row(fact: TableFacts, *, full: bool) -> tuple[str, ...]:
    age = "" if fact.age_days is None else str(fact.age_days)
    sha256 = fact.sha256 if full else fact.sha256[:_SHORT_HASH]
    name = fact.name if fact.error is None else "(cannot be used)"
    return (fact.table, name, fact.start, fact.end or "", fact.issued or "", fact.expires or "", age, sha256)


def _aligned(rows: Sequence[Sequence[str]]) -> str:
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    return "\n".join(
        "  ".join(f"{cell:<{width}}" for cell, width in zip(row, widths, strict=True)).rstrip() for row in rows
    )


def _verify() -> list[str]:
    """Names of the shipped and the imported files, each found whole; else `DataFileError`."""
    import hashlib
    import tomllib

    from ..ephemeris.shipped import shipped_path
    from ..errors import DataFileError
    from ..tables.imported import PREFIX, verify_imported

    with shipped_path("MANIFEST.toml").open("rb") as file:
        entries = tomllib.load(file)["file"]
    for name, entry in entries.items():
        path = shipped_path(name)
        with path.open("rb") as file:
            found = hashlib.file_digest(file, "sha256").hexdigest()
        if found != entry["sha256"]:
            raise DataFileError(
                f"this file is damaged: its SHA-256 is {found}, the manifest says {entry['sha256']}; "
                f"install the package again, or remake it with `{entry['command']}`",
                path=path,
            )
    return [*entries, *(PREFIX + file.name for file in verify_imported())]
