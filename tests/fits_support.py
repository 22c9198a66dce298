"""FITS files of an invented mission, made by astropy for the tests."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from astropy.io import fits

import tscale

SITE = tscale.Site.load(Path(__file__).parents[1] / "examples" / "site.toml")
STAR = tscale.Source(ra_deg=187.2519, dec_deg=-12.6408)

FRAME: dict[str, Any] = {
    "TIMESYS": "TT",
    "TREFPOS": "TOPOCENTER",
    # 2001-01-01T00:00:00 UTC is 64.184 s later on TT.
    "MJDREFI": 51910,
    "MJDREFF": 0.00074287037037037,
    "TIMEUNIT": "s",
    "RA_NOM": 187.2519,
    "DEC_NOM": -12.6408,
    "RADESYS": "ICRS",
    "TIMEDEL": 2e-6,
}


def header(**cards: Any) -> fits.Header:
    """A header of the frame, with cards changed, added or (None) left out; `__` in a name stands for a hyphen."""
    found = fits.Header()
    changes = {key.replace("__", "-"): value for key, value in cards.items()}
    for key, value in {**FRAME, **changes}.items():
        if value is not None:
            found[key] = value
    return found


def with_place(found: fits.Header) -> fits.Header:
    for axis, value in zip("XYZ", SITE.position_m, strict=True):
        found[f"OBSGEO-{axis}"] = value
    return found


def times(n: int = 500, seed: int = 4) -> np.ndarray:
    return np.sort(np.random.default_rng(seed).uniform(7.0e8, 7.0e8 + 4000.0, n))


def events(found: fits.Header, t: np.ndarray, name: str = "EVENTS", time_format: str = "1D") -> fits.BinTableHDU:
    """A table whose TIME stands between a number, an array, bits and variable-length data."""
    rng = np.random.default_rng(11)
    n = len(t)
    columns = [
        fits.Column("PI", "1I", array=rng.integers(0, 99, n)),
        fits.Column("TIME", time_format, unit="s", array=t),
        fits.Column("XYZ", "3E", array=rng.random((n, 3))),
        fits.Column("FLAGS", "11X", array=rng.random((n, 11)) > 0.5),
        fits.Column("WAVE", "PJ()", array=np.array([np.arange(i % 4, dtype=np.int32) for i in range(n)], dtype=object)),
    ]
    return fits.BinTableHDU.from_columns(columns, header=found, name=name)


def good_time(found: fits.Header, start: Any, stop: Any, name: str = "GTI") -> fits.BinTableHDU:
    columns = [
        fits.Column("START", "1D", unit="s", array=np.asarray(start)),
        fits.Column("STOP", "1D", unit="s", array=np.asarray(stop)),
    ]
    return fits.BinTableHDU.from_columns(columns, header=found, name=name)


def save(path: Path, *tables: Any, primary: fits.Header | None = None, checksum: bool = True) -> Path:
    fits.HDUList([fits.PrimaryHDU(header=primary), *tables]).writeto(path, overwrite=True, checksum=checksum)
    return path


def event_file(path: Path, t: np.ndarray | None = None, **cards: Any) -> Path:
    """Events, good time, a compressed image, and a primary header with the frame."""
    t = times() if t is None else t
    span = {"TSTART": t[0], "TSTOP": t[-1], "TELAPSE": t[-1] - t[0]}
    full = with_place(header(**span, **cards))
    image = np.random.default_rng(3).integers(0, 99, (40, 50)).astype(np.int16)
    return save(
        path,
        events(full, t),
        good_time(full, [t[0], t[0] + 2000], [t[0] + 1000, t[-1]]),
        fits.CompImageHDU(image, name="PICTURE"),
        primary=header(**span, **cards),
    )


def to_barycentre(start: str = "TT@TOPOCENTER", **options: Any) -> tscale.Chain:
    return tscale.chain(start, "TDB@BARYCENTER", site=SITE, source=STAR, **options)
