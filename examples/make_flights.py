"""Make two flights round the world, `flight_east.csv` and `flight_west.csv`: way points of a plan, not of an airline.

They follow what is published of the flights with clocks of October 1971 (Science 177, 166, 1972): hours in the air and
between, mean height, mean ground speed and mean latitude (from memory). The rest is plainly made up: equal legs
along a zigzag about the mean latitude, as wide as the distance flown asks for, with equal stops on the ground. Run from
anywhere; the files are written beside this script and are the same every time::

    python examples/make_flights.py
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import NamedTuple

import numpy as np

import tscale

FOLDER = Path(__file__).parent
CLIMB_S = 1500
"""From the ground to the cruising height, and down again."""
SLOW = 0.6
"""Speed over ground while climbing and descending, as a part of that at the cruising height."""
RADIUS_M = 6.378e6


class Plan(NamedTuple):
    """What is published of a flight, and how many legs it is cut into here."""

    name: str
    start: str
    eastward: bool
    flying_h: float
    elapsed_h: float
    height_m: float
    speed_m_s: float
    lat_deg: float
    legs: int


PLANS = (
    Plan("flight_east.csv", "1971-10-04T19:30:00", True, 41.2, 65.4, 8900.0, 243.0, 34.0, 12),
    Plan("flight_west.csv", "1971-10-13T19:40:00", False, 48.6, 80.3, 9360.0, 218.0, 31.0, 14),
)


def distance_m(lat_deg: np.ndarray, lon_deg: np.ndarray) -> float:
    """Along great circles of a sphere."""
    lat, lon = np.radians(lat_deg), np.radians(lon_deg)
    n = np.stack((np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)), axis=-1)
    turn = np.arctan2(np.linalg.norm(np.cross(n[:-1], n[1:]), axis=-1), np.sum(n[:-1] * n[1:], axis=-1))
    return float(np.sum(turn)) * RADIUS_M


def route(plan: Plan) -> tuple[np.ndarray, np.ndarray]:
    """Latitudes and longitudes of the stops: once round the Earth, the zigzag widened until the distance is met."""
    sign = 1.0 if plan.eastward else -1.0
    lon = -77.0 + sign * 360.0 * np.arange(plan.legs + 1) / plan.legs
    zigzag = np.where(np.arange(plan.legs + 1) % 2, 1.0, -1.0)
    narrow, wide = 0.0, 40.0
    for _ in range(60):
        swing = 0.5 * (narrow + wide)
        # Great circles bulge toward the pole: with the stops half a degree lower the mean latitude is met.
        lat = plan.lat_deg - 0.5 + swing * zigzag
        if distance_m(lat, lon) < plan.speed_m_s * plan.flying_h * 3600.0:
            narrow = swing
        else:
            wide = swing
    return lat, (lon + 180.0) % 360.0 - 180.0


def rows(plan: Plan) -> list[str]:
    """Way points: leave, cruise, begin to descend, land, and a stop until the next leg."""
    lat, lon = route(plan)
    leg_s = plan.flying_h * 3600.0 / plan.legs
    stop_s = (plan.elapsed_h - plan.flying_h) * 3600.0 / (plan.legs - 1)
    cruise_m = plan.height_m / (1.0 - CLIMB_S / leg_s)  # the mean over the time in the air is what is published
    zero = tscale.Instants.from_iso(plan.start, scale="UTC")
    lines = []
    for leg in range(plan.legs):
        begin_s = leg * (leg_s + stop_s)
        ends = np.radians([[lon[leg], lat[leg]], [lon[leg + 1], lat[leg + 1]]])
        a, b = (np.array([np.cos(y) * np.cos(x), np.cos(y) * np.sin(x), np.sin(y)]) for x, y in ends)
        turn = float(np.arccos(a @ b))
        climb = SLOW * CLIMB_S / (leg_s - 2.0 * (1.0 - SLOW) * CLIMB_S)
        for at_s, part, height_m in (
            (0.0, 0.0, 0.0),
            (CLIMB_S, climb, cruise_m),
            (leg_s - CLIMB_S, 1.0 - climb, cruise_m),
            (leg_s, 1.0, 0.0),
        ):
            n = (np.sin((1.0 - part) * turn) * a + np.sin(part * turn) * b) / np.sin(turn)
            when = zero.shifted(round(begin_s + at_s)).to_iso(0)
            where = f"{np.degrees(np.arctan2(n[1], n[0])):.4f},{np.degrees(np.arcsin(n[2])):.4f}"
            lines.append(f"{when},{where},{height_m:.0f}")
    return lines


def main() -> None:
    """Write both files."""
    for plan in PLANS:
        way = "eastward" if plan.eastward else "westward"
        text = f"# Round the world {way}, made by make_flights.py after Science 177, 166 (1972).\n"
        text += "instant,lon_deg,lat_deg,height_m\n" + "\n".join(rows(plan)) + "\n"
        target = FOLDER / plan.name
        temporary = target.with_suffix(".part")
        temporary.write_text(text, encoding="utf-8", newline="\n")
        os.replace(temporary, target)
        print(f"wrote {target.name}: {len(text.splitlines())} lines")


if __name__ == "__main__":
    main()
