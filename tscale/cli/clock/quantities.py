"""The quantities that the rate of a clock rests on, by the kind of clock, each with its standard uncertainty."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, Final, NamedTuple, TypeAlias

from .ends import ClockEnd
from .rates import Found, Model

if TYPE_CHECKING:
    from ...budget.gum import Quantity

__all__ = ["REAL_GRAVITY_M_S2", "Line", "correlation", "local_gravity_m_s2", "quantities_of"]

_KAULA: Final = 1e-5
"""Size of a fully normalised coefficient of degree n times n^2 (Kaula 1966, Theory of Satellite Geodesy, eq. 5.31)."""
_LAST_DEGREE: Final = 20_000
_ZONAL_KNOWN: Final = 6
REAL_GRAVITY_M_S2: Final = 5e-4
"""50 mGal: what mean gravity along a plumb line differs from normal gravity by as a rule (`earth.gravity.normal`)."""
_OCEAN_M2_S2: Final = 0.63
"""Ocean tides up to 5e-18 at some coasts, the tide of the pole 2e-18 (see `transforms.proper_tides`)."""
_YIELDING_MOON_M2_S2: Final = 0.4
"""(k2 - h2) of the Moon, -2 % of a tide of up to 21 m2/s2 (see `transforms.surface_clock`)."""
_AREOID_M2_S2: Final = 69.0
"""Standard uncertainty of the potential of the areoid (Ardalan, Karimi & Grafarend 2009; see `body_shape`)."""
_GRAVITY_ALIKE_M: Final = 4e4
"""Gravity anomalies at a distance d correlate as 1/(1 + (d/40 km)^2) (Hirvonen 1962, from memory)."""
_OCEAN_ALIKE_M: Final = 5e5
"""Tides of the ocean change from coast to coast; that of the pole is the same far around. An estimate of our own."""
_APART_M: Final = {301: 500.0, 4: 2000.0}
"""How far a body's ellipsoid and its equipotential surface are apart at most (see `surface.SurfaceSite`)."""
_LUMPS: Final = 3e-3
"""Part of the work up to a height that flattening and lumps of the body may change (see there)."""


class Line(NamedTuple):
    """A quantity of one clock with its sensitivity."""

    quantity: Quantity
    slope: float
    """Derivative of the rate by it."""
    clock: int = 0
    """Number of the clock that it is of."""
    alike_m: float = 0.0
    """Distance over which it is much the same at two clocks (see `correlation`); 0 where they are independent."""


_Sigmas: TypeAlias = tuple[float | None, float | None, float | None]
_Known: TypeAlias = tuple[list[Line], list[str]]


def quantities_of(
    end: ClockEnd, found: Found, model: Model, potential: float | None, height: float | None, speed: float | None
) -> _Known:
    """Quantities of one clock, and what is not known of it, with the standard uncertainties stated (m2/s2, m, m/s)."""
    return _OF_KIND[end.kind](end, found, model, (potential, height, speed))


def correlation(one: Line, other: Line, distance_m: float) -> float:
    """Correlation coefficient of two quantities at two clocks on one body, so far apart."""
    if one.quantity.name != other.quantity.name or not one.alike_m:
        return 0.0
    return 1.0 / (1.0 + (distance_m / one.alike_m) ** 2)


def local_gravity_m_s2(end: ClockEnd, found: Found, model: Model) -> float:
    """How fast the potential falls with height at a clock, m/s2 (along a path: at its mean distance).

    Raises
    ------
    InvalidInput
        For a clock that is neither about the Earth nor on a body.
    """
    import numpy as np

    from ...body_shape import own_body
    from ...constants import EARTH_GM_TT_M3_S2, GM_M3_S2
    from ...earth.gravity.normal import GRS80
    from ...errors import InvalidInput

    observer: Any = end.observer
    if end.kind == "site":
        return float(GRS80.gravity_m_s2(observer.lat_deg, observer.height_m))
    if end.kind == "surface":
        zero = np.asarray(0, dtype=np.int64), np.asarray(0.0)
        r_m, _ = observer.offset(zero)
        return float(GM_M3_S2[own_body(observer.body)] / np.sum(r_m * r_m))
    if end.kind == "spacecraft":
        raise InvalidInput(
            f"--height-sigma is for clocks on or about the Earth and on other bodies, which {end.name} is not: give "
            "--geopotential-sigma"
        )
    r_m, _ = _states(end, found, model)
    return float(EARTH_GM_TT_M3_S2 * np.mean(1.0 / np.sum(r_m * r_m, axis=-1)))


def _states(end: ClockEnd, found: Found, model: Model) -> tuple[Any, Any]:
    from ...clocks.dates import tt_at

    return end.observer.gcrs(tt_at(found.span.dates, end.observer, model.reference), model.reference)


