"""Frames of other libraries: dates in and out, bit for bit, the rest of the frame as it was."""

from __future__ import annotations

import sys
from typing import Any

import numpy as np
import pandas as pd
import polars as pl
import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.errors import DataFileError, InvalidInput, MissingPiece, TextError
from tscale.interop import add_to_frame, convert_frame, from_frame

from .strategies import dates

KINDS = ["pandas", "polars", "pyarrow", "numpy"]
T = tscale.Instants.from_seconds(
    [794276465, -5, 2**61, 0], [0.639426798458, np.nextafter(1.0, 0.0), 0.1, 5e-324], scale="TT", place="GEOCENTER"
)
UTC = tscale.Instants.from_iso(
    ["2016-12-31T23:59:60.5", "2025-03-03T12:21:00.639426798458", "1965-06-30T12:00:00", "2020-02-29T00:00:00"], "UTC"
)


def frame_of(kind: str, columns: dict[str, Any]) -> Any:
    if kind == "pandas":
        return pd.DataFrame(columns, index=pd.Index([7, 3, 5, 1], name="row"))
    if kind == "polars":
        return pl.DataFrame(columns)
    if kind == "pyarrow":
        return pa.table(columns)
    out = np.empty(4, dtype=[(name, np.asarray(values).dtype) for name, values in columns.items()])
    for name, values in columns.items():
        out[name] = values
    return out


def column(frame: Any, name: str) -> Any:
    return np.asarray(frame[name])


@pytest.mark.parametrize("kind", KINDS)
def test_there_and_back_bit_for_bit(kind: str) -> None:
    frame = frame_of(kind, {"count": [1, 2, 3, 4], "flux": [0.1, 0.2, np.inf, -0.0]})
    made = add_to_frame(frame, T, "seen")
    assert type(made) is type(frame)
    read = from_frame(made, "seen", scale="TT", place="GEOCENTER")
    assert np.array_equal(read.whole, T.whole)
    assert np.array_equal(read.fraction.view(np.int64), T.fraction.view(np.int64))
    assert (read.scale, read.place) == ("TT", "GEOCENTER")
    assert np.array_equal(column(made, "flux"), column(frame, "flux"))
    assert np.signbit(column(made, "flux")[3])
    # The frame given has no more columns than it had, and the only dates need no name.
    assert len(frame.dtype.names if kind == "numpy" else frame.columns) == 2
    assert (from_frame(made, scale="TT", place="GEOCENTER") == T).all()


@given(st.lists(dates("UTC"), min_size=1, max_size=5))
def test_any_dates(parts: list[tscale.Instants]) -> None:
    t = tscale.Instants.concatenate([part.ravel() for part in parts])
    for frame in (pd.DataFrame({"n": range(len(t))}), pl.DataFrame({"n": range(len(t))})):
        back = from_frame(add_to_frame(frame, t, "t"), "t", scale="UTC")
        assert np.array_equal(back.whole, t.whole)
        assert np.array_equal(back.fraction.view(np.int64), t.fraction.view(np.int64))


def test_pandas_keeps_its_index_and_types() -> None:
    frame = frame_of("pandas", {"kind": pd.Categorical(["a", "b", "a", "b"]), "mixed": [1, "two", None, 4.0]})
    made = add_to_frame(frame, T, "seen")
    assert made.index.equals(frame.index)
    assert made["kind"].dtype == frame["kind"].dtype
    assert made["seen_whole_s"].dtype == np.int64
    # A column that Arrow cannot hold is not in the way where the dates are named.
    assert (from_frame(made, "seen", scale="TT", place="GEOCENTER") == T).all()
    with pytest.raises(InvalidInput, match="name the column of dates"):
        from_frame(made, scale="TT")
    assert (from_frame(made[::-1], "seen", scale="TT", place="GEOCENTER") == T[::-1]).all()


def test_metadata_of_arrow_tables_speak() -> None:
    made = add_to_frame(pa.table({"n": [1, 2, 3, 4]}), T, "seen")
    assert from_frame(made).place == "GEOCENTER"
    assert from_frame(made).scale == "TT"
    with pytest.raises(InvalidInput, match="by their metadata"):
        from_frame(made, scale="TDB")
    with pytest.raises(InvalidInput, match="by their metadata"):
        from_frame(made, place="BARYCENTER")
    # Polars and pandas have no room for them: the scale has to be said again.
    with pytest.raises(InvalidInput, match="nothing says which scale"):
        from_frame(pl.DataFrame(made), "seen")


@pytest.mark.parametrize("kind", KINDS)
def test_datetimes_by_choice(kind: str) -> None:
    stamps = np.array(["2016-12-31T23:59:59.123456789", "2025-01-01", "1970-01-01", "2100-02-28"], "datetime64[ns]")
    read = from_frame(frame_of(kind, {"when": stamps}), "when", scale="TAI")
    assert (read == tscale.timecodes.from_datetime64(stamps, "TAI")).all()
    with pytest.raises(InvalidInput, match="nothing says which scale"):
        from_frame(frame_of(kind, {"when": stamps}), "when")


