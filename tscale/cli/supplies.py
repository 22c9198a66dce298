"""What the options of a command name, read and put together: tables, clocks, observer, source, and chains of them."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final, NamedTuple

from .options import clocks_of, observer_of, reference_of, source_of, start_of

if TYPE_CHECKING:
    from ..chains import Chain
    from ..earth.observer import Observer
    from ..source import Source
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

__all__ = ["Supplied", "supplied"]

_OPTION_FOR: Final = {
    "site=": "--site FILE (or --orbit FILE)",
    "source=": "--source FILE (or --ra and --dec)",
    "clocks=": "--clock FILE",
    "tt_bipm=": "--tt-bipm FILE",
}


class Supplied(NamedTuple):
    """Everything that a conversion is made of."""

    reference: ReferenceData
    clocks: list[ClockLog]
    site: Observer | None
    source: Source | None
    start: str
    """Node that dates are at, by `--from` or by the clocks."""
    second_order: bool

    def chains(self, ends: Sequence[str]) -> list[Chain]:
        """One chain to each end.

        Raises
        ------
        MissingPiece
            Names the options that would supply what is missing.
        """
        from ..chains import chain
        from ..errors import MissingPiece

        try:
            return [
                chain(
                    self.start,
                    end,
                    site=self.site,
                    clocks=self.clocks,
                    source=self.source,
                    reference=self.reference,
                    second_order=self.second_order,
                )
                for end in ends
            ]
        except MissingPiece as error:
            options = [option for word, option in _OPTION_FOR.items() if word in str(error)]
            hint = f" (on the command line: {', '.join(options)})" if options else ""
            raise MissingPiece(f"{error}{hint}") from error


def supplied(args: argparse.Namespace) -> Supplied:
    """Read what the options of `add_observer` and `add_tables`, and `--from` (as `start`), name."""
    reference = reference_of(args)
    clocks = clocks_of(args, reference)
    site, source = observer_of(args, reference), source_of(args)
    start = args.start if args.start is not None else start_of(clocks)
    return Supplied(reference, clocks, site, source, start, bool(args.second_order))
