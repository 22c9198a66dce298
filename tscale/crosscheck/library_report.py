"""The cross-check against general libraries: pyerfa, astropy, skyfield."""

from __future__ import annotations

import contextlib
import importlib.util
import json
import textwrap
import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np

from ..earth.site import Site
from ..errors import InvalidInput
from ..instants import Instants
from ..source import Source
from ..tables.reference import ReferenceData
from .against_space import SPACE_CONVERSIONS
from .against_time import TIME_CONVERSIONS
from .comparison import Comparison, Conversion, Epochs

__all__ = ["CONVERSIONS", "LibraryReport", "libraries"]

CONVERSIONS: Final[tuple[Conversion, ...]] = (*TIME_CONVERSIONS, *SPACE_CONVERSIONS)

_START: Final = "1973-01-02T00:00:00"
_STOP: Final = "2026-06-01T00:00:00"


@dataclass(frozen=True, eq=False)
class LibraryReport:
    """How every conversion compared.

    Attributes
    ----------
    comparisons : tuple of Comparison
    versions : tuple of (str, str)
        Of the libraries that are there.
    start, stop : str
        Span of the dates.
    """

    comparisons: tuple[Comparison, ...]
    versions: tuple[tuple[str, str], ...]
    start: str
    stop: str

    @property
    def passed(self) -> bool:
        """Whether something ran, and everything that ran lies within its tolerance."""
        ran = [c for c in self.comparisons if c.ran]
        return bool(ran) and all(c.passed for c in ran)

    def table(self, *, reasons: bool = True) -> str:
        """A line for each conversion, and with `reasons` why its tolerance is what it is."""
        head = ("", "conversion", "against", "n", "max", "rms", "per year", "tolerance", "")
        rows = []
        for c in self.comparisons:
            kind = c.conversion
            status = "-" if not c.ran else "pass" if c.passed else "FAIL"
            figures = [f"{v:.1e}" for v in (c.largest, c.rms, c.per_year)] if c.ran else ["", "", ""]
            rows.append((status, kind.name, kind.library, str(c.n), *figures, f"{kind.tolerance:.1e}", kind.unit))
        wide = [max(len(row[i]) for row in (head, *rows)) for i in range(len(head))]
        left = (0, 1, 2, 8)

        def line(row: Sequence[str]) -> str:
            cells = [
                f"{text:<{w}}" if i in left else f"{text:>{w}}"
                for i, (text, w) in enumerate(zip(row, wide, strict=True))
            ]
            return "  ".join(cells).rstrip()

        lines = [
            f"dates {self.start} to {self.stop} UTC; ours minus theirs",
            "",
            line(head),
            "  ".join("-" * w for w in wide),
        ]
        for row, c in zip(rows, self.comparisons, strict=True):
            lines.append(line(row))
            if reasons:
                text = c.missing or c.conversion.reason
                lines.extend(textwrap.wrap(text, 110, initial_indent="      ", subsequent_indent="      "))
        lines += ["", ", ".join(f"{name} {version}" for name, version in self.versions)]
        failed = [c.name for c in self.comparisons if c.ran and not c.passed]
        idle = sum(not c.ran for c in self.comparisons)
        verdict = f"{sum(c.passed for c in self.comparisons)} passed, {len(failed)} failed, {idle} not run"
        lines.append(verdict + (f"; failed: {', '.join(failed)}" if failed else ""))
        return "\n".join(lines)

    def to_json(self, *, residuals: bool = False, indent: int | None = None) -> str:
        """The same as JSON; with `residuals` every single difference."""
        found: dict[str, Any] = {
            "passed": self.passed,
            "start": self.start,
            "stop": self.stop,
            "versions": dict(self.versions),
            "conversions": [c.facts() for c in self.comparisons],
        }
        if residuals:
            for facts, c in zip(found["conversions"], self.comparisons, strict=True):
                facts["residual"] = None if c.residual is None else c.residual.tolist()
        return json.dumps(found, indent=indent, allow_nan=False)

    def __repr__(self) -> str:
        return f"<LibraryReport of {len(self.comparisons)} conversions, {'passed' if self.passed else 'not passed'}>"


