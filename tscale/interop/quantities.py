"""Numbers with units, of any library whose quantities convert themselves (`to_value`), as bare SI numbers."""

from __future__ import annotations

from typing import Any

import numpy as np

from .. import exact
from ..errors import InvalidInput
from ..exact import FloatArray, Pair

__all__ = ["metres", "seconds"]


def metres(length: Any) -> FloatArray:
    """A length as float64 m, of the same shape; bare numbers are taken for what nobody knows, and refused.

    `Site.from_itrf("name", *metres(xyz))` reads a vector in km.

    Raises
    ------
    InvalidInput
        Without a unit, or with one of another kind.
    """
    return _bare(length, "m")


def seconds(duration: Any) -> FloatArray | Pair:
    """A duration: a quantity as float64 s, an astropy `TimeDelta` as (int64, float64 in [0, 1)) s.

    Both are what `Instants.shifted` takes, which also takes quantities themselves. The two days of a `TimeDelta` are
    read exactly: one float64 of its seconds would lose 0.1 us in 30 years.

    Raises
    ------
    InvalidInput
        Without a unit, or with one of another kind.
    """
    if hasattr(duration, "jd1") and hasattr(duration, "jd2") and hasattr(duration, "to_value"):
        if not type(duration).__name__.startswith("TimeDelta"):
            raise InvalidInput(
                f"a duration is needed, got a date ({type(duration).__name__}): take a difference of two"
            )
        return exact.add(_of_days(duration.jd1), _of_days(duration.jd2))
    return _bare(duration, "s")


def _of_days(days: Any) -> Pair:
    """Seconds of float64 days of 86400 s."""
    product, error = exact.two_product(np.asarray(days, dtype=np.float64), 86400.0)
    carry = np.floor(product)
    return exact.normalise(carry.astype(np.int64), (product - carry) + error)


def _bare(value: Any, unit: str) -> FloatArray:
    if not hasattr(value, "to_value"):
        raise InvalidInput(
            f"{value!r:.60} has no unit: give a quantity, such as 3 * astropy.units.{unit}; bare numbers are SI already"
        )
    number = np.asarray(exact.bare(value, unit), dtype=np.float64)
    if not np.isfinite(number).all():
        raise InvalidInput("a quantity is NaN or infinite (see .mask)", mask=~np.isfinite(number))
    return number
