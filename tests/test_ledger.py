"""The table of a ledger: one instant by its number."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

import tscale
from tscale.errors import InvalidInput
from tscale.ledger import Ledger


@pytest.fixture(scope="module")
def ledger() -> Ledger:
    t = tscale.Instants.from_iso(["2016-12-31T00:00:00", "2017-01-02T00:00:00"], scale="UTC")
    return tscale.chain("UTC", "TT").ledger(t)


def test_rows(ledger: Ledger) -> None:
    # TAI - UTC was 36 s until the end of 2016 and is 37 s since (IERS Bulletin C 52).
    rows: list[tuple[Any, int]] = [(0, 36), (1, 37), (-2, 36), (np.int64(1), 37)]
    for row, leap in rows:
        assert f"+{leap}.000000000000000" in ledger.table(row)
        assert f"+{leap + 32}.184000000000000" in ledger.table(row)


@pytest.mark.parametrize("row", ["x", None, 0.0, [0]])
def test_rows_that_are_no_numbers(ledger: Ledger, row: Any) -> None:
    with pytest.raises(InvalidInput, match="row is the number of an instant"):
        ledger.table(row)


@pytest.mark.parametrize("row", [2, -3])
def test_rows_that_are_not_there(ledger: Ledger, row: int) -> None:
    with pytest.raises(InvalidInput, match="not among the 2 instants"):
        ledger.table(row)
