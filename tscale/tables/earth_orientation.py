"""Earth orientation: UT1-TAI, polar motion and celestial pole offsets, each with its uncertainty and status."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, replace
from functools import lru_cache
from pathlib import Path
from typing import Any, Final, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from .. import exact
from ..errors import InvalidInput, OutOfSpan
from ..exact import FloatArray, IntArray, Pair
from ..formats.leap_seconds import LeapSeconds
from .common import FrozenArrays, as_pair, mjd_date, read_file, rows_hash, since
from .eop_held import grow_sigmas, warn_held
from .eop_rows import EOPMotion, EOPNodes, EOPRows, EOPValues, checked_rows, constant_rows, nodes_of
from .iers_files import installed_rows, parse_earth_orientation
from .node_cubics import evaluate, evaluate_with_slope
from .sub_daily import add_sub_daily, sub_daily_terms, with_sub_daily_ut1
from .sub_daily_lines import lines_hash

__all__ = ["EOPMotion", "EOPValues", "EarthOrientation"]

AfterEnd: TypeAlias = Literal["raise", "hold"]

_EXTRAPOLATED: Final = np.int8(2)

# A UT1 that came out of this table may miss its ends by a rounding on the way back.
_SLACK_S: Final = 1e-9


@dataclass(frozen=True, eq=False, repr=False)
class EarthOrientation(FrozenArrays):
    """A table of Earth orientation by day: made with `default`, `load`, `from_rows` or `constant`.

    Attributes
    ----------
    name : str
        Shown in messages and provenance.
    mjd : int array
        Days (MJD, 0h UTC) of the rows.
    after_end : {"raise", "hold"}
        What `at` does past the last row: raise `OutOfSpan`, or hold the last values with a growing uncertainty and an
        `ExtrapolationWarning`.
    sha256 : str
        Of the file's bytes, or of the rows if there is no file.
    issued : str or None
        Date of the last measured row, which is days to weeks before the date of issue.
    path : pathlib.Path or None
        The file, or the folder of both files of the default table.
    sub_daily : bool
        Whether the tidal variations within a day are added: see `with_sub_daily`.

    Notes
    -----
    Rows are turned from UT1-UTC to UT1-TAI and from 0h UTC to TAI before anything is interpolated, so that a leap
    second is no jump. Between rows the four-point Lagrange polynomial is used (IERS Conventions 2010, section 5.5); on
    the C04 series it differs from a ten-point one by 1.4 us rms in UT1 halfway between rows, where a straight line
    differs by 18 us. Uncertainties are interpolated straight: the errors of neighbouring days go together. Those of
    predicted UT1 and pole are twice what finals2000A states, as large as their errors turn out. Between a measured and
    a predicted row the status is predicted.
    Tides of a day and less are not in the daily series: see `with_sub_daily`.
    """

    name: str
    mjd: IntArray
    after_end: AfterEnd
    sha256: str
    issued: str | None
    path: Path | None
    _nodes: EOPNodes
    sub_daily: bool = False

    def __post_init__(self) -> None:
        if self.after_end not in ("raise", "hold"):
            raise InvalidInput(f"after_end is 'raise' or 'hold', got {self.after_end!r}")
        super().__post_init__()

    # ---- making one ------------------------------------------------------------------------------

    @classmethod
    def default(cls, leap_seconds: LeapSeconds | None = None) -> EarthOrientation:
        """Build the table of the installed `astropy-iers-data` package, once for each leap-second table.

        C04 from 1962 to its end, then finals2000A with its predictions, then held.
        """
        return _default(LeapSeconds.default() if leap_seconds is None else leap_seconds)

    @classmethod
    def load(
        cls,
        path: str | Path,
        *,
        leap_seconds: LeapSeconds | None = None,
        after_end: AfterEnd = "raise",
        name: str | None = None,
    ) -> EarthOrientation:
        """Read a finals2000A file (its Bulletin A columns) or a C04 file of the 20 series.

        Raises
        ------
        DataFileError
            With path and row, where the file is missing, damaged or of another kind.
        """
        path = Path(path)
        content, sha256 = read_file(path, "Earth orientation file")
        rows = parse_earth_orientation(content, path)
        return cls._of(rows, name or path.name, sha256, path, leap_seconds, after_end)

    @classmethod
    def from_rows(
        cls,
        mjd: npt.ArrayLike,
        ut1_minus_utc_s: npt.ArrayLike,
        x_arcsec: npt.ArrayLike,
        y_arcsec: npt.ArrayLike,
        dx_mas: npt.ArrayLike = 0.0,
        dy_mas: npt.ArrayLike = 0.0,
        *,
        ut1_sigma_s: npt.ArrayLike = 0.0,
        x_sigma_arcsec: npt.ArrayLike = 0.0,
        y_sigma_arcsec: npt.ArrayLike = 0.0,
        dx_sigma_mas: npt.ArrayLike = 0.0,
        dy_sigma_mas: npt.ArrayLike = 0.0,
        predicted: npt.ArrayLike = False,
        leap_seconds: LeapSeconds | None = None,
        after_end: AfterEnd = "raise",
        name: str = "rows",
    ) -> EarthOrientation:
        """Make a table of one's own from at least two rows at 0h UTC, at most 10 days apart.

        Uncertainties left out mean exact values.

        Raises
        ------
        InvalidInput
            For values not finite, negative uncertainties, or days not whole, increasing and close.
        """
        values = (ut1_minus_utc_s, x_arcsec, y_arcsec, dx_mas, dy_mas)
        sigmas = (ut1_sigma_s, x_sigma_arcsec, y_sigma_arcsec, dx_sigma_mas, dy_sigma_mas)
        rows = checked_rows(mjd, values, sigmas, predicted)
        return cls._of(rows, name, rows_hash(*rows), None, leap_seconds, after_end)

    @classmethod
    def constant(
        cls,
        *,
        ut1_minus_utc_s: float = 0.0,
        x_arcsec: float = 0.0,
        y_arcsec: float = 0.0,
        dx_mas: float = 0.0,
        dy_mas: float = 0.0,
        start_mjd: int = 41317,
        end_mjd: int = 73093,
        leap_seconds: LeapSeconds | None = None,
        name: str = "constant",
    ) -> EarthOrientation:
        """Hold single values from `start_mjd` (default 1972-01-01) to `end_mjd` (2058-12-31), as worked examples do.

        UT1-UTC is what is held, so that UT1-TAI jumps where UTC does; do not use it across a leap second.
        """
        rows = constant_rows((ut1_minus_utc_s, x_arcsec, y_arcsec, dx_mas, dy_mas), start_mjd, end_mjd)
        sha256 = rows_hash(rows.mjd[[0, -1]], rows.values[0])
        return cls._of(rows, name, sha256, None, leap_seconds, "raise", constant=True)

    @classmethod
    def _of(
        cls,
        rows: EOPRows,
        name: str,
        sha256: str,
        path: Path | None,
        leap_seconds: LeapSeconds | None,
        after_end: AfterEnd,
        *,
        constant: bool = False,
    ) -> EarthOrientation:
        nodes = nodes_of(rows, LeapSeconds.default() if leap_seconds is None else leap_seconds, constant=constant)
        measured = rows.mjd[~rows.predicted]
        issued = mjd_date(measured[-1]) if path is not None and measured.size else None
        return cls(name, rows.mjd, after_end, sha256, issued, path, nodes)

    def with_sub_daily(self) -> EarthOrientation:
        """Return the same table with the tidal variations within a day added to every value and rate.

        To x, y and UT1 the ocean tides are added, to UT1 its libration too (IERS Conventions 2010, sections 8.2 and
        5.5.3). They come to 0.9 mas and 0.09 ms, 3 cm on the ground. The series of the IERS do not contain them:
        they are added after interpolation (section 5.5.1). Name and hash of the table say that they are in.

        Notes
        -----
        UT1 as a scale then contains them too. Uncertainties and status stay as they are; the model itself is good to
        some 0.02 mas and 2 us. Left out is the libration of the pole (Table 5.1a), up to 0.04 mas or 1 mm.
        """
        if self.sub_daily:
            return self
        sha256 = hashlib.sha256(f"{self.sha256} sub-daily {lines_hash()}".encode()).hexdigest()
        return replace(self, name=f"{self.name} + sub-daily tides", sha256=sha256, sub_daily=True)

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def span(self) -> tuple[int, int]:
        """First and last day (MJD, 0h UTC)."""
        return int(self.mjd[0]), int(self.mjd[-1])

    @property
    def predicted_from_mjd(self) -> int | None:
        """First predicted day, or None."""
        later = np.flatnonzero(self._nodes.status)
        return int(self.mjd[later[0]]) if later.size else None

    def __repr__(self) -> str:
        return f"<EarthOrientation {self.name!r} {mjd_date(self.mjd[0])} to {mjd_date(self.mjd[-1])}>"

    # ---- values ----------------------------------------------------------------------------------

    def at(self, tai: Pair) -> EOPValues:
        """Earth orientation at TAI counts (whole, fraction).

        Past the end of a table with `after_end="hold"` the last UT1-TAI and pole are held, status 2. The uncertainty of
        UT1 is then the last row's and 0.65 s per year past the end, in quadrature; that of the pole 0.3 arcsec and that
        of the celestial pole offsets 0.25 mas (measured by hindcast over C04 1962-2026). Good enough to turn a site;
        `ut1_minus_tai` refuses.

        Raises
        ------
        OutOfSpan
            Before the table, or past its end unless held; with the mask.
        """
        nodes = self._nodes
        interval, elapsed_s, past_s = self._find(as_pair(tai), hold=self.after_end == "hold")
        u = elapsed_s / nodes.length_s[interval]
        values = evaluate(nodes.powers, interval, u)
        sigmas = evaluate(nodes.sigmas, interval, u)
        status = nodes.status_in(interval, elapsed_s)
        if past_s is not None:
            status[past_s > 0.0] = _EXTRAPOLATED
            grow_sigmas(sigmas, past_s)
            warn_held(past_s, self.name, self.mjd[-1])
        values[0] += nodes.ut1_base[interval]
        if self.sub_daily:
            add_sub_daily(as_pair(tai), values)
        columns: list[Any] = [table[k, ...] for table in (values, sigmas) for k in range(5)]
        return EOPValues._make([*columns, status])

    def motion(self, tai: Pair) -> EOPMotion:
        """Earth orientation and its derivatives at TAI counts, without uncertainties; spans as for `at`."""
        nodes = self._nodes
        interval, elapsed_s, past_s = self._find(as_pair(tai), hold=self.after_end == "hold")
        length_s = nodes.length_s[interval]
        values, slopes = evaluate_with_slope(nodes.powers, interval, elapsed_s / length_s)
        values[0] += nodes.ut1_base[interval]
        slopes /= length_s
        if past_s is not None:
            slopes[:, past_s > 0.0] = 0.0
            warn_held(past_s, self.name, self.mjd[-1])
        if self.sub_daily:
            add_sub_daily(as_pair(tai), values, slopes)
        columns: list[Any] = [table[k, ...] for table in (values, slopes) for k in range(5)]
        return EOPMotion._make(columns)

    def status(self, tai: Pair) -> npt.NDArray[np.int8]:
        """Return 0 measured, 1 predicted, 2 extrapolated, as `at` does, without a warning."""
        interval, elapsed_s, past_s = self._find(as_pair(tai), hold=self.after_end == "hold")
        status = self._nodes.status_in(interval, elapsed_s)
        return status if past_s is None else np.where(past_s > 0.0, _EXTRAPOLATED, status)

    def ut1_minus_tai(self, tai: Pair) -> Pair:
        """UT1-TAI at TAI counts, as (whole s, fraction): always within the table, never held.

        Raises
        ------
        OutOfSpan
            Outside the table, with the mask.
        """
        tai = as_pair(tai)
        interval, elapsed_s, _ = self._find(tai, hold=False)
        return self._ut1(tai, interval, elapsed_s)

    def ut1_rate(self, tai: Pair) -> FloatArray:
        """d(UT1)/d(TAI) - 1 at TAI counts, of the interpolating polynomial; spans as for `ut1_minus_tai`."""
        tai = as_pair(tai)
        interval, elapsed_s, _ = self._find(tai, hold=False)
        rate = self._nodes.ut1_rate(interval, elapsed_s)
        if self.sub_daily:
            rate = rate + sub_daily_terms(exact.add(tai, self._nodes.ut1(interval, elapsed_s)))[1][2]
        return rate

    def ut1_minus_tai_s(self, tai: Pair) -> FloatArray:
        """UT1-TAI at TAI counts, s: `ut1_minus_tai`, rounded once to a float64."""
        return exact.seconds(self.ut1_minus_tai(tai))

    def ut1_minus_tai_near(self, ut1: Pair) -> Pair:
        """UT1-TAI for UT1 counts, to some 1e-13 s: where to start looking for the TAI that belongs to them.

        Outside the table the value at its nearer end is returned; the search that follows meets the end and raises.
        """
        ut1 = as_pair(ut1)
        tai = (ut1[0] + 32, ut1[1])
        for _ in range(2):
            tai = exact.subtract(ut1, self._ut1(tai, *self._nodes.within(tai)))
        return self._ut1(tai, *self._nodes.within(tai))

    def _ut1(self, tai: Pair, interval: IntArray, elapsed_s: FloatArray) -> Pair:
        ut1_minus_tai = self._nodes.ut1(interval, elapsed_s)
        return with_sub_daily_ut1(tai, ut1_minus_tai) if self.sub_daily else ut1_minus_tai

    def _find(self, tai: Pair, *, hold: bool) -> tuple[IntArray, FloatArray, FloatArray | None]:
        """Interval, seconds into it, and seconds past the end of the table if any are (zero for the others)."""
        nodes = self._nodes
        since_first_s = since((nodes.tai[0][0], nodes.tai[1][0]), tai)
        past_s = since((nodes.tai[0][-1], nodes.tai[1][-1]), tai)
        late = past_s > _SLACK_S
        bad = since_first_s < -_SLACK_S if hold else (since_first_s < -_SLACK_S) | late
        if np.any(bad):
            raise OutOfSpan(
                f"{np.count_nonzero(bad)} of {bad.size} instants are not in the Earth orientation table {self.name!r}, "
                f"{mjd_date(self.mjd[0])} to {mjd_date(self.mjd[-1])} (0h UTC); load one that covers them (see .mask)",
                mask=np.asarray(bad),
            )
        return *nodes.within(tai), np.where(late, past_s, 0.0) if hold and np.any(late) else None


@lru_cache(maxsize=4)
def _default(leap_seconds: LeapSeconds) -> EarthOrientation:
    rows, name, sha256, folder = installed_rows()
    return EarthOrientation._of(rows, name, sha256, folder, leap_seconds, "hold")
