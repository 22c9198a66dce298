"""Piecewise Chebyshev polynomials of time on a uniform grid, evaluated from exact two-part counts.

The records of an SPK kernel (types 2 and 3), the time ephemeris and the tabulated Earth rotation
are all of this form. The offset into a record is formed from the whole seconds and the fraction
apart, so that a date decades from the origin of counts keeps its last bit.
"""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput, OutOfSpan
from ..exact import FloatArray, Pair, two_product

__all__ = ["CHUNK", "ChebyshevTable", "broadcast_pair", "date_text", "span_text"]

CHUNK: Final = 8192
"""Instants evaluated at a time: the working arrays of one pass then fit into the second-level cache."""

# Up to this size a table is laid out once by coefficient, which makes random access fastest; a larger one
# (millennia of a long kernel) stays in its file and only the records asked for are read.
_COPY_LIMIT_BYTES: Final = 128 * 2**20
_EXACT_INTEGER: Final = 2.0**53


def date_text(count_s: float) -> str:
    """Write a count of seconds since 2000-01-01T12:00:00 as text, to the second (proleptic Gregorian)."""
    return str(np.datetime64("2000-01-01T12:00:00", "s") + np.timedelta64(round(count_s), "s"))


def span_text(span: tuple[float, float]) -> str:
    """Write a span of counts as text."""
    return f"{date_text(span[0])} to {date_text(span[1])}"


def broadcast_pair(pair: Pair) -> Pair:
    """Check a pair and broadcast its two parts against each other; the input is left unchanged."""
    whole, fraction = np.asarray(pair[0]), np.asarray(pair[1], dtype=np.float64)
    if whole.dtype.kind not in "iu":
        raise InvalidInput(
            f"whole seconds must be integers, got {whole.dtype}: give a pair (int64 whole seconds, float64 fraction)"
        )
    whole = whole.astype(np.int64, copy=False)
    if whole.shape != fraction.shape:
        whole, fraction = np.broadcast_arrays(whole, fraction)
    return whole, fraction


