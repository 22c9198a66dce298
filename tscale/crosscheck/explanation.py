"""Explanation: which mistakes of another program make its results differ from those of a chain."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..chains import Chain
from ..errors import InvalidInput
from ..exact import FloatArray
from ..instants import Instants
from .diagnosis import Diagnosis
from .residuals import Residuals, against

__all__ = ["Cause", "Explanation", "explain", "explained"]

_LEAST_ROWS: Final = 4


class Cause(NamedTuple):
    """One mistake."""

    name: str
    amplitude: float
    sigma: float
    unit: str
    """Of the amplitude; empty where it counts how often the mistake was made."""
    description: str
    rms_s: float
    """What it does to the results."""
    alternatives: tuple[str, ...] = ()
    """Other mistakes that these dates cannot tell from it."""

    @property
    def label(self) -> str:
        """The name, with those that cannot be told from it."""
        last = f"{self.name} in the result"
        if last not in self.alternatives:
            return " or ".join((self.name, *self.alternatives))
        others = [name for name in self.alternatives if name != last]
        return " or ".join((f"{self.name}, on the way or in the result", *others))


@dataclass(frozen=True, eq=False)
class Explanation:
    """What was found.

    Attributes
    ----------
    found : tuple of Cause
        The smallest set of mistakes, the largest first.
    residuals : Residuals
        Before.
    unexplained_s : float array
        What is left of every residual.
    independent : float
        Number of independent values that these are worth.
    set_aside : tuple of int
        Rows that were left out of the search because they lie too far from all others.
    looked_for : tuple of str
        Names of all mistakes that would have been seen.
    not_looked_for : tuple of (str, str)
        Names of those that could not be evaluated at these dates, and why.
    leftovers : tuple of str
        What is left beside noise, in words: a mean, a drift, a period.
    noise_s : float
        Root mean square of what is left.
    """

    found: tuple[Cause, ...]
    residuals: Residuals
    unexplained_s: FloatArray
    independent: float
    set_aside: tuple[int, ...]
    looked_for: tuple[str, ...]
    not_looked_for: tuple[tuple[str, str], ...]
    leftovers: tuple[str, ...]
    noise_s: float

    @property
    def causes(self) -> list[tuple[str, float, float]]:
        """Name, amplitude and its standard uncertainty of every mistake; names that cannot be told apart in one."""
        return [(cause.label, cause.amplitude, cause.sigma) for cause in self.found]

    @property
    def unexplained_rms_s(self) -> float:
        """Root mean square of what is left, but for the rows that were set aside."""
        return self.noise_s

    @property
    def verdict(self) -> str:
        """`agrees` (noise alone), `explained` (causes, and noise) or `unexplained` (more than noise is left)."""
        if self.leftovers:
            return "unexplained"
        return "explained" if self.found else "agrees"

    @property
    def told(self) -> str:
        """The verdict in a sentence."""
        return {
            "agrees": "no cause found: what is there is noise",
            "explained": "what is left is noise",
            "unexplained": "unexplained: no mistakes of the catalogue, alone or together, bring this down to noise; "
            f"left is {' and '.join(self.leftovers)}",
        }[self.verdict]

    def table(self) -> str:
        """The causes, a line each, and what is left."""
        rows = [
            (c.label, f"{c.amplitude:+.6g}{f' {c.unit}' if c.unit else ''}", f"{c.sigma:.2g}", f"{c.rms_s:.3e}")
            for c in self.found
        ]
        head = ("cause", "amplitude", "sigma", "rms (s)")
        lines: list[str] = []
        if rows:
            wide = [max(len(row[i]) for row in [*rows, head]) for i in range(4)]
            lines = [
                f"{row[0]:<{wide[0]}}  {row[1]:>{wide[1]}}  {row[2]:>{wide[2]}}  {row[3]:>{wide[3]}}"
                for row in [head, tuple("-" * w for w in wide), *rows]
            ]
            lines.append("")
        before, left = self.residuals.rms_s, self.unexplained_rms_s
        lines.append(f"rms before {before:.3e} s, unexplained {left:.3e} s; {self.told}")
        if self.set_aside:
            shown = ", ".join(map(str, self.set_aside[:5])) + (", ..." if len(self.set_aside) > 5 else "")
            lines.append(f"{len(self.set_aside)} of {self.residuals.n} rows set aside as outliers: {shown}")
        lines.extend(f"not looked for: {name} ({why})" for name, why in self.not_looked_for)
        return "\n".join(lines)

    def facts(self) -> dict[str, Any]:
        """Everything but the single residuals, as plain values."""
        return {
            **self.residuals.facts(),
            "verdict": self.verdict,
            "causes": [
                {
                    "name": c.name,
                    "alternatives": list(c.alternatives),
                    "amplitude": c.amplitude,
                    "sigma": c.sigma,
                    "unit": c.unit,
                    "rms_s": c.rms_s,
                    "description": c.description,
                }
                for c in self.found
            ],
            "unexplained_rms_s": self.unexplained_rms_s,
            "leftovers": list(self.leftovers),
            "independent_values": self.independent,
            "set_aside_rows": list(self.set_aside),
            "looked_for": list(self.looked_for),
            "not_looked_for": [list(item) for item in self.not_looked_for],
        }

    def to_json(self, *, residuals: bool = True, indent: int | None = None) -> str:
        """The same as JSON; with `residuals` every residual, and what is left of it."""
        facts = self.facts()
        if residuals:
            facts["residual_s"] = self.residuals.residual_s.tolist()
            facts["unexplained_s"] = self.unexplained_s.tolist()
        return json.dumps(facts, indent=indent, allow_nan=False)

    def __repr__(self) -> str:
        names = "; ".join(name for name, _, _ in self.causes) or "no cause"
        return f"<Explanation: {self.verdict} ({names}), {self.unexplained_rms_s:.3e} s left>"


def explain(
    t_in: Instants,
    t_out: Instants,
    *,
    chain: Chain,
    sigma_s: npt.ArrayLike | None = None,
) -> Explanation:
    """Say why another program's results differ from those of a chain.

    Parameters
    ----------
    t_in, t_out : Instants
        What the other program was given, and what it gave, row by row.
    chain : Chain
        What it should have done.
    sigma_s : float array, optional
        Standard uncertainty of each result, s. As weights only their ratios count: the noise is taken from what is
        left, and where that is larger than stated, the explanation says so.

    Returns
    -------
    Explanation
        `.causes`, `.unexplained_rms_s`, `.table()`. Amplitudes of mistakes that are made or not are 1, as fitted; a
        mistake is named only if its fitted amplitude agrees.

    Raises
    ------
    InvalidInput
        Fewer than four rows, or no chain.
    ScaleMismatch
        Dates on another scale or at another place than the ends of the chain.
    """
    return explained(against(t_in, t_out, chain=chain), sigma_s=sigma_s)


def explained(residuals: Residuals, *, sigma_s: npt.ArrayLike | None = None) -> Explanation:
    """The same for residuals that are at hand."""
    chain = residuals._chain
    if not isinstance(chain, Chain):
        raise InvalidInput("only residuals of a tscale.Chain can be explained: its steps are where mistakes are made")
    if residuals.n < _LEAST_ROWS:
        raise InvalidInput(
            f"{residuals.n} rows explain nothing: give {_LEAST_ROWS} or more, hundreds over years to be told much"
        )
    made = Diagnosis(residuals, _sigma(sigma_s, residuals.n)).run()
    causes = [Cause(*part) for part in made.causes]
    causes.sort(key=lambda cause: -cause.rms_s)
    return Explanation(
        tuple(causes),
        residuals,
        made.unexplained_s,
        made.independent,
        made.set_aside,
        made.looked_for,
        made.unknown,
        made.leftovers,
        made.noise_s,
    )


def _sigma(sigma_s: npt.ArrayLike | None, n: int) -> FloatArray | None:
    if sigma_s is None:
        return None
    try:
        sigma = np.broadcast_to(np.asarray(sigma_s, dtype=np.float64).reshape(-1), n)
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"sigma_s must be one number or {n}, one for each row: {error}") from error
    bad = ~(np.isfinite(sigma) & (sigma > 0.0))
    if np.any(bad):
        raise InvalidInput(f"{int(bad.sum())} of {n} values of sigma_s are not positive numbers (see .mask)", mask=bad)
    return np.asarray(sigma)
