"""`tscale clock` in words: tables of terms, of uncertainty, of an orbit, of whole periods, of heights."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

from .ends import ClockEnd
from .levelling import Levelling
from .orbit import BodySummary, OrbitSummary
from .rates import Found

if TYPE_CHECKING:
    from .budget import RateBudget

__all__ = ["body_text", "budget_text", "head_text", "levelling_text", "orbit_text", "rate_text", "size_of"]

_DAY_S: Final = 86400.0
# Unit, its name, decimals that keep 1e-20 of a fraction (1e-18 of a large one).
_FRACTIONS: Final = ((1e-9, "1e-9", 9), (1e-12, "1e-12", 8), (1e-15, "1e-15", 5), (1e-18, "1e-18", 2))
# Unit of time, its name, decimals.
_TIMES: Final = (
    (1.0, "s", 12), (1e-3, "ms", 10), (1e-6, "us", 7), (1e-9, "ns", 6), (1e-12, "ps", 4), (1e-15, "fs", 2),
    (1e-18, "as", 1),
)  # fmt: skip
_LEAST_TERM_S: Final = 1e-9
_MOST_TERMS: Final = 8


def head_text(ends: Sequence[ClockEnd], found: Found, dates: tuple[str, str]) -> str:
    """Clocks and span."""
    labels = ["clock"] if len(ends) == 1 else ["clock a", "clock b"]
    width = max(len(end.name) for end in ends)
    lines = [
        f"{label:<8} {end.name:<{width}}  {_KINDS[end.kind]} ({end.text})"
        for label, end in zip(labels, ends, strict=True)
    ]
    scale = found.span.start.scale
    lines.append(
        f"{'from':<8} {dates[0]} to {dates[1]} {scale}, {found.duration_s / _DAY_S:.9g} days of {found.against}"
    )
    return "\n".join(lines)


_KINDS: Final = {
    "site": "on the ground",
    "surface": "on another body",
    "flight": "in the air",
    "orbit": "in orbit about the Earth",
    "spacecraft": "in space",
}


def rate_text(found: Found, sigma: float | None) -> str:
    """The terms of the mean rate with what each adds up to, and how the rate moves within the span."""
    size, name, decimals = _unit(_FRACTIONS, found.rate)
    day, day_name, day_decimals = _unit(_TIMES, found.rate * _DAY_S)
    whole, whole_name, whole_decimals = _unit(_TIMES, found.accumulated_s)
    head = ("term", f"rate ({name})", f"{day_name}/day", f"gained ({whole_name})")
    rows = [
        (
            term,
            _signed(value / found.duration_s / size, decimals),
            _signed(value / found.duration_s * _DAY_S / day, day_decimals),
            _signed(value / whole, whole_decimals),
        )
        for term, value in [*found.ledger.items(), (found.title, found.accumulated_s)]
    ]
    rules = [1, len(rows)]
    if sigma is not None:
        rules.append(len(rows) + 1)
        rows.append(
            (
                "standard uncertainty",
                f"{sigma / size:,.{decimals}f}",
                f"{sigma * _DAY_S / day:,.{day_decimals}f}",
                f"{sigma * found.duration_s / whole:,.{whole_decimals}f}",
            )
        )
    lines = _columns([head, *rows], rules=rules)
    low, high = float(found.total.min()), float(found.total.max())
    mean = f"mean rate {size_of(found.rate)}"
    spread = f"between {size_of(low)} and {size_of(high)} at {found.total.size} dates of the span"
    return "\n".join([*lines, "", mean, spread])


def budget_text(budget: RateBudget, found: Found) -> str:
    """The budget of the mean rate, one row for each quantity."""
    import numpy as np

    left_out = [f"not included: {text}" for text in budget.not_included]
    evaluation, sigma = budget.evaluation, budget.sigma
    if evaluation is None or sigma is None:
        return "\n".join(["no standard uncertainty is known of this rate", *left_out])
    of_two = len(found.names) > 1
    contributions = np.abs(evaluation.contributions)
    total = max(float(np.sum(contributions**2)), 5e-324)
    # Each uncertainty to three figures in one unit.
    size, name, _ = _unit(_FRACTIONS, sigma / 100.0)
    head = ["quantity", *(["of"] if of_two else []), "value", "u", "unit", "type", "distribution", "u(rate)", "share"]
    head[-2] = f"u(rate) ({name})"
    rows = []
    for line, u in zip(budget.lines, contributions.tolist(), strict=True):
        q = line.quantity
        rows.append(
            [
                q.name,
                *([found.names[line.clock]] if of_two else []),
                f"{q.value:.9g}",
                f"{q.sigma:.3g}",
                q.unit,
                q.kind,
                q.distribution,
                f"{u / size:.3g}",
                f"{100.0 * u * u / total:.1f} %",
            ]
        )
    left = tuple(i for i, title in enumerate(head) if title in ("quantity", "of", "unit", "type", "distribution"))
    lines = _columns([head, *rows], rules=(1, len(rows) + 1), left=left)
    lines += [
        f"correlated: {budget.lines[i].quantity.name}, of both clocks, r = {r:+.3f}" for i, _, r in budget.correlations
    ]
    lines.append(f"combined standard uncertainty  {size_of(sigma, 3)}")
    lines.append(f"expanded uncertainty (k = 2)   {size_of(2.0 * sigma, 3)}")
    return "\n".join([*lines, *left_out])


def orbit_text(orbit: OrbitSummary, nominal_hz: float | None) -> str:
    """An orbit by closed formulas."""
    rows = [
        ("semi-major axis", f"{orbit.a_m / 1e3:.6f} km"),
        ("eccentricity", f"{orbit.e:.9f}"),
        ("inclination", f"{orbit.i_deg:.6f} deg"),
        ("revolution", f"{orbit.period_s:.3f} s; {orbit.revolutions:.4f} of them in the span"),
        ("mean rate against TT, gravitational", size_of(orbit.gravitational)),
        ("mean rate against TT, kinematic", size_of(orbit.kinematic)),
        ("mean rate against TT, secular part of J2", size_of(orbit.j2)),
        ("mean rate against TT", size_of(orbit.total)),
        ("offset to set before launch", f"{orbit.factory_offset:+.6e}"),
    ]
    if nominal_hz is not None:
        rows.append(("frequency to set before launch", f"{nominal_hz * (1.0 + orbit.factory_offset):,.7f} Hz"))
    rows.append(("amplitude by eccentricity, once a revolution", _time(orbit.eccentricity_amplitude_s)))
    rows.append(("amplitude by J2 beside that, twice a revolution", _time(orbit.j2_amplitude_s)))
    lines = ["the orbit by closed formulas, mean osculating elements:", *_columns(rows, left=(0, 1))]
    if orbit.two_body:
        lines.append(
            "note: an orbit of elements is that of two bodies: J2 acts on the clock in the table above, not on the path"
        )
    return "\n".join(lines)


def body_text(body: BodySummary, found: Found) -> str:
    """A clock on another body over whole periods."""
    summary = body.summary
    against = found.against if found.against in ("TDB", "TCB") else "TT"
    rows = [
        ("mean rate", size_of(summary.mean_rate)),
        ("lowest", size_of(summary.lowest_rate)),
        ("highest", size_of(summary.highest_rate)),
    ]
    if summary.yearly_variation.size:
        rows.append(("highest less lowest in a year, mean", size_of(float(summary.yearly_variation.mean()), 7)))
    if summary.fit is not None:
        rows.append(("secular rate beside the periodic terms", size_of(summary.fit.rate)))
        rows += [
            (f"{term.period_d:.3f} d, {term.name}", f"amplitude {_time(term.amplitude_s)}")
            for term in summary.fit.terms[:_MOST_TERMS]
            if term.amplitude_s >= _LEAST_TERM_S
        ]
    head = f"whole periods, {body.start} to {body.stop}, against {against} (rates once a day, the turning left out):"
    return "\n".join([head, *_columns(rows, left=(0, 1))])


def levelling_text(found: Levelling, names: Sequence[str]) -> str:
    """Heights from a measured rate."""
    a, b = names
    rows = [
        (f"measured, {a} minus {b}", f"{found.measured:+.4e}", f"{found.sigma:.2e}", ""),
        ("tides and second order in it", f"{found.unlevelled:+.4e}", "", ""),
        (
            "difference of potential, W(b) - W(a)",
            f"{found.geopotential_m2_s2:+.4f}",
            f"{found.geopotential_sigma_m2_s2:.4f}",
            "m2/s2",
        ),
        (f"height of {a} above {b}", f"{found.height_m:+.4f}", f"{found.height_sigma_m:.4f}", "m"),
        ("mean gravity between them", f"{found.gravity_m_s2:.6f}", "0.0005", "m/s2"),
    ]
    if found.height_of_a_m is not None:
        rows.append((f"height of {a} above the geoid, {b} as stated", f"{found.height_of_a_m:.4f}", "", "m"))
    lines = ["levelling by the measured rate:"]
    lines += _columns([("", "value", "u", "unit"), *rows], rules=(1,), left=(0, 3))
    if found.pull is not None:
        lines.append(f"measured minus predicted: {found.pull:+.2f} standard uncertainties of both")
    return "\n".join(lines)


def size_of(rate: float, digits: int = 0) -> str:
    """A rate as a fraction and as time a day, `+6.5370481e-14 = +5.648010 ns/day`; with digits unsigned and rounded."""
    day, name, _ = _unit(_TIMES, rate * _DAY_S)
    daily = rate * _DAY_S / day
    if digits:
        return f"{rate:.{digits - 1}e} = {daily:#.{digits}g}".removesuffix(".") + f" {name}/day"
    return f"{rate:+.7e} = {daily:+#.7g} {name}/day"


def _signed(value: float, decimals: int) -> str:
    """A number with its sign, unless nothing of it is left."""
    text = f"{value:+,.{decimals}f}"
    return text if text.strip("+-0.,") else text[1:]


def _time(value: float) -> str:
    size, name, _ = _unit(_TIMES, value)
    return f"{value / size:.6g} {name}"


def _unit(units: Sequence[tuple[float, str, int]], value: float) -> tuple[float, str, int]:
    """The unit in which a value reads as 1 or more; for nothing the smallest but one."""
    if not value:
        return units[-1] if units is _FRACTIONS else units[-2]
    return next((unit for unit in units if abs(value) >= unit[0]), units[-1])


def _columns(
    rows: Sequence[Sequence[str]], rules: Sequence[int] = (), left: Sequence[int] = (0,), gap: str = "  "
) -> list[str]:
    """Aligned columns, with rules before the rows of those numbers."""
    from ...budget.table import aligned

    lines = aligned(rows, left)
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    rule = gap.join("-" * width for width in widths)
    for number in sorted(rules, reverse=True):
        lines.insert(number, rule)
    return lines
