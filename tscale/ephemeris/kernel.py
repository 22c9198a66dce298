"""Positions and velocities of bodies from an SPK kernel."""

from __future__ import annotations

import os
import threading
from collections.abc import Iterable, Mapping, Sequence
from functools import lru_cache
from pathlib import Path
from types import MappingProxyType
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..constants import GM_M3_S2
from ..errors import InvalidInput, MissingPiece, OutOfSpan
from ..exact import FloatArray, Pair
from .arguments import file_path
from .bodies import body_id, body_name
from .chebyshev import CHUNK, broadcast_pair, span_text
from .chunk import Chunk
from .daf import check_sha256, file_sha256, mass_parameters, read_container
from .paths import Leg, Part, Paths
from .segments import read_segments
from .shipped import DEFAULT_KERNEL, shipped_path

__all__ = ["Ephemeris"]

_OPENING: Final = threading.Lock()


class Ephemeris:
    """One SPK kernel: immutable, safe between threads, picklable by path and checksum.

    Vectors have ICRF axes and TDB-compatible SI units, as the kernel gives them. Where several segments cover a date,
    the last in the file counts (NAIF SPK Required Reading). Use `open` or `default`.

    Attributes
    ----------
    path : pathlib.Path
    name : str
        File name.
    comment : str
        Comment text of the file.
    given_gm_m3_s2 : mapping
        Mass parameters given to `open`.
    """

    path: Path
    name: str
    comment: str
    given_gm_m3_s2: Mapping[int, float]
    _gm: Mapping[int, float]
    _paths: Paths
    _sha256: str | None

    def __init__(self, path: Path, gm_m3_s2: Mapping[int, float]) -> None:
        container = read_container(path)
        masses = {**GM_M3_S2, **mass_parameters(container.comment), **gm_m3_s2}
        self._keep(path=path, name=path.name, comment=container.comment)
        self._keep(given_gm_m3_s2=MappingProxyType(dict(gm_m3_s2)), _gm=MappingProxyType(masses))
        self._keep(_paths=Paths(read_segments(container)), _sha256=None)

    def _keep(self, **values: Any) -> None:
        for name, value in values.items():
            object.__setattr__(self, name, value)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"an Ephemeris is immutable; cannot set {name!r}. Open another one, with gm_m3_s2= if so")

    @classmethod
    def open(cls, path: str | Path, *, gm_m3_s2: Mapping[str | int, float] | None = None) -> Ephemeris:
        """Open a kernel.

        Parameters
        ----------
        path : str or Path
            A binary SPK file.
        gm_m3_s2 : mapping, optional
            Mass parameters by NAIF number or name that overrule those in the file's comments and `constants.GM_M3_S2`.

        Raises
        ------
        DataFileError
            For a file that is missing, damaged, truncated, not an SPK kernel or of a foreign data type.
        """
        given = {body_id(body): value for body, value in (gm_m3_s2 or {}).items()}
        for body, value in given.items():
            if not (isinstance(value, (int, float, np.number)) and np.isfinite(value) and value >= 0):
                raise InvalidInput(
                    f"mass parameter of {body_name(body)} is {value!r} m3/s2: give a finite number, not negative"
                )
        return cls(
            Path(os.path.realpath(file_path(path, "a kernel"))), {body: float(value) for body, value in given.items()}
        )

    @classmethod
    def default(cls) -> Ephemeris:
        """Return the shipped excerpt of DE440, 1960 to 2060 (one shared value)."""
        with _OPENING:  # so that all threads get the same one
            return _default()

    def __repr__(self) -> str:
        return f"Ephemeris({self.name!r}, {span_text(self.span)} TDB)"

    def __reduce__(self) -> tuple[Any, ...]:
        return _reopen, (str(self.path), self.sha256, tuple(sorted(self.given_gm_m3_s2.items())))

    @property
    def sha256(self) -> str:
        """SHA-256 of the file, computed when first asked for."""
        if self._sha256 is None:
            self._keep(_sha256=file_sha256(self.path))
        assert self._sha256 is not None
        return self._sha256

    @property
    def bodies(self) -> tuple[int, ...]:
        """NAIF numbers of every body in the kernel."""
        return tuple(sorted(self._paths.bodies))

    @property
    def span(self) -> tuple[float, float]:
        """First and last TDB count (s) between which every body of the kernel is covered."""
        return self._paths.span

    def span_of(self, bodies: Iterable[str | int]) -> tuple[float, float]:
        """First and last TDB count (s) between which all the given bodies are covered."""
        spans = [self._paths.covered(leg) for leg in self._legs(bodies)]
        return max(first for first, _ in spans), min(last for _, last in spans)

    def record_grid(self, body: str | int) -> tuple[float, float]:
        """Start and length (s) of the shortest records on the path from the barycentre to a body.

        An integrator whose panels keep to these edges meets only smooth functions.
        """
        grids = [segment.grid for leg in self._legs((body,)) for segment in self._paths.segments(leg)]
        return min((grid for grid in grids if grid is not None), key=lambda grid: grid[1])

    def _legs(self, bodies: Iterable[str | int]) -> tuple[Leg, ...]:
        numbers = [body_id(body) for body in bodies]
        self._need(numbers)
        nothing = np.empty(0)
        return tuple({leg: None for number in numbers for leg in self._paths.plan(number, 0, nothing)[2]})

    def _need(self, numbers: Iterable[int]) -> None:
        for number in numbers:
            if number not in self._paths.bodies:
                raise MissingPiece(
                    f"{self.name} does not hold {body_name(number)}; it holds "
                    f"{', '.join(body_name(n) for n in self.bodies)}: open a kernel that does",
                    path=self.path,
                )

    def gm_m3_s2(self, body: str | int) -> float:
        """TDB-compatible mass parameter, m3/s2: as given to `open`, else from the kernel's comments, else DE440's.

        Raises
        ------
        InvalidInput
            For a body without a known mass parameter.
        """
        number = body_id(body)
        if number in self._gm:
            return self._gm[number]
        if number == 3:
            return self._gm[399] + self._gm[301]
        if number in (199, 299):  # planets without moons
            return self._gm[number // 100]
        raise InvalidInput(
            f"no mass parameter known for {body_name(number)}; known are those of "
            f"{', '.join(body_name(n) for n in sorted(self._gm))}: give it to Ephemeris.open(gm_m3_s2=...)"
        )

    def position(self, target: str | int, tdb: Pair, center: str | int = 0) -> FloatArray:
        """Position of `target` with respect to `center`.

        Parameters
        ----------
        target, center : str or int
            Body name or NAIF number.
        tdb : (int64 array, float64 array)
            TDB counts, any shape.

        Returns
        -------
        float array (..., 3)
            m, ICRF axes, TDB-compatible.

        Raises
        ------
        OutOfSpan
            For dates that the kernel does not cover; the mask marks them.
        MissingPiece
            For a body that the kernel does not hold.
        """
        position: FloatArray = self._states((target,), tdb, center, rate=False)[0][0]
        return position

    def state(self, target: str | int, tdb: Pair, center: str | int = 0) -> tuple[FloatArray, FloatArray]:
        """Position (m) and velocity (m/s), each (..., 3); see `position`."""
        positions, velocities = self._states((target,), tdb, center, rate=True)
        return positions[0], velocities[0]

    def positions(self, targets: Sequence[str | int], tdb: Pair, center: str | int = 0) -> FloatArray:
        """Positions (targets, ..., 3) of several bodies in m; common parts of their paths are evaluated once."""
        return self._states(tuple(targets), tdb, center, rate=False)[0]

    def states(self, targets: Sequence[str | int], tdb: Pair, center: str | int = 0) -> tuple[FloatArray, FloatArray]:
        """Positions (m) and velocities (m/s), each (targets, ..., 3), of several bodies; see `positions`."""
        return self._states(tuple(targets), tdb, center, rate=True)

    def position_apart_km(self, target: str | int, tdb: Pair) -> tuple[FloatArray, FloatArray]:
        """Barycentric position in two parts that are not yet added up, each (..., 3), km as the kernel has it.

        The first is constant over a record and exact, the second smaller: what is summed apart with both keeps a tenth
        of the rounding of a position at 1 au (0.1 ps of light time). Errors as `position`.
        """
        number = body_id(target)
        self._need((number,))
        whole, fraction = broadcast_pair(tdb)
        shape = (*whole.shape, 3)
        (parts,) = self._plans([number], 0, whole + fraction)
        whole, fraction = whole.reshape(-1), fraction.reshape(-1)
        constant, rest = np.zeros((whole.size, 3)), np.empty((whole.size, 3))
        for i in range(0, whole.size, CHUNK):
            chunk = slice(i, i + CHUNK)
            for mask, legs in parts:
                picked = chunk if mask is None else i + np.flatnonzero(mask[chunk])
                some = Chunk(whole[picked], fraction[picked], False)
                first, second = some.apart(self._paths, legs)
                constant[picked], rest[picked] = first.T, second.T
        return constant.reshape(shape), rest.reshape(shape)

    def _states(
        self, targets: tuple[str | int, ...], tdb: Pair, center: str | int, rate: bool
    ) -> tuple[FloatArray, FloatArray]:
        numbers, origin = [body_id(t) for t in targets], body_id(center)
        self._need((*numbers, origin))
        whole, fraction = broadcast_pair(tdb)
        shape = (len(numbers), *whole.shape, 3)
        plans = self._plans(numbers, origin, whole + fraction)
        whole, fraction = whole.reshape(-1), fraction.reshape(-1)
        positions = np.empty((len(numbers), whole.size, 3))
        velocities = np.empty((len(numbers) if rate else 0, whole.size, 3))
        for i in range(0, whole.size, CHUNK):
            chunk = slice(i, i + CHUNK)
            every = Chunk(whole[chunk], fraction[chunk], rate)
            for k, parts in enumerate(plans):
                for mask, legs in parts:
                    picked: slice | npt.NDArray[np.intp] = chunk
                    some = every
                    if mask is not None:
                        picked = i + np.flatnonzero(mask[chunk])
                        some = Chunk(whole[picked], fraction[picked], rate)
                    position, velocity = some.sum(self._paths, legs)
                    positions[k, picked] = position.T
                    if velocity is not None:
                        velocities[k, picked] = velocity.T
        return positions.reshape(shape), velocities.reshape((len(velocities), *shape[1:]))

    def _plans(self, numbers: Sequence[int], origin: int, count_s: FloatArray) -> list[list[Part]]:
        """Find the path of each target and check that it covers every date (`count_s` is only compared)."""
        plans = []
        for number in numbers:
            parts, outside, legs = self._paths.plan(number, origin, count_s.reshape(-1))
            if outside.any():
                covered = "; ".join(
                    f"{body_name(leg.target)} from {body_name(leg.center)} over {span_text(self._paths.covered(leg))}"
                    for leg in legs
                )
                raise OutOfSpan(
                    f"{int(outside.sum())} of {outside.size} dates lie outside {self.name}, which covers {covered} "
                    "TDB: leave them out or open a kernel that reaches them",
                    mask=outside.reshape(count_s.shape),
                    path=self.path,
                )
            plans.append(parts)
        return plans


@lru_cache(maxsize=1)
def _default() -> Ephemeris:
    return Ephemeris.open(shipped_path(DEFAULT_KERNEL))


@lru_cache(maxsize=8)
def _reopen(path: str, sha256: str, gm_m3_s2: tuple[tuple[int, float], ...]) -> Ephemeris:
    """Rebuild from a pickle; the value is immutable, so one per process is shared."""
    check_sha256(Path(path), sha256)
    return Ephemeris.open(path, gm_m3_s2=dict(gm_m3_s2))
