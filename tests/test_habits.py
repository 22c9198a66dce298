"""The guards of the tests themselves: tolerances and the network."""

from __future__ import annotations

import socket
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest


@pytest.mark.parametrize(
    ("expected", "rel"),
    [(1e-16, 0.1), (1e-9, None), ([1.0, 1e-5], 1e-9), (np.full((2, 2), 1e-7), None), ({"a": 0.0}, None), (0, 1e-3)],
)
def test_a_tolerance_that_the_default_hides_is_refused(expected: Any, rel: float | None) -> None:
    with pytest.raises(AssertionError, match="give abs= as well"):
        pytest.approx(expected, rel=rel)
    assert expected == pytest.approx(expected, rel=rel, abs=0)
    assert pytest.approx(1.0, rel=1e-9) == 1.0 + 5e-10


@pytest.mark.parametrize(
    "act",
    [
        lambda: socket.socket().connect(("127.0.0.1", 9)),
        lambda: socket.socket().connect_ex(("127.0.0.1", 9)),
        lambda: socket.create_connection(("127.0.0.1", 9)),
        lambda: socket.getaddrinfo("localhost", 9),
    ],
)
@pytest.mark.filterwarnings("ignore:unclosed:ResourceWarning", "ignore::pytest.PytestUnraisableExceptionWarning")
def test_no_test_reaches_the_network(act: Callable[[], object]) -> None:
    with pytest.raises(AssertionError, match="network"):
        act()
