"""How well `tscale clock` knows a mean rate: what the potential, the height, the speed and the models leave open."""

from __future__ import annotations

import argparse
import math
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any, Final, NamedTuple

from .ends import ClockEnd
from .quantities import Line, correlation, quantities_of
from .rates import Found, Model

if TYPE_CHECKING:
    from ...budget.gum import Evaluation

__all__ = ["RateBudget", "add_uncertainties", "budget_of", "stated"]

_LEAST_CORRELATION: Final = 0.01


class RateBudget(NamedTuple):
    """The law of propagation of uncertainty (JCGM 100) for a mean rate."""

    evaluation: Evaluation | None
    """None where no uncertainty is known at all."""
    lines: tuple[Line, ...]
    """The quantities, in the order of the evaluation."""
    correlations: tuple[tuple[int, int, float], ...]
    """Numbers of two lines, and their correlation coefficient."""
    not_included: tuple[str, ...]

    @property
    def sigma(self) -> float | None:
        """Combined standard uncertainty of the mean rate; None where none is known."""
        return None if self.evaluation is None else float(self.evaluation.sigma)


def add_uncertainties(parser: argparse.ArgumentParser) -> None:
    """Add the options for what no file states; one number, or one for each clock parted by a comma."""
    group = parser.add_argument_group(
        "standard uncertainties", "one number, or one for each clock with a comma between: 0.02,0.5"
    )
    group.add_argument("--geopotential-sigma", metavar="M2_S2", help="potential at the clock, m2/s2 (1 is 1.1e-17)")
    group.add_argument("--height-sigma", metavar="M", help="height of the clock, m (1 cm is 1.1e-18 on the ground)")
    group.add_argument("--speed-sigma", metavar="M_S", help="mean speed along the path of a flight or an orbit, m/s")


def stated(args: argparse.Namespace, option: str, clocks: int) -> list[float | None]:
    """The standard uncertainties of an option, one for each clock.

    Raises
    ------
    InvalidInput
        Texts that are no numbers of zero or more, or another count of them.
    """
    from ...errors import InvalidInput

    text = getattr(args, option.replace("-", "_"))
    if text is None:
        return [None] * clocks
    parts = [_sigma(part) for part in text.split(",")]
    if any(part is None for part in parts) or len(parts) not in (1, clocks):
        raise InvalidInput(
            f"--{option} takes a number of zero or more, or one for each clock such as 0.02,0.5; got {text!r:.60}"
            + (f" for {clocks} clock{'s' if clocks > 1 else ''}" if None not in parts else "")
        )
    return parts * clocks if len(parts) == 1 else parts


def _sigma(text: str) -> float | None:
    try:
        value = float(text)
    except ValueError:
        return None
    return value if math.isfinite(value) and value >= 0.0 else None


def budget_of(args: argparse.Namespace, ends: Sequence[ClockEnd], found: Found, model: Model) -> RateBudget:
    """The budget of the mean rate of one clock, or of the first less the second.

    Raises
    ------
    InvalidInput
        For uncertainties that do not go with these clocks.
    """
    from ...budget.gum import evaluate
    from ...errors import InvalidInput

    number = len(ends)
    potentials, heights, speeds = (
        stated(args, option, number) for option in ("geopotential-sigma", "height-sigma", "speed-sigma")
    )
    if args.speed_sigma is not None and all(end.kind in ("site", "surface") for end in ends):
        raise InvalidInput(
            "--speed-sigma is for a flight or an orbit; a site turns with its body, whose speed is known"
        )
    lines: list[Line] = []
    left: list[str] = []
    for i, end in enumerate(ends):
        sign = -1.0 if i else 1.0
        own, missing = quantities_of(end, found, model, potentials[i], heights[i], speeds[i])
        lines += [line._replace(clock=i, slope=sign * line.slope) for line in own]
        left += [f"{end.name}: {text}" for text in missing]
    left.append(
        "what the clock itself does: the rate is that of an ideal clock"
        if number == 1
        else "what the clocks themselves do: the rates are those of ideal clocks"
    )
    # Quantities of one name are told apart by the clock.
    named = [replace(line.quantity, name=f"{line.quantity.name} ({i})") for i, line in enumerate(lines)]
    slopes, at = [line.slope for line in lines], [line.quantity.value for line in lines]

    def rate(*values: float) -> float:
        return found.rate + sum(k * (x - x0) for k, x, x0 in zip(slopes, values, at, strict=True))

    alike = _correlations(ends, lines)
    if not named:
        return RateBudget(None, (), (), tuple(left))
    known = {(named[i].name, named[j].name): r for i, j, r in alike}
    return RateBudget(evaluate(rate, named, known), tuple(lines), alike, tuple(left))


def _correlations(ends: Sequence[ClockEnd], lines: Sequence[Line]) -> tuple[tuple[int, int, float], ...]:
    """What two clocks at rest on one body share."""
    import numpy as np

    kinds = {end.kind for end in ends}
    if len(ends) != 2 or kinds not in ({"site"}, {"surface"}):
        return ()
    a, b = (_place(end) for end in ends)
    if a[0] != b[0]:
        return ()
    apart_m = float(np.linalg.norm(a[1] - b[1]))
    own = [i for i, line in enumerate(lines) if line.clock == 0]
    found = []
    for i in own:
        for j in range(len(own), len(lines)):
            r = correlation(lines[i], lines[j], apart_m)
            if r >= _LEAST_CORRELATION:
                found.append((i, j, r))
    return tuple(found)


def _place(end: ClockEnd) -> tuple[int, Any]:
    """The body, and where on it, m."""
    import numpy as np

    observer: Any = end.observer
    if end.kind == "site":
        return 399, np.array(observer.position_m)
    return observer.body, observer.offset((np.asarray(0, dtype=np.int64), np.asarray(0.0)))[0]
