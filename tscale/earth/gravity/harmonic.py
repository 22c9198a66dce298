"""A gravity field by spherical-harmonic coefficients, such as a published model of the Earth, the Moon or Mars.

    V = GM/r sum_n (R/r)^n sum_m Pbar_nm(sin phi) (C_nm cos m lambda + S_nm sin m lambda), fully normalised.

With H_nm = Pbar_nm/cos^m phi, a polynomial in s = z/r, and w = (x + i y)/r this is the real part of

    GM/r sum_m w^m sum_n (R/r)^n (C_nm - i S_nm) H_nm(s),

which knows no longitude and is smooth at the poles, as are its derivatives (after Pines 1973, AIAA J. 11, 1508). The
recursion of H_nm in n at fixed m and the Horner sum over m, both from 1e-280 on, keep clear of overflow to degree
2700 (Holmes & Featherstone 2002, J. Geodesy 76, 279).
"""

from __future__ import annotations

import os
from dataclasses import dataclass, field, replace
from functools import cached_property
from pathlib import Path
from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ...errors import InvalidInput
from ...exact import FloatArray
from ...storage import write_atomically
from .arguments import norms, positions
from .field import DEEPEST, check_scale
from .icgem import MAX_DEGREE, TIDE_SYSTEMS, Coefficients, gfc_bytes, read_gfc
from .tidal import PERMANENT_C20

__all__ = ["HarmonicField"]

_SMALL: Final = 1e-280
_VALUES: Final = 200_000
"""Numbers in one row of the recursion (points times orders), so that it stays in the processor's cache."""

ComplexArray = npt.NDArray[np.complex128]


class _Factors(NamedTuple):
    """Factors of the recursions, by degree and order."""

    forward: FloatArray  # H_nm = forward s H_(n-1)m - back H_(n-2)m
    back: FloatArray
    diagonal: FloatArray  # H_nn = diagonal H_(n-1)(n-1)
    slope: FloatArray  # dH_nm/ds = slope H_n(m+1)


