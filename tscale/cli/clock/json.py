"""What `tscale clock` writes for machines: a summary as JSON, and rates date by date as CSV."""

from __future__ import annotations

from typing import Any, TextIO

from .answer import Answer
from .ends import ClockEnd
from .orbit import BodySummary, OrbitSummary
from .rates import Found, Model

__all__ = ["document", "write_rows"]


def document(answer: Answer) -> dict[str, Any]:
    """All of it as one object; rates are dimensionless, the rest in SI units that the names tell.

    The parts of a prediction are left out where there is none (`budget` is None).
    """
    found, model, budget = answer.found, answer.model, answer.budget
    out: dict[str, Any] = {
        "clocks": [_clock(*each) for each in zip(answer.ends, answer.orbits, answer.bodies, strict=True)],
        "scale": found.span.start.scale,
        "start": answer.dates[0],
        "stop": answer.dates[1],
        "against": found.against,
        "duration_s": found.duration_s,
        "gravity": None if model.gravity is None else model.gravity.name,
        "tides": model.tides,
        "set_offset": model.set_offset,
    }
    if budget is not None:
        out |= {
            "rate": found.rate,
            "accumulated_s": found.accumulated_s,
            "terms": {
                name: {"rate": value / found.duration_s, "accumulated_s": value} for name, value in found.ledger.items()
            },
            "lowest_rate": float(found.total.min()),
            "highest_rate": float(found.total.max()),
            "rate_sigma": budget.sigma,
            "accumulated_sigma_s": None if budget.sigma is None else budget.sigma * found.duration_s,
            "budget": [
                {
                    "quantity": line.quantity.name,
                    "clock": found.names[line.clock],
                    "value": line.quantity.value,
                    "sigma": line.quantity.sigma,
                    "unit": line.quantity.unit,
                    "kind": line.quantity.kind,
                    "distribution": line.quantity.distribution,
                    "sensitivity": line.slope,
                    "rate_sigma": abs(line.slope) * line.quantity.sigma,
                }
                for line in budget.lines
            ],
            "correlations": [{"lines": [i, j], "r": r} for i, j, r in budget.correlations],
            "not_included": list(budget.not_included),
        }
    if answer.levelling is not None:
        out["levelling"] = answer.levelling._asdict()
    out["tables"] = [
        {"table": table.table, "name": table.name, "sha256": table.sha256} for table in model.reference.describe()
    ]
    return out


def _clock(end: ClockEnd, orbit: OrbitSummary | None, body: BodySummary | None) -> dict[str, Any]:
    out: dict[str, Any] = {"name": end.name, "file": end.text, "kind": end.kind}
    if orbit is not None:
        out["orbit"] = orbit._asdict()
    if body is not None:
        summary = body.summary
        out["whole_periods"] = {
            "start": body.start,
            "stop": body.stop,
            "mean_rate": summary.mean_rate,
            "lowest_rate": summary.lowest_rate,
            "highest_rate": summary.highest_rate,
            "yearly_variation": summary.yearly_variation.tolist(),
        }
        if summary.fit is not None:
            out["whole_periods"] |= {
                "secular_rate": summary.fit.rate,
                "terms": [
                    {"name": term.name, "period_d": term.period_d, "amplitude_s": term.amplitude_s}
                    for term in summary.fit.terms
                ],
                "residual_rms_s": summary.fit.residual_rms_s,
            }
    return out


def write_rows(target: TextIO, found: Found, model: Model) -> None:
    """One row for each date: the rate, what has been gained since the start, and the rate by terms."""
    texts = found.span.dates.to_iso(6, leap_seconds=model.reference.leap_seconds).tolist()
    columns = {
        found.span.dates.scale: texts,
        "rate": _numbers(found.total),
        "gained (s)": [f"{value + 0.0:.18f}" for value in found.gained_s.tolist()],
        # A name with a comma would need quotes in every reader.
        **{f"rate {name.replace(',', '')}": _numbers(value) for name, value in found.rates.items()},
    }
    target.write(",".join(columns) + "\n")
    target.writelines(",".join(row) + "\n" for row in zip(*columns.values(), strict=True))


def _numbers(values: Any) -> list[str]:
    return [f"{value + 0.0:.12e}" for value in values.tolist()]