def _on_the_ground(end: ClockEnd, found: Found, model: Model, sigmas: _Sigmas) -> _Known:
    """A site: levelled, or in a gravity field."""
    import numpy as np

    from ...budget.gum import Quantity
    from ...constants import C_M_S
    from ...transforms.proper_time import geopotential_number_of

    site: Any = end.observer
    number = geopotential_number_of(site)
    gravity = local_gravity_m_s2(end, found, model)
    lines, left = [], []
    by_height = site.geopotential_number_m2_s2 is None and site.height_above_geoid_m is not None
    if sigmas[0] is not None:
        lines.append(_potential(number, sigmas[0]))
    if sigmas[1] is not None:
        levelled = Quantity("height above the point levelled", 0.0, sigmas[1], unit="m")
        if by_height:
            levelled = Quantity("height above the geoid", site.height_above_geoid_m, sigmas[1], unit="m")
        elif number is None:
            levelled = Quantity("height above the ellipsoid", site.height_m, sigmas[1], unit="m")
        lines.append(Line(levelled, gravity / C_M_S**2))
    if sigmas[0] is None and sigmas[1] is None:
        what = "height above the geoid" if by_height else "geopotential number" if number is not None else "place"
        left.append(f"{what}: not stated; give --{'height' if number is None or by_height else 'geopotential'}-sigma")
    if number is None:
        assert model.gravity is not None
        radius_m = float(np.linalg.norm(site.position_m))
        lines += [_field_left_out(model, radius_m)]
        left += _field_not_stated(model)
    elif by_height:
        slope = float(site.height_above_geoid_m) / C_M_S**2
        name = "mean gravity below, real less normal"
        lines.append(Line(Quantity(name, 0.0, REAL_GRAVITY_M_S2, unit="m/s2"), slope, alike_m=_GRAVITY_ALIKE_M))
        left.append("zero of the height system: national ones are off by up to 2 m (2e-16)")
    if model.tides:
        line = _within("tides of the ocean and the pole, left out", _OCEAN_M2_S2)
        lines.append(line._replace(alike_m=_OCEAN_ALIKE_M))
        if model.tides is True and number is not None:
            left.append("tide system: the number or height is taken as zero-tide (another one: up to 3e-17)")
    else:
        lines.append(_within("tides, left out", _largest_tide_m2_s2(end, found, model)))
    return lines, left


def _about_the_earth(end: ClockEnd, found: Found, model: Model, sigmas: _Sigmas) -> _Known:
    """A flight or an orbit about the Earth."""
    import numpy as np

    from ...budget.gum import Quantity
    from ...constants import C_M_S

    r_m, v_m_s = _states(end, found, model)
    distance, speed = (float(np.mean(np.linalg.norm(x, axis=-1))) for x in (r_m, v_m_s))
    lines, left = [_field_left_out(model, distance)], []
    if sigmas[0] is not None:
        lines.append(_potential(None, sigmas[0]))
    if sigmas[1] is not None:
        slope = local_gravity_m_s2(end, found, model) / C_M_S**2
        lines.append(Line(Quantity("mean distance from the geocentre", distance, sigmas[1], unit="m"), slope))
    elif sigmas[0] is None:
        left.append("height along the path: not stated; give --height-sigma")
    if sigmas[2] is None:
        left.append("speed along the path: not stated; give --speed-sigma")
    else:
        lines.append(Line(Quantity("mean speed", speed, sigmas[2], unit="m/s"), -speed / C_M_S**2))
    if model.gravity is not None:
        left += _field_not_stated(model)
    if not model.tides:
        lines.append(_within("tides, left out", _largest_tide_m2_s2(end, found, model)))
    return lines, left


def _on_a_body(end: ClockEnd, found: Found, model: Model, sigmas: _Sigmas) -> _Known:
    """A place on the Moon or a planet."""
    from ...body_shape import REFERENCE_POTENTIAL_M2_S2, own_body
    from ...budget.gum import Quantity
    from ...constants import C_M_S

    site: Any = end.observer
    body, gravity = own_body(site.body), local_gravity_m_s2(end, found, model)
    lines, left = [], []
    if sigmas[0] is not None:
        lines.append(_potential(None, sigmas[0]))
    if sigmas[1] is not None:
        height = site.height_m if site.height_above_geoid_m is None else site.height_above_geoid_m
        lines.append(Line(Quantity("height", height, sigmas[1], unit="m"), gravity / C_M_S**2))
    if site.potential_m2_s2 is None:
        if body == 4:
            words = Quantity("potential of the areoid", REFERENCE_POTENTIAL_M2_S2[4], _AREOID_M2_S2, unit="m2/s2")
            lines.append(Line(words, -1.0 / C_M_S**2, alike_m=math.inf))
        else:
            left.append("potential of the selenoid: its uncertainty is not known here")
        if site.height_above_geoid_m is None and body in _APART_M:
            name = "reference surface above the ellipsoid"
            lines.append(Line(Quantity.within(name, 0.0, _APART_M[body], unit="m"), gravity / C_M_S**2))
        work = abs(REFERENCE_POTENTIAL_M2_S2[body] - site.gravity_potential_m2_s2())
        if work:
            lines.append(_within("flattening and lumps in the work up", _LUMPS * work))
    elif sigmas[0] is None:
        left.append("potential: not stated; give --geopotential-sigma")
    if body == 301:
        lines.append(_within("yielding of the Moon to the tide, left out", _YIELDING_MOON_M2_S2))
    return lines, left