@pytest.mark.parametrize("kind", KINDS)
def test_texts_by_choice(kind: str) -> None:
    texts = UTC.to_iso(15).tolist()
    read = from_frame(frame_of(kind, {"when": texts, "n": [1, 2, 3, 4]}), "when", scale="UTC")
    # 15 decimals hold a fraction of an UTC second to 0.5 fs.
    assert np.max(np.abs(read.minus(UTC))) <= 6e-16
    with pytest.raises(TextError):
        from_frame(frame_of(kind, {"when": ["2025-01-01", "never", "2025-01-02", "2025-01-03"]}), "when", scale="UTC")


def test_a_time_zone_says_utc() -> None:
    zoned = pd.DataFrame({"when": pd.to_datetime(["2025-07-01T10:00:00+02:00"]).tz_convert("Europe/Helsinki")})
    assert from_frame(zoned).to_iso(0).tolist() == ["2025-07-01T08:00:00"]
    with pytest.raises(InvalidInput, match="by their metadata"):
        from_frame(zoned, scale="TAI")


def test_rows_without_a_date() -> None:
    frame = pd.DataFrame({"when": pd.to_datetime(["2025-07-01", None])})
    with pytest.raises(DataFileError, match="1 of 2 rows have no date") as caught:
        from_frame(frame, "when", scale="UTC")
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]
    broken = pl.DataFrame({"t_whole_s": [1, 2], "t_fraction_s": [0.5, 1.0]})
    with pytest.raises(DataFileError, match=r"not in \[0, 1\)"):
        from_frame(broken, scale="TT")


@pytest.mark.parametrize("kind", KINDS)
def test_conversion_of_a_frame(kind: str) -> None:
    site = tscale.Site.from_geodetic("Kestrel Ridge", lon_deg=127.3518, lat_deg=-26.1473, height_m=612.4)
    chain = tscale.chain("UTC", "TDB", site=site)
    frame = add_to_frame(frame_of(kind, {"n": [4, 3, 2, 1]}), UTC[[0, 1, 3, 3]], "seen")
    made = convert_frame(frame, chain, "seen", result="tdb", ledger=True, sigma=True, rate=True)
    assert type(made) is type(frame)
    out = chain(UTC[[0, 1, 3, 3]])
    assert (from_frame(made, "tdb", scale="TDB", place="TOPOCENTER") == out).all()
    assert np.array_equal(column(made, "tdb_sigma_s"), chain.sigma_s(UTC[[0, 1, 3, 3]]))
    assert np.array_equal(column(made, "tdb_rate"), chain.rate(UTC[[0, 1, 3, 3]]))
    names = made.dtype.names if kind == "numpy" else list(getattr(made, "column_names", made.columns))
    terms = [name for name in names if name.startswith("tdb: ")]
    total = sum(column(made, name) for name in terms)
    assert np.max(np.abs(total - chain.ledger(UTC[[0, 1, 3, 3]]).total)) < 1e-13  # float64 of 69 s: 1.4e-14 each
    assert np.array_equal(column(made, "n"), [4, 3, 2, 1])


def test_several_chains_and_their_refusals() -> None:
    frame = add_to_frame(pl.DataFrame({"n": [1, 2, 3, 4]}), UTC, "seen")
    both = convert_frame(frame, [tscale.chain("UTC", "TAI"), tscale.chain("UTC", "TT")])
    assert both.columns[-4:] == ["TAI_whole_s", "TAI_fraction_s", "TT_whole_s", "TT_fraction_s"]
    with pytest.raises(InvalidInput, match="already"):
        add_to_frame(frame, UTC, "seen")
    with pytest.raises(InvalidInput, match="do not fit 4 rows"):
        add_to_frame(frame, UTC[:2], "other")
    with pytest.raises(InvalidInput, match="one instant a row"):
        add_to_frame(frame, UTC.reshape(2, 2), "other")
    with pytest.raises(InvalidInput, match="takes Instants"):
        add_to_frame(frame, [1, 2, 3, 4], "other")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match=r"collect\(\) it first"):
        from_frame(frame.lazy(), "seen", scale="UTC")
    with pytest.raises(InvalidInput, match="is neither"):
        from_frame({"seen_whole_s": [1]}, "seen", scale="UTC")
    with pytest.raises(InvalidInput, match="texts: rename"):
        from_frame(pd.DataFrame({0: [1]}), scale="UTC")
    made = add_to_frame(pa.table({"n": [1, 2, 3, 4]}), UTC, "seen")
    with pytest.raises(InvalidInput, match="by their metadata"):
        convert_frame(made, tscale.chain("TT", "TAI"), "seen")


def test_any_other_arrow_stream_is_a_pyarrow_table() -> None:
    class Rows:
        """A frame of a library that nobody here knows."""

        def __init__(self) -> None:
            self._table = pa.table({"n": [1, 2, 3, 4]})

        def __len__(self) -> int:
            return 4

        def __arrow_c_stream__(self, requested_schema: object = None) -> object:
            return self._table.__arrow_c_stream__(requested_schema)

    made = add_to_frame(Rows(), T, "seen")
    assert isinstance(made, pa.Table)
    assert (from_frame(made) == T).all()


def test_without_pyarrow(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    with pytest.raises(MissingPiece, match=r"tscale\[tables\]"):
        from_frame(pd.DataFrame({"n": [1]}), "n", scale="UTC")
