"""What is known of a compiled chain: how well it keeps to the chain, where it is worst, and what it was made from."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any, NamedTuple

__all__ = ["Certificate", "Check", "TableUsed"]


class Check(NamedTuple):
    """What the comparison of one direction found.

    Attributes
    ----------
    max_error_s : float
        Largest error at a held-out date. Where the chain's own rounding is not small beside the tolerance, the chain
        is asked `draws` times within seconds and the mean counts.
    at : (int, float)
        Where that is: count on the start scale of this direction.
    max_difference_s : float
        Largest difference from a single value of the chain, its rounding included.
    noise_s : float
        Rounding of the chain: standard deviation found within seconds.
    sites, draws : int
        Held-out dates, and values of the chain at each.
    pieces, degree : int
        Polynomials, holes not counted, and their degree.
    """

    max_error_s: float
    at: tuple[int, float]
    max_difference_s: float
    noise_s: float
    sites: int
    draws: int
    pieces: int
    degree: int


def _number(name: str, value: object) -> None:
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        raise TypeError(f"{name} of the certificate holds {value!r:.40}, which is no number")


@dataclass(frozen=True)
class TableUsed:
    """A table, log or kernel that the chain reads, with the SHA-256 of its content."""

    table: str
    name: str
    sha256: str


@dataclass(frozen=True)
class Certificate:
    """What was asked, what was found at dates that no fit has seen, and what it rests on.

    Attributes
    ----------
    chain : str
        The path, as `str(chain)`.
    site, source : str or None
        Who observes, and what.
    span : (str, str)
        First and last date on the start scale.
    tolerance_s : float
        What was asked for.
    forward, inverse : Check
        What was found in each direction.
    rate_error : float
        Largest difference of `rate` from that of the chain at the dates looked at.
    tables : tuple of TableUsed
    notes : tuple of str
        Values predicted, held or past a table's expiry, and gaps in the span.
    version : str
        Of this package, which made it.
    """

    chain: str
    site: str | None
    source: str | None
    span: tuple[str, str]
    tolerance_s: float
    forward: Check
    inverse: Check
    rate_error: float
    tables: tuple[TableUsed, ...]
    notes: tuple[str, ...]
    version: str

    @property
    def max_error_s(self) -> float:
        """Largest error found in either direction, s: at most `tolerance_s`."""
        return max(self.forward.max_error_s, self.inverse.max_error_s)

    @property
    def noise_s(self) -> float:
        """Standard deviation of the chain's own rounding, s: how far single values of it scatter about the result."""
        return max(self.forward.noise_s, self.inverse.noise_s)

    @property
    def points(self) -> int:
        """Values of the chain that were compared, in both directions."""
        return sum(check.sites * check.draws for check in (self.forward, self.inverse))

    def table(self) -> str:
        """All of it as text, a line each."""
        lines = [
            f"{self.chain}, {self.span[0]} to {self.span[1]}",
            f"made by tscale {self.version}; tolerance {self.tolerance_s:.3g} s",
            *(f"{what}: {name}" for what, name in (("site", self.site), ("source", self.source)) if name),
        ]
        for name, check in (("forward", self.forward), ("inverse", self.inverse)):
            lines.append(
                f"{name}: largest error {check.max_error_s:.3g} s, at {check.at[0]} + {check.at[1]:.6f} s, of "
                f"{check.sites} dates ({check.draws} values of the chain each); single values differ by up to "
                f"{check.max_difference_s:.3g} s, of which the chain's own rounding is {check.noise_s:.3g} s rms; "
                f"{check.pieces} polynomials of degree {check.degree}"
            )
        lines.append(f"rate: largest difference {self.rate_error:.3g}")
        lines.extend(f"{used.table}: {used.name}, SHA-256 {used.sha256}" for used in self.tables)
        lines.extend(self.notes)
        return "\n".join(lines)

    def __str__(self) -> str:
        return self.table()

    def to_dict(self) -> dict[str, Any]:
        """All of it as plain values, for JSON."""
        plain = asdict(self)
        for name, check in (("forward", self.forward), ("inverse", self.inverse)):
            plain[name] = check._asdict()
        return plain

    @classmethod
    def from_dict(cls, plain: dict[str, Any]) -> Certificate:
        """The inverse of `to_dict`.

        Raises
        ------
        TypeError, ValueError, KeyError
            For values that `to_dict` does not give.
        """
        values = dict(plain)
        for name in ("forward", "inverse"):
            check = dict(values[name])
            whole, fraction = check.pop("at")
            for value in (whole, fraction, *check.values()):
                _number(name, value)
            values[name] = Check(**check, at=(whole, fraction))
        for name in ("tolerance_s", "rate_error"):
            _number(name, values[name])
        texts = [values["chain"], values["version"], *values["span"], *values["notes"]]
        texts += [value for value in (values["site"], values["source"]) if value is not None]
        if not all(isinstance(text, str) for text in texts) or len(values["span"]) != 2:
            raise TypeError("a text of the certificate is none")
        values["tables"] = tuple(TableUsed(**used) for used in values["tables"])
        values["span"], values["notes"] = tuple(values["span"]), tuple(values["notes"])
        return cls(**values)
