"""What stands in the way of a link: the ground that an end stands on, and other bodies."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from ..constants import C_M_S
from ..earth.frames import dot
from ..errors import GeometryError
from ..exact import BoolArray, FloatArray
from .ends import Stand

__all__ = ["apparent", "below_horizon", "elevation_rad", "no_clear_path"]


def apparent(toward: FloatArray, velocity_m_s: FloatArray) -> FloatArray:
    """Unit vector in which an end sees the other in its own frame (first-order aberration), no refraction.

    Parameters
    ----------
    toward : (..., 3) array
        Unit vector from this end to the other along the light path, barycentric.
    velocity_m_s : (..., 3) array
        Barycentric velocity of this end. Its sign is the caller's: + for light that comes in, - for light that leaves.
    """
    seen = toward + velocity_m_s / C_M_S
    return np.asarray(seen / np.sqrt(dot(seen, seen))[..., np.newaxis])


def elevation_rad(up: FloatArray, seen: FloatArray) -> FloatArray:
    """Elevation of a direction (unit vector) above the plane normal to `up`."""
    return np.asarray(np.arcsin(np.clip(dot(up, seen), -1.0, 1.0)))


def below_horizon(
    stand: Stand, here_m: FloatArray, seen: FloatArray, range_m: FloatArray, *, other_on_ground: bool
) -> BoolArray:
    """Where the line from an end on the ground to the other passes through the body it stands on.

    The body is its ellipsoid: an end `h` above it sees about sqrt(2 h / R) below its horizontal. An end below the
    ellipsoid, as in a depression, is taken to stand on a smaller one of the same shape, and sees no lower than that.

    Parameters
    ----------
    stand : Stand
    here_m : (..., 3) array
        Vector from the body's centre to this end, m.
    seen : (..., 3) array
        Direction of the other end, as of `apparent`.
    range_m : (...) array
        Distance of the other end, m.
    other_on_ground : bool
        The other end stands on the same body. Its own depth is then no hindrance to it.
    """
    # Stretched along its axis the ellipsoid is a sphere.
    stretch = stand.figure.equatorial_m / stand.figure.polar_m - 1.0
    place = here_m + stand.pole * (stretch * dot(stand.pole, here_m))[..., np.newaxis]
    line = seen + stand.pole * (stretch * dot(stand.pole, seen))[..., np.newaxis]
    height2, along, length2 = dot(place, place), dot(place, line), dot(line, line)
    way_m = -along / length2  # to the point nearest to the centre
    within = way_m < range_m
    reach_m = np.where(within, way_m, range_m)
    nearest2 = height2 + reach_m * (2.0 * along + reach_m * length2)
    inside = nearest2 < np.minimum(height2, stand.figure.equatorial_m**2)
    return np.asarray((way_m > 0.0) & inside & (within | (not other_on_ground)))


def no_clear_path(ways: Mapping[str, BoolArray], what: str) -> GeometryError:
    """The error of links of which some have no clear path.

    Parameters
    ----------
    ways : mapping of str to bool array
        What is in the way, and where.
    what : str
        `links from A to B`.
    """
    mask = np.logical_or.reduce(list(ways.values()))
    reasons = "; ".join(f"{words} ({int(np.sum(one))})" for words, one in ways.items() if np.any(one))
    return GeometryError(
        f"{int(mask.sum())} of {mask.size} {what} have no clear path: {reasons}. Leave them out (see the mask), or "
        'give occultation="ignore" to have them marked only',
        mask=np.asarray(mask),
    )