def _through_space(end: ClockEnd, found: Found, model: Model, sigmas: _Sigmas) -> _Known:
    """A spacecraft about anything but the Earth."""
    import numpy as np

    from ...budget.gum import Quantity
    from ...constants import C_M_S
    from ...transforms.barycentric import tdb_from_tt

    left = ["gravity of bodies beyond their masses: not part of the model"]
    if sigmas[1] is not None:
        local_gravity_m_s2(end, found, model)  # says why not
    lines = [] if sigmas[0] is None else [_potential(None, sigmas[0])]
    if sigmas[0] is None:
        left.append("potential along the path: not stated; give --geopotential-sigma")
    if sigmas[2] is None:
        left.append("speed along the path: not stated; give --speed-sigma")
    else:
        from ...clocks.dates import tt_at

        observer: Any = end.observer
        tdb = tdb_from_tt(tt_at(found.span.dates, None, model.reference), model.reference)
        _, v_m_s = observer.state_bcrs(tdb, model.reference)
        speed = float(np.mean(np.linalg.norm(v_m_s, axis=-1)))
        lines.append(Line(Quantity("mean speed", speed, sigmas[2], unit="m/s"), -speed / C_M_S**2))
    return lines, left


_OF_KIND: Final = {
    "site": _on_the_ground,
    "flight": _about_the_earth,
    "orbit": _about_the_earth,
    "surface": _on_a_body,
    "spacecraft": _through_space,
}


def _potential(number: float | None, sigma: float) -> Line:
    from ...budget.gum import Quantity
    from ...constants import C_M_S

    name = "geopotential number" if number is not None else "potential, to be added"
    return Line(Quantity(name, number or 0.0, sigma, unit="m2/s2"), 1.0 / C_M_S**2)


def _within(name: str, half_width_m2_s2: float) -> Line:
    from ...budget.gum import Quantity
    from ...constants import C_M_S

    return Line(Quantity.within(name, 0.0, half_width_m2_s2, unit="m2/s2"), 1.0 / C_M_S**2)


def _field_left_out(model: Model, radius_m: float) -> Line:
    """What a gravity field to some degree leaves out at a distance: the rms over a sphere by Kaula's rule."""
    import numpy as np

    from ...budget.gum import Quantity
    from ...constants import C_M_S, EARTH_FIELD_RADIUS_M, EARTH_GM_TT_M3_S2

    top = getattr(model.gravity, "max_degree", None)
    n = np.arange(2.0, _LAST_DEGREE)
    # Of degrees up to 6 a zonal field lacks 2 n of the 2 n + 1 coefficients.
    lacking = 2.0 * n + 1.0 - (n <= _ZONAL_KNOWN) if top is None else (2.0 * n + 1.0) * (n > top)
    powers = np.minimum(EARTH_FIELD_RADIUS_M / radius_m, 1.0) ** (2.0 * n)
    sigma = EARTH_GM_TT_M3_S2 / radius_m * _KAULA * float(np.sqrt(np.sum(lacking * powers / n**4)))
    name = "gravity that J2 to J6 leave out" if top is None else f"gravity beyond degree {top}"
    return Line(Quantity(name, 0.0, sigma, unit="m2/s2"), 1.0 / C_M_S**2)


def _field_not_stated(model: Model) -> list[str]:
    """What a gravity field does not say of itself."""
    from ...transforms.proper_tides import UNKNOWN_TIDE_SYSTEM

    left = ["errors of the coefficients of the gravity field: not stated"]
    if model.tides and getattr(model.gravity, "tide_system", None) == "unknown":
        left.append(UNKNOWN_TIDE_SYSTEM)
    return left


def _largest_tide_m2_s2(end: ClockEnd, found: Found, model: Model) -> float:
    """Size of the tide that was left out, from the model itself."""
    import numpy as np

    from ...clocks import proper_ledger
    from ...constants import C_M_S

    dates = found.span.dates[:: max(1, found.span.dates.size // 500)]
    terms = proper_ledger(end.observer, dates, "TCG", gravity=model.gravity, reference=model.reference)
    return float(np.max(np.abs(terms["tidal"]))) * C_M_S**2
