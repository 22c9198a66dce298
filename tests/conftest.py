"""Shared test habits: no network, no tolerance by accident, reproducible hypothesis, one reference for all."""

from __future__ import annotations

import socket
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, settings

import tscale

settings.register_profile(
    "tscale", deadline=None, derandomize=True, max_examples=60, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile("tscale")


_approx = pytest.approx


def _checked_approx(expected: Any, rel: float | None = None, abs: float | None = None, nan_ok: bool = False) -> Any:
    """`pytest.approx`, refused where its default of abs=1e-12 would silently be wider than the tolerance asked for."""
    if abs is None:
        values = list(expected.values()) if isinstance(expected, dict) else expected
        smallest = float(np.min(np.abs(np.asarray(values, dtype=np.float64)), initial=np.inf))
        if smallest * (1e-6 if rel is None else rel) < 1e-12:
            raise AssertionError(f"approx({expected!r}, rel={rel}) passes anything within 1e-12: give abs= as well")
    return _approx(expected, rel=rel, abs=abs, nan_ok=nan_ok)


pytest.approx = _checked_approx


@pytest.fixture(autouse=True)
def _no_network(monkeypatch: pytest.MonkeyPatch) -> None:
    """Nothing in the package may open a connection."""

    def refuse(*args: Any, **kwargs: Any) -> None:
        raise AssertionError("a test tried to open a network connection")

    monkeypatch.setattr(socket.socket, "connect", refuse)
    monkeypatch.setattr(socket.socket, "connect_ex", refuse)
    monkeypatch.setattr(socket, "create_connection", refuse)
    monkeypatch.setattr(socket, "getaddrinfo", refuse)


@pytest.fixture(scope="session")
def reference() -> tscale.ReferenceData:
    return tscale.ReferenceData.default()