@dataclass(frozen=True, eq=False)
class HarmonicField:
    """A `GravityField` of fully normalised coefficients; `load` one from a .gfc file, or give the arrays.

    Parameters
    ----------
    name : str
        Name for ledgers and messages.
    gm_m3_s2 : float
        GM that goes with the coefficients, m3/s2.
    radius_m : float
        Radius R that goes with them, m.
    c, s : float array (N + 1, N + 1)
        C_nm and S_nm, fully normalised, row n and column m <= n; N from 0 to 2700. C_00 is 1 in a file of gravity.
    tide_system : {"tide_free", "zero_tide", "mean_tide", "unknown"}
        What C_20 holds of the permanent tide.

    Raises
    ------
    InvalidInput
        Arrays that are no triangle of finite numbers, or constants out of range.
    """

    name: str
    gm_m3_s2: float
    radius_m: float
    c: FloatArray = field(repr=False)
    s: FloatArray = field(repr=False)
    tide_system: str = "unknown"

    def __post_init__(self) -> None:
        gm, radius = check_scale(self.name, self.gm_m3_s2, self.radius_m)
        arrays = []
        for what in ("c", "s"):
            try:
                array = np.array(getattr(self, what), dtype=np.float64)
            except (TypeError, ValueError) as error:
                raise InvalidInput(f"field {self.name!r}: {what} must be a square array of numbers: {error}") from error
            if array.ndim != 2 or array.shape[0] != array.shape[1] or not 1 <= len(array) <= MAX_DEGREE + 1:
                raise InvalidInput(
                    f"field {self.name!r}: {what} must be a square array of row n and column m, up to degree "
                    f"{MAX_DEGREE}, got shape {array.shape}"
                )
            bad = ~np.isfinite(array) | (np.triu(array, 1) != 0.0)
            if np.any(bad):
                raise InvalidInput(
                    f"field {self.name!r}: {int(bad.sum())} values of {what} are not finite, or not 0 where m > n",
                    mask=bad,
                )
            array.flags.writeable = False
            arrays.append(array)
        if arrays[0].shape != arrays[1].shape or np.any(arrays[1][:, 0] != 0.0):
            raise InvalidInput(f"field {self.name!r}: c and s must have one shape, and s be 0 in column 0")
        if self.tide_system not in TIDE_SYSTEMS:
            raise InvalidInput(
                f"field {self.name!r}: tide_system is one of {', '.join(TIDE_SYSTEMS)}, got {self.tide_system!r}"
            )
        for key, value in (("gm_m3_s2", gm), ("radius_m", radius), ("c", arrays[0]), ("s", arrays[1])):
            object.__setattr__(self, key, value)

    @classmethod
    def load(
        cls, path: str | os.PathLike[str], max_degree: int | None = None, *, epoch_jyear: float | None = None
    ) -> HarmonicField:
        """Read a file of the ICGEM layout (.gfc), whole or to a degree.

        Parameters
        ----------
        path : path
            File; see `icgem.read_gfc` for what it may hold.
        max_degree : int, optional
            Degree up to which coefficients are kept; by default that of the file.
        epoch_jyear : float, optional
            Julian year at which a model that varies with time is evaluated.

        Raises
        ------
        DataFileError
            Missing, damaged, truncated, of another kind, or varying with time without an epoch; with the path and row.
        InvalidInput
            Something that is no path, or a degree that the file does not reach.
        """
        if not isinstance(path, str | os.PathLike):
            raise InvalidInput(f"HarmonicField.load takes the path of a .gfc file, got {path!r:.60}")
        found: Coefficients = read_gfc(Path(path), max_degree, epoch_jyear)
        return cls(found.name, found.gm_m3_s2, found.radius_m, found.c, found.s, found.tide_system)

    def save(self, path: str | os.PathLike[str]) -> None:
        """Write a .gfc file that `load` reads back to the same bits, whole or not at all."""
        if not isinstance(path, str | os.PathLike):
            raise InvalidInput(f"HarmonicField.save takes the path of a .gfc file, got {path!r:.60}")
        content = gfc_bytes(Coefficients(self.name, self.gm_m3_s2, self.radius_m, self.c, self.s, self.tide_system))
        write_atomically(Path(path), content)

    @property
    def max_degree(self) -> int:
        """Highest degree and order."""
        return len(self.c) - 1

    def in_tide_system(self, tide_system: str, *, k20: float = 0.30190) -> HarmonicField:
        """Return the same field with C_20 of another tide system.

        C_20(zero-tide) = C_20(tide-free) + k20 A0 H0, and C_20(mean-tide) = C_20(zero-tide) + A0 H0, with A0 H0 =
        -1.3914e-8 (IERS Conventions 2010, eq. 6.14) at the Earth's reference radius.

        Parameters
        ----------
        tide_system : {"tide_free", "zero_tide", "mean_tide"}
            The one wanted. The mean-tide C_20 holds the Moon's and the Sun's own potential as if it were the Earth's:
            it describes the mean level surface, and no clock away from it.
        k20 : float
            Love number with which the model was made tide-free: 0.30190 by the IERS Conventions, 0.3 in EGM2008.

        Raises
        ------
        InvalidInput
            From or to a system that is unknown, or for a field that is not the Earth's.
        """
        known = TIDE_SYSTEMS[:3]
        if tide_system not in known:
            raise InvalidInput(f"tide_system is one of {', '.join(known)}, got {tide_system!r}")
        if self.tide_system not in known:
            raise InvalidInput(
                f"field {self.name!r} does not say its tide system, so that it cannot be changed to {tide_system}; "
                "state it with dataclasses.replace(field, tide_system=...)"
            )
        if not 6.3e6 < self.radius_m < 6.4e6 or self.max_degree < 2:
            raise InvalidInput(f"field {self.name!r} is not one of the Earth with degree 2: no permanent tide is known")
        if not 0.0 <= k20 <= 1.0:
            raise InvalidInput(f"k20 must lie within 0 to 1, got {k20!r}")
        held = dict(zip(known, (0.0, k20, 1.0 + k20), strict=True))
        c = self.c.copy()
        c[2, 0] += (held[tide_system] - held[self.tide_system]) * PERMANENT_C20
        return replace(self, c=c, tide_system=tide_system)

    def potential_m2_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Potential at body-fixed positions; see `GravityField`.

        Raises
        ------
        InvalidInput
            Not finite, not vectors, or below 0.9 of the reference radius, with the mask.
        """
        r = positions(r_m, f"field {self.name}", DEEPEST * self.radius_m)
        flat = r.reshape(-1, 3)
        out = np.empty(len(flat))
        for part in self._parts(len(flat)):
            out[part] = self._sums(flat[part], slopes=False)[0]
        return out.reshape(r.shape[:-1])

    def acceleration_m_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Gradient of the potential; see `GravityField`. Errors as for `potential_m2_s2`."""
        r = positions(r_m, f"field {self.name}", DEEPEST * self.radius_m)
        flat = r.reshape(-1, 3)
        out = np.empty_like(flat)
        for part in self._parts(len(flat)):
            _, by_r, by_s, by_w = self._sums(flat[part], slopes=True)
            distance = norms(flat[part])
            unit = flat[part] / distance[:, np.newaxis]
            # Gradients of r, s and w: the unit vector, (z - s unit)/r, (x + i y - w unit)/r; the real part counts.
            w_along = by_w.real * unit[:, 0] - by_w.imag * unit[:, 1]
            pull = unit * (by_r - (by_s * unit[:, 2] + w_along))[:, np.newaxis]
            pull[:, 0] += by_w.real
            pull[:, 1] -= by_w.imag
            pull[:, 2] += by_s
            out[part] = pull / distance[:, np.newaxis]
        return out.reshape(r.shape)

    # ---- the recursion ---------------------------------------------------------------------------

    def _parts(self, points: int) -> list[slice]:
        step = max(1, _VALUES // (self.max_degree + 1))
        return [slice(i, i + step) for i in range(0, points, step)]

    @cached_property
    def _factors(self) -> _Factors:
        n, m = np.ogrid[: self.max_degree + 1, : self.max_degree + 1]
        n, m = n.astype(np.float64), m.astype(np.float64)
        with np.errstate(divide="ignore", invalid="ignore"):
            forward = np.sqrt((2 * n - 1) * (2 * n + 1) / ((n - m) * (n + m)))
            back = np.sqrt((2 * n + 1) * (n + m - 1) * (n - m - 1) / ((n - m) * (n + m) * (2 * n - 3)))
            slope = np.sqrt((n - m) * (n + m + 1) / np.where(m == 0.0, 2.0, 1.0))
        one = np.arange(1.0, self.max_degree + 1.0)
        diagonal = np.concatenate([[1.0], np.sqrt((2 * one + 1) / (2 * one))])
        diagonal[1:2] = np.sqrt(3.0)
        return _Factors(forward, back, diagonal, slope)

    def _sums(self, r: FloatArray, slopes: bool) -> tuple[Any, ...]:
        """V, and with slopes r dV/dr, dV/ds and dV/dw (complex) of points (n, 3)."""
        top, factors = self.max_degree, self._factors
        distance = norms(r)
        s, ratio = r[:, 2] / distance, self.radius_m / distance
        w = (r[:, 0] + 1j * r[:, 1]) / distance
        shape = (top + 1, len(r))
        # Rows of H_nm by m, from 1e-280; sums over n by m. One row more, for the slope at m = n.
        before, row = np.zeros((top + 2, len(r))), np.zeros((top + 2, len(r)))
        row[0] = _SMALL
        by_m = np.zeros((3 if slopes else 1, 2, *shape))
        scale = np.ones_like(s)
        for n in range(top + 1):
            if n:
                new = before  # the row before the last is not needed again: its place is taken
                new[:n] *= -factors.back[n, :n, np.newaxis] if n > 1 else 0.0
                new[:n] += factors.forward[n, :n, np.newaxis] * (s * row[:n])
                new[n] = factors.diagonal[n] * row[n - 1]
                before, row = row, new
                scale = scale * ratio
            some = slice(0, n + 1)
            scaled = row[some] * scale
            terms = [scaled]
            if slopes:
                terms += [-(n + 1.0) * scaled, factors.slope[n, some, np.newaxis] * (row[1 : n + 2] * scale)]
            for total, term in zip(by_m, terms, strict=True):
                total[0, some] += self.c[n, some, np.newaxis] * term
                total[1, some] -= self.s[n, some, np.newaxis] * term
        return _horner(by_m[:, 0] + 1j * by_m[:, 1], np.asarray(w, dtype=np.complex128), self.gm_m3_s2 / distance)


def _horner(by_m: ComplexArray, w: ComplexArray, scale: FloatArray) -> tuple[Any, ...]:
    """Sum of w^m by_m, for each of the quantities; last the derivative by w of the first."""
    total = np.zeros((len(by_m), len(w)), dtype=np.complex128)
    slope = np.zeros(len(w), dtype=np.complex128)
    for m in range(by_m.shape[1] - 1, -1, -1):
        slope = slope * w + total[0]
        total = total * w + by_m[:, m]
    return (*(part.real / _SMALL * scale for part in total), slope / _SMALL * scale)
