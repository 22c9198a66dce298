"""Every public object through pickle and into another process: the same object, the same results, still immutable."""

from __future__ import annotations

import copy
import multiprocessing
import pickle
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale import errors
from tscale.serial import to_json

from . import serial_objects as made


def _results() -> dict[str, Callable[[], Any]]:
    def ask(method: str) -> Any:
        chain, t = made.to_barycentre()
        return getattr(chain, method)(t)

    return {
        "ledger": lambda: ask("ledger"),
        "budget": lambda: ask("budget"),
        "what if": lambda: tscale.what_if(*made.to_barycentre(), leap_seconds=tscale.LeapSeconds.default()),
        "link": made.link,
        "two-way link": made.two_way,
        **{name: (lambda make=make: make()[0]) for name, make in made.CHAINS.items()},
    }


OBJECTS: dict[str, Callable[[], Any]] = {**made.VALUES, "kernel orbit": made.spk, **_results()}


@pytest.mark.parametrize("name", sorted(OBJECTS))
def test_pickles(name: str) -> None:
    value = OBJECTS[name]()
    text = to_json(value)
    for protocol in (2, pickle.HIGHEST_PROTOCOL):
        assert to_json(pickle.loads(pickle.dumps(value, protocol))) == text
    assert to_json(copy.deepcopy(value)) == text
    assert to_json(copy.copy(value)) == text


def _there(blob: bytes) -> tuple[str, bytes]:
    """In the other process: what came, and the same on its way back."""
    value = pickle.loads(blob)
    return to_json(value), pickle.dumps(value)


def test_into_another_process_and_back() -> None:
    # A process that shares nothing: `spawn`, not a copy of this one.
    values = {name: make() for name, make in OBJECTS.items()}
    with ProcessPoolExecutor(1, mp_context=multiprocessing.get_context("spawn")) as pool:
        answers = dict(zip(values, pool.map(_there, [pickle.dumps(value) for value in values.values()]), strict=True))
    for name, value in values.items():
        text, blob = answers[name]
        assert text == to_json(value), name
        assert to_json(pickle.loads(blob)) == text, name


def test_a_chain_maps_the_same_after_its_journey() -> None:
    for make in made.CHAINS.values():
        chain, t = make()
        there = pickle.loads(pickle.dumps(chain))
        assert (there(t) == chain(t)).all()
        assert there.provenance(t).digest == chain.provenance(t).digest


def test_copies_are_as_immutable_as_the_first() -> None:
    t = pickle.loads(pickle.dumps(made.UTC))
    with pytest.raises(ValueError, match="read-only"):
        t.whole[0] = 1
    with pytest.raises(AttributeError, match="immutable"):
        t.scale = "TAI"
    with pytest.raises(AttributeError):
        pickle.loads(pickle.dumps(made.SITE)).name = "other"
    log = pickle.loads(pickle.dumps(made.log()))
    with pytest.raises(ValueError, match="read-only"):
        log._curve.sigma_s[0] = 1.0


def test_tables_and_bundles(reference: tscale.ReferenceData) -> None:
    assert pickle.loads(pickle.dumps(reference)) is reference
    other = reference.replace(leap_seconds=reference.leap_seconds.with_step(62502, 36))
    assert pickle.loads(pickle.dumps(other)).fingerprint == other.fingerprint
    for table in (reference.leap_seconds, reference.earth_orientation, reference.ephemeris, reference.time_ephemeris):
        assert pickle.loads(pickle.dumps(table)).sha256 == table.sha256


KINDS = sorted(
    (kind for kind in vars(errors).values() if isinstance(kind, type) and issubclass(kind, errors.TscaleError)),
    key=lambda kind: kind.__name__,
)


@pytest.mark.parametrize("kind", KINDS, ids=lambda kind: kind.__name__)
def test_errors_keep_what_they_carry(kind: type[errors.TscaleError]) -> None:
    first = kind("3 of 4 are wrong", mask=np.array([True, False, True, True]), row=7, path="somewhere/log.csv")
    for error in (pickle.loads(pickle.dumps(first)), copy.deepcopy(first)):
        assert type(error) is kind
        assert str(error) == "3 of 4 are wrong"
        assert error.mask.tolist() == [True, False, True, True]
        assert (error.row, error.path) == (7, Path("somewhere/log.csv"))


def _fails(what: str) -> None:
    if what == "span":
        tscale.chain("UTC", "UT1")(tscale.Instants.from_iso(["2025-01-01", "1961-02-03"], "UTC"))
    elif what == "text":
        tscale.Instants.from_iso(["2025-01-01", "2025-13-01"], "UTC")
    else:
        tscale.ClockLog.load("not there.csv")


def test_errors_of_another_process() -> None:
    with ProcessPoolExecutor(1, mp_context=multiprocessing.get_context("spawn")) as pool:
        for what, kind, mask in (
            ("span", errors.OutOfSpan, [False, True]),
            ("text", errors.TextError, [False, True]),
            ("file", errors.DataFileError, None),
        ):
            with pytest.raises(kind) as caught:
                pool.submit(_fails, what).result()
            assert (None if caught.value.mask is None else np.asarray(caught.value.mask).tolist()) == mask
            assert (caught.value.path == Path("not there.csv")) == (what == "file")