class ChebyshevTable:
    """Records of Chebyshev coefficients, each covering `step_s` seconds, one after another.

    Parameters
    ----------
    start_s : float
        Count at which the first record starts, seconds since 2000-01-01T12:00:00 of the table's scale.
    step_s : float
        Length of a record, s.
    coefficients : float array (records, components, degree + 1)
        Lowest degree first, of the argument that runs from -1 to 1 over a record. A read-only array (a view into a
        mapped file) is kept as it is, one that can be written is copied.
    name : str
        What the table is, for messages.
    """

    __slots__ = ("_columns", "_exact_step", "_fraction", "_rows", "_whole", "name", "start_s", "step_s")
    name: str
    start_s: float
    step_s: float
    _whole: int
    _fraction: float
    _exact_step: bool
    _rows: npt.NDArray[Any]
    _columns: FloatArray | None

    def __init__(self, start_s: float, step_s: float, coefficients: npt.NDArray[Any], name: str = "table") -> None:
        if coefficients.ndim != 3 or 0 in coefficients.shape:
            raise InvalidInput(
                f"{name}: coefficients have shape {coefficients.shape}; allowed is (records, components, degree + 1), "
                "none of them 0"
            )
        if not (np.isfinite(start_s) and np.isfinite(step_s) and step_s > 0):
            raise InvalidInput(f"{name}: start {start_s} s and step {step_s} s must be finite and the step positive")
        start_s, step_s = float(start_s), float(step_s)
        rows = _read_only(coefficients.copy()) if coefficients.flags.writeable else coefficients
        whole = int(np.floor(start_s))
        exact_step = step_s.is_integer() and rows.shape[0] * step_s < _EXACT_INTEGER
        self._keep(name=name, start_s=start_s, step_s=step_s, _whole=whole, _fraction=start_s - whole)
        self._keep(_exact_step=exact_step, _rows=rows, _columns=None)

    def _keep(self, **values: Any) -> None:
        for name, value in values.items():
            object.__setattr__(self, name, value)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"a ChebyshevTable is immutable; cannot set {name!r}. Make another one")

    def __reduce__(self) -> tuple[Any, ...]:
        return ChebyshevTable, (self.start_s, self.step_s, np.array(self._rows), self.name)

    @property
    def records(self) -> int:
        """Number of records."""
        return int(self._rows.shape[0])

    @property
    def components(self) -> int:
        """Number of components."""
        return int(self._rows.shape[1])

    @property
    def coefficients(self) -> npt.NDArray[Any]:
        """The coefficients as given, (records, components, degree + 1); read only."""
        return self._rows

    @property
    def span(self) -> tuple[float, float]:
        """First and last count covered, s; both belong to the table."""
        return self.start_s, self.start_s + self.records * self.step_s

    def value(self, pair: Pair) -> FloatArray:
        """Evaluate the polynomials.

        Parameters
        ----------
        pair : (int64 array, float64 array)
            Counts in the table's scale, any shape.

        Returns
        -------
        float array (..., components)

        Raises
        ------
        OutOfSpan
            For counts outside `span`; the mask marks them.
        """
        return self._checked(pair, rate=False)[0]

    def value_and_rate(self, pair: Pair) -> tuple[FloatArray, FloatArray]:
        """Evaluate the polynomials and their derivative per second; see `value`."""
        return self._checked(pair, rate=True)

    def _checked(self, pair: Pair, rate: bool) -> tuple[FloatArray, FloatArray]:
        whole, fraction = broadcast_pair(pair)
        count = whole + fraction  # only compared with the span
        outside = ~((count >= self.span[0]) & (count <= self.span[1]))
        if outside.any():
            raise OutOfSpan(
                f"{int(outside.sum())} of {outside.size} instants lie outside the span of {self.name}, "
                f"{span_text(self.span)}: leave them out or load a table that covers them",
                mask=outside,
            )
        shape = (*whole.shape, self.components)
        whole, fraction = whole.reshape(-1), fraction.reshape(-1)
        values = np.empty((whole.size, self.components))
        rates = np.empty((whole.size if rate else 0, self.components))
        for i in range(0, whole.size, CHUNK):
            part = slice(i, i + CHUNK)
            record, argument = self.locate(whole[part], fraction[part])
            value, slope = self.evaluate(record, argument, rate)
            values[part] = value.T
            if slope is not None:
                rates[part] = slope.T
        return values.reshape(shape), rates.reshape(shape if rate else (0, self.components))

    @property
    def grid(self) -> tuple[float, float, int]:
        """Start, step and number of records: tables with equal grids share `locate`."""
        return self.start_s, self.step_s, self.records

    def locate(self, whole: npt.NDArray[np.int64], fraction: FloatArray) -> tuple[npt.NDArray[np.intp], FloatArray]:
        """Record number and Chebyshev argument of 1-d counts; no span check.

        The end of the last record belongs to it; the start of every other record belongs to that record.
        """
        since = (whole - self._whole).astype(np.float64)  # exact below 2**53 s
        offset = fraction - self._fraction
        record = np.floor((since + offset) / self.step_s)
        np.clip(record, 0.0, self.records - 1.0, out=record)
        if self._exact_step:
            since -= record * self.step_s
        else:
            product, error = two_product(record, self.step_s)
            since -= product
            offset = offset - error
        since += offset
        since *= 2.0 / self.step_s
        since -= 1.0
        return record.astype(np.intp), since

    def evaluate(
        self, record: npt.NDArray[np.intp], argument: FloatArray, rate: bool
    ) -> tuple[FloatArray, FloatArray | None]:
        """Clenshaw's recurrence at located instants (at most `CHUNK` of them for speed).

        Returns
        -------
        value : float array (components, n)
        rate : float array (components, n) or None
            Derivative per second.

        Notes
        -----
        b_k = c_k + 2 s b_(k+1) - b_(k+2) for the value (Clenshaw 1955, Math. Tables Aids Comput. 9, 118) and its
        derivative with respect to s, of which half is carried along: d_k = b_(k+1) + 2 s d_(k+1) - d_(k+2).
        """
        value, slope, gather = self._recurrence(record, argument, rate)
        value += gather(0)
        return value, slope

    def evaluate_apart(self, record: npt.NDArray[np.intp], argument: FloatArray) -> tuple[FloatArray, FloatArray]:
        """The constant of each record, exact, and what changes over it, each (components, n): not yet added up.

        The second part is smaller than the sum, and so is its rounding.
        """
        value, _, gather = self._recurrence(record, argument, rate=False)
        return np.array(gather(0)), value

    def _recurrence(
        self, record: npt.NDArray[np.intp], argument: FloatArray, rate: bool
    ) -> tuple[FloatArray, FloatArray | None, Any]:
        """Value without the constant, derivative per second, and what gathers coefficients."""
        gather = self._gatherer(record)
        shape = (self.components, record.size)
        twice = 2.0 * argument
        b1, b2, spare = np.zeros(shape), np.zeros(shape), np.empty(shape)
        d1, d2 = (np.zeros(shape), np.zeros(shape)) if rate else (b1, b2)
        for k in range(self._rows.shape[2] - 1, 0, -1):
            if rate:
                np.multiply(d1, twice, out=spare)
                spare -= d2
                spare += b1
                d2, d1, spare = d1, spare, d2
            np.multiply(b1, twice, out=spare)
            spare -= b2
            spare += gather(k)
            b2, b1, spare = b1, spare, b2
        np.multiply(b1, argument, out=spare)
        spare -= b2
        if not rate:
            return spare, None, gather
        d1 *= argument
        d1 -= d2
        d1 *= 2.0
        d1 += b1
        d1 *= 2.0 / self.step_s
        return spare, d1, gather

    def _gatherer(self, record: npt.NDArray[np.intp]) -> Any:
        """Return a function that gives coefficient k of every instant, (components, n)."""
        columns = self._columns
        if columns is None and self._rows.nbytes <= _COPY_LIMIT_BYTES:
            # Two threads may both make this copy; they make the same one.
            columns = _read_only(np.array(self._rows.transpose(2, 1, 0), dtype=np.float64, order="C"))
            self._keep(_columns=columns)
        if columns is None:
            picked = np.ascontiguousarray(self._rows[record].transpose(2, 1, 0), dtype=np.float64)
            return picked.__getitem__
        layout, buffer = columns, np.empty((self.components, record.size))

        def take(k: int) -> FloatArray:
            # The records are in range already; "clip" lets numpy write straight into the buffer.
            return np.take(layout[k], record, axis=1, out=buffer, mode="clip")

        return take


def _read_only(array: npt.NDArray[Any]) -> npt.NDArray[Any]:
    """The same array, closed to writing."""
    array.flags.writeable = False
    return array
