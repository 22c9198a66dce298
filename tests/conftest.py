"""Shared test habits: no network, reproducible hypothesis, one reference for all."""

from __future__ import annotations

import socket
from typing import Any

import pytest
from hypothesis import HealthCheck, settings

import tscale

settings.register_profile(
    "tscale", deadline=None, derandomize=True, max_examples=60, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile("tscale")


@pytest.fixture(autouse=True)
def _no_network(monkeypatch: pytest.MonkeyPatch) -> None:
    """Nothing in the package may open a connection."""

    def refuse(*args: Any, **kwargs: Any) -> None:
        raise AssertionError("a test tried to open a network connection")

    monkeypatch.setattr(socket.socket, "connect", refuse)


@pytest.fixture(scope="session")
def reference() -> tscale.ReferenceData:
    return tscale.ReferenceData.default()
