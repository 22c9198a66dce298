"""What a budget takes for granted: the uncertainties that no table states."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, fields
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..errors import InvalidInput

if TYPE_CHECKING:
    from ..ephemeris.kernel import Ephemeris

__all__ = ["DEFAULT", "Assumptions"]

_SIZES: Final = {
    "site_sigma_m": 3,
    "source_position_sigma_mas": 2,
    "proper_motion_sigma_mas_yr": 2,
    "ephemeris_sigma_m": 3,
}
_SINGLE: Final = ("parallax_sigma_mas", "time_ephemeris_sigma_s", "resolution_s", "reading_sigma_s")
_DECAYS: Final = ("site_decay_s", "comparison_decay_s", "orientation_decay_s", "prediction_decay_s")


@dataclass(frozen=True, eq=False)
class Assumptions:
    """Standard uncertainties that a caller states, and how errors are taken to go together.

    What is None is not known: it stands in the budget as "not included", never as zero. Zero means exact.

    Parameters
    ----------
    site_sigma_m : float or three floats, optional
        Of the observer's place along each axis: ITRF x, y, z for what turns with the Earth, else celestial axes.
    site_decay_s : float
        Decay time of its errors; infinite for a site, some hours for an orbit.
    source_position_sigma_mas : float or two floats, optional
        Of right ascension (times cos dec) and declination at the source's epoch.
    proper_motion_sigma_mas_yr : float or two floats, optional
        Of both components of proper motion.
    parallax_sigma_mas : float, optional
        Of the parallax.
    ephemeris : Ephemeris, optional
        Another kernel: its difference from the one in use, carried through the whole chain, is taken as one standard
        uncertainty, with its course over the instants.
    ephemeris_sigma_m : float or three floats, optional
        Instead of another kernel: of the geocentre from the solar-system barycentre along each axis, shared by all
        instants.
    time_ephemeris_sigma_s : float
        Of TT - TDB at the geocentre; 0.2 ns by default, the rms difference from an independently integrated planetary
        ephemeris. Its errors fade in a year.
    resolution_s : float, optional
        Smallest step of the readings (full width): rectangular, independent from reading to reading.
    reading_sigma_s : float, optional
        Noise of the readings, independent from reading to reading.
    comparison_decay_s : float
        Decay time between the errors that are own to the rows of a clock log; 0: no two have any of it in common. What
        all rows share, the log says itself (`common_s`).
    orientation_decay_s, prediction_decay_s : float
        The same for rows of Earth orientation. Measured ones: 2 days, after the differences between the two series of
        2014 to 2026 (IERS Bulletin A and C04: correlations of 0.6 to 0.8 after one day in UT1 and dX, dY, 0.2 to 0.5
        after two in all). Predicted ones: 150 days, after predictions of 2023 to 2025 (errors a month apart have 0.5 to
        0.99, three months apart 0.5 on average).
    truncation : bool
        Whether to count the effects that the models leave out, by their bounds.
    tide_bound_m, subdaily_bound_m : float
        Largest displacement by the tide of the solid Earth, and by tides in Earth rotation, for a site and a table
        without them (`Site(solid_tide=True)`, `EarthOrientation.with_sub_daily`).
    load_bound_m : float
        Largest displacement by the load of oceans and air and by the pole tide, which no site here has: 5, 1 and
        2.5 cm.
    bounds : sequence of (name, seconds)
        Further errors of the result known to be within +-seconds: rectangular, common to all instants.
    dof : mapping of source to float
        Degrees of freedom of sources evaluated from observations (type A).
    correlations : sequence of (quantity, quantity, coefficient)
        Between input quantities whose errors are common to all instants, as a catalogue gives them.
    """

    site_sigma_m: float | Sequence[float] | None = None
    site_decay_s: float = math.inf
    source_position_sigma_mas: float | Sequence[float] | None = None
    proper_motion_sigma_mas_yr: float | Sequence[float] | None = None
    parallax_sigma_mas: float | None = None
    ephemeris: Ephemeris | None = None
    ephemeris_sigma_m: float | Sequence[float] | None = None
    time_ephemeris_sigma_s: float = 2e-10
    resolution_s: float | None = None
    reading_sigma_s: float | None = None
    comparison_decay_s: float = 0.0
    orientation_decay_s: float = 172800.0
    prediction_decay_s: float = 12960000.0
    truncation: bool = True
    tide_bound_m: float = 0.4
    load_bound_m: float = 0.085
    subdaily_bound_m: float = 0.03
    bounds: Sequence[tuple[str, float]] = ()
    dof: Mapping[str, float] = field(default_factory=dict)
    correlations: Sequence[tuple[str, str, float]] = ()

    def __post_init__(self) -> None:
        for name, size in _SIZES.items():
            object.__setattr__(self, name, _sigmas(name, getattr(self, name), size))
        for name in _SINGLE:
            if getattr(self, name) is not None:
                object.__setattr__(self, name, _number(name, getattr(self, name)))
        for name in (*_DECAYS, "tide_bound_m", "load_bound_m", "subdaily_bound_m"):
            object.__setattr__(self, name, _number(name, getattr(self, name), infinite=name in _DECAYS))
        if self.ephemeris is not None and self.ephemeris_sigma_m is not None:
            raise InvalidInput(
                "the uncertainty of the ephemeris is either its difference from another kernel (ephemeris=) or a "
                "number (ephemeris_sigma_m=): give one of them"
            )
        if self.ephemeris is not None and not _is_ephemeris(self.ephemeris):
            raise InvalidInput(
                f"ephemeris= takes another Ephemeris to compare with, got {self.ephemeris!r:.80}; open a kernel with "
                "Ephemeris.open(path)"
            )
        _check_lists(self)

    def stated(self, name: str) -> Any:
        """What was given under a name."""
        return getattr(self, name)

    @classmethod
    def of(cls, given: Assumptions | None, stated: Mapping[str, Any]) -> Assumptions:
        """Assumptions at hand with some replaced by name, or `InvalidInput` that lists the names there are."""
        names = [item.name for item in fields(cls)]
        unknown = sorted(set(stated) - set(names))
        if unknown:
            raise InvalidInput(f"a budget takes no {', '.join(unknown)}; it takes {', '.join(names)}")
        if given is not None and not isinstance(given, Assumptions):
            raise InvalidInput(f"assumptions= takes budget.Assumptions, got {type(given).__name__}")
        base = {} if given is None else {name: getattr(given, name) for name in names}
        return cls(**{**base, **stated})


def _is_ephemeris(value: Any) -> bool:
    from ..ephemeris.kernel import Ephemeris

    return isinstance(value, Ephemeris)


def _number(name: str, value: Any, *, infinite: bool = False) -> float:
    try:
        if isinstance(value, (bool, str)):
            raise TypeError("not a number")
        number = float(value)
    except (TypeError, ValueError, OverflowError) as error:
        raise InvalidInput(f"{name} must be a number, got {value!r}") from error
    if not number >= 0.0 or (math.isinf(number) and not infinite):
        raise InvalidInput(f"{name} must be zero or more{'' if infinite else ' and finite'}, got {value!r}")
    return number


def _sigmas(name: str, value: Any, size: int) -> tuple[float, ...] | None:
    if value is None:
        return None
    if np.ndim(value) == 0:
        return (_number(name, value),) * size
    if len(value) != size:
        raise InvalidInput(f"{name} is one number for all axes or {size} numbers, got {value!r}")
    return tuple(_number(name, item) for item in value)


def _check_lists(given: Assumptions) -> None:
    for name, bound_s in given.bounds:
        if not isinstance(name, str):
            raise InvalidInput(f"bounds are pairs of a name and seconds, got {(name, bound_s)!r}")
        _number(f"the bound of {name!r}", bound_s)
    for name, degrees in given.dof.items():
        if not _number(f"dof of {name!r}", degrees, infinite=True) >= 1.0:
            raise InvalidInput(f"dof of {name!r} must be 1 or more, got {degrees!r}")
    for first, second, r in given.correlations:
        if not abs(float(r)) <= 1.0 or first == second:
            raise InvalidInput(
                f"a correlation is (quantity, another quantity, coefficient from -1 to 1), got {(first, second, r)!r}"
            )


DEFAULT: Final = Assumptions()