def libraries(
    only: Sequence[str] = (),
    *,
    start: str = _START,
    stop: str = _STOP,
    count: int = 300,
    seed: int = 1,
    site: Site | None = None,
    source: Source | None = None,
    reference: ReferenceData | None = None,
) -> LibraryReport:
    """Run our conversions and those of pyerfa, astropy and skyfield at the same dates.

    Parameters
    ----------
    only : sequence of str
        Names of conversions, or words out of them; all by default.
    start, stop : str
        Span, ISO 8601 in UTC; where Earth orientation was measured. The default begins with the IERS table of astropy.
    count : int
        Dates, drawn evenly over the span.
    seed : int
        Of the draw.
    site, source : optional
        A place in the Pacific and a direction in Virgo by default.
    reference : ReferenceData, optional
        Our tables. They have to be those that the libraries use, for the comparison to be one of code.

    Raises
    ------
    InvalidInput
        For a name that no conversion has, or a span or a count that makes no dates.
    """
    picked = _picked(only)
    tables = ReferenceData.default() if reference is None else reference
    epochs = Epochs(
        _dates(start, stop, count, seed),
        Site.from_geodetic("Tern Atoll", -166.28, 23.87, 6.0) if site is None else site,
        Source(ra_deg=187.2519, dec_deg=-12.6408, name="Lantern") if source is None else source,
        tables,
    )
    with _quiet_astropy():
        found = tuple(_compared(conversion, epochs) for conversion in picked)
    return LibraryReport(found, tuple(_versions()), str(epochs.utc[0].to_iso(0)), str(epochs.utc[-1].to_iso(0)))


def _picked(only: Sequence[str]) -> list[Conversion]:
    if isinstance(only, str):
        only = (only,)
    found: list[Conversion] = []
    for word in only:
        hits = [c for c in CONVERSIONS if word.lower() in c.name.lower() or word.lower() == c.package]
        if not hits:
            raise InvalidInput(f"no conversion is called {word!r}; there are {', '.join(c.name for c in CONVERSIONS)}")
        found += [c for c in hits if c not in found]
    return [c for c in CONVERSIONS if c in found] if only else list(CONVERSIONS)


def _dates(start: str, stop: str, count: int, seed: int) -> Instants:
    first, last = (Instants.from_iso(text, scale="UTC") for text in (start, stop))
    if not isinstance(count, int) or isinstance(count, bool) or count < 3:
        raise InvalidInput(f"count is a number of dates, 3 or more; got {count!r}")
    if not last > first:
        raise InvalidInput(f"the span ends ({stop}) before it begins ({start})")
    random = np.random.default_rng(seed)
    whole = np.sort(random.integers(int(first.whole), max(int(last.whole), int(first.whole) + 1), count))
    return Instants(whole, random.random(count), "UTC")


def _compared(conversion: Conversion, epochs: Epochs) -> Comparison:
    for package in dict.fromkeys([conversion.package, "erfa" if conversion.package == "astropy" else ""]):
        if package and importlib.util.find_spec(package) is None:
            return Comparison(conversion, None, None, f"not run: the package {package} is not installed")
    result = conversion.run(epochs)
    return Comparison(conversion, result.t, np.asarray(result.residual, dtype=np.float64))


@contextlib.contextmanager
def _quiet_astropy() -> Iterator[None]:
    """Astropy without downloads, and without its word on dates that its tables predict."""
    with contextlib.ExitStack() as stack:
        stack.enter_context(warnings.catch_warnings())
        warnings.simplefilter("ignore")
        if importlib.util.find_spec("astropy") is not None:
            from astropy.utils import iers

            stack.enter_context(iers.conf.set_temp("auto_download", False))
            stack.enter_context(iers.conf.set_temp("auto_max_age", None))
        yield


def _versions() -> Iterator[tuple[str, str]]:
    from importlib import metadata

    for name in ("tscale", "pyerfa", "astropy", "skyfield", "jplephem", "numpy"):
        with contextlib.suppress(metadata.PackageNotFoundError):
            yield name, metadata.version(name)
