"""Evaluation of compiled chains: the same bits whatever the order, number, layout and threads; and what is refused."""

from __future__ import annotations

import pickle
import threading
from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.compiled.piece_table import PieceTable, Scratch
from tscale.errors import InvalidInput, OutOfSpan, ScaleMismatch

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, parallax_mas=0.5)
CHAIN = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)


@pytest.fixture(scope="module")
def compiled() -> tscale.CompiledChain:
    return CHAIN.compile("2020-01-01", "2020-01-06", tolerance_s=1e-12)


@pytest.fixture(scope="module")
def counts(compiled: tscale.CompiledChain) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(1)
    first, last = compiled.span.whole
    n = 700_000
    fraction = rng.random(n)
    fraction[:1000] = rng.choice([0.0, 0.5, 2.0**-53, 1.0 - 2.0**-53], 1000)
    return rng.integers(first, last, n), fraction


def same(a: tuple[np.ndarray, np.ndarray], b: tuple[np.ndarray, np.ndarray]) -> bool:
    return bool(np.array_equal(a[0], b[0]) and np.array_equal(a[1], b[1]))


def test_results_are_normalised_counts(compiled: tscale.CompiledChain, counts: tuple) -> None:
    whole, fraction = compiled.evaluate(*counts)
    assert whole.dtype == np.int64
    assert fraction.dtype == np.float64
    assert fraction.min() >= 0.0
    assert fraction.max() < 1.0
    t = tscale.Instants.from_seconds(*counts, scale="UTC")
    assert (compiled(t) == tscale.Instants.from_seconds(whole, fraction, scale="TDB", place="BARYCENTER")).all()


def test_order_threads_and_company_change_no_bit(compiled: tscale.CompiledChain, counts: tuple) -> None:
    want = compiled.evaluate(*counts)
    for threads in (2, 5):
        assert same(compiled.evaluate(*counts, threads=threads), want)
    order = np.lexsort(counts[::-1])
    by_date = compiled.evaluate(counts[0][order], counts[1][order])
    assert same(by_date, (want[0][order], want[1][order]))
    by_second = np.argsort(counts[0], kind="stable")  # fractions in no order within a second
    assert same(compiled.evaluate(counts[0][by_second], counts[1][by_second]), (want[0][by_second], want[1][by_second]))
    for i in range(0, 2000, 7):
        t = tscale.Instants.from_seconds(counts[0][i], counts[1][i], scale="UTC")
        one = compiled(t)
        assert (int(one.whole), float(one.fraction)) == (want[0][i], want[1][i])
        assert one.shape == ()
    some = compiled.evaluate(counts[0][100:107], counts[1][100:107])
    assert same(some, (want[0][100:107], want[1][100:107]))


def test_the_way_back_is_as_exact(compiled: tscale.CompiledChain, counts: tuple) -> None:
    there = compiled.evaluate(*counts)
    back = compiled.evaluate_inverse(*there)
    # Two polynomials with an error of 1e-12 s each.
    assert np.max(np.abs(exact.seconds(exact.subtract(back, counts)))) <= 2e-12
    t = tscale.Instants.from_seconds(*there, scale="TDB", place="BARYCENTER")
    assert same(compiled.inverse(t).pair, back)
    assert compiled.inverse(t).node == compiled.start


def test_ends_and_their_images_are_inside(compiled: tscale.CompiledChain) -> None:
    for t in (compiled.span, compiled.span[0], compiled.span[1]):
        out = compiled(t)
        back = compiled.inverse(out)
        assert np.max(np.abs(back.minus(t.at("TOPOCENTER")))) <= 2e-12
        again = compiled(back)
        assert np.max(np.abs(again.minus(out))) <= 4e-12
    ends = compiled.inverse_span
    assert np.max(np.abs(compiled(compiled.inverse(ends)).minus(ends))) <= 2e-12


def test_any_layout_is_taken_and_left_unchanged(compiled: tscale.CompiledChain, counts: tuple) -> None:
    whole, fraction = (part[:600] for part in counts)
    want = compiled.evaluate(whole, fraction)
    kept = whole.copy(), fraction.copy()
    shaped = compiled.evaluate(whole.reshape(20, 30), fraction.reshape(20, 30))
    assert shaped[0].shape == (20, 30)
    assert same((shaped[0].ravel(), shaped[1].ravel()), want)
    turned = compiled.evaluate(whole.reshape(20, 30).T, fraction.reshape(20, 30).T)
    assert same((turned[0].T.ravel(), turned[1].T.ravel()), want)
    assert same(compiled.evaluate(whole[::-3], fraction[::-3]), (want[0][::-3], want[1][::-3]))
    assert same(compiled.evaluate(whole, 0.5), compiled.evaluate(whole, np.full(600, 0.5)))
    assert compiled.evaluate(int(whole[0]), float(fraction[0]))[0].shape == ()
    assert compiled.evaluate(whole[:0], fraction[:0])[0].shape == (0,)
    assert same(compiled.evaluate(whole.astype(np.int32), fraction), want)
    assert same((whole, fraction), kept)
    t = tscale.Instants.from_seconds(whole.reshape(20, 30), fraction.reshape(20, 30), scale="UTC")
    assert compiled(t).shape == compiled.rate(t).shape == (20, 30)
    assert compiled(t).node == tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE).end


def test_results_go_where_they_are_wanted(compiled: tscale.CompiledChain, counts: tuple) -> None:
    want = compiled.evaluate(*counts)
    out = np.empty_like(counts[0]), np.empty_like(counts[1])
    for threads in (1, 2):
        got = compiled.evaluate(*counts, out=out, threads=threads)
        assert got[0] is out[0]
        assert got[1] is out[1]
        assert same(out, want)
    own = counts[0].copy(), counts[1].copy()
    compiled.evaluate(*own, out=own)
    assert same(own, want)
    # Shifted against each other they share memory, and the input is still read as it was.
    room = np.empty(1001, dtype=np.int64), np.empty(1001)
    room[0][:1000], room[1][:1000] = counts[0][:1000], counts[1][:1000]
    compiled.evaluate(room[0][:1000], room[1][:1000], out=(room[0][1:], room[1][1:]))
    assert same((room[0][1:], room[1][1:]), (want[0][:1000], want[1][:1000]))


def test_any_pair_of_arrays_may_share_memory(compiled: tscale.CompiledChain, counts: tuple) -> None:
    n = 300_000  # more than one block, and more than one share of a thread
    given = counts[0][:n], counts[1][:n]
    want = compiled.evaluate(*given)
    for threads in (1, 2):
        # Results of the one kind written over what was given of the other.
        own = given[0].copy(), given[1].copy()
        out = own[1].view(np.int64), own[0].view(np.float64)
        assert same(compiled.evaluate(*own, out=out, threads=threads), want)
        whole, out_whole = given[0].copy(), np.empty(n, dtype=np.int64)
        assert same(compiled.evaluate(whole, given[1], out=(out_whole, whole.view(np.float64)), threads=threads), want)
        fraction, out_fraction = given[1].copy(), np.empty(n)
        out = fraction.view(np.int64), out_fraction
        assert same(compiled.evaluate(given[0], fraction, out=out, threads=threads), want)
        # Written backwards over itself.
        own = given[0].copy(), given[1].copy()
        got = compiled.evaluate(own[0][::-1], own[1][::-1], out=own, threads=threads)
        assert same(got, (want[0][::-1], want[1][::-1]))
        # Fields of one table, in place: nothing is written over.
        table = np.zeros(n, dtype=[("whole", np.int64), ("fraction", np.float64)])
        table["whole"], table["fraction"] = given
        pair = table["whole"], table["fraction"]
        assert same(compiled.evaluate(*pair, out=pair, threads=threads), want)
    few = given[0][:5].copy(), given[1][:5].copy()
    out = few[1].view(np.int64), few[0].view(np.float64)
    assert same(compiled.evaluate(*few, out=out), (want[0][:5], want[1][:5]))
    both = np.empty(n + 1)
    with pytest.raises(InvalidInput, match="the two arrays of out share memory"):
        compiled.evaluate(*given, out=(both[1:].view(np.int64), both[:-1]))


def test_few_and_many_give_the_same_bits(compiled: tscale.CompiledChain, counts: tuple) -> None:
    want = compiled.evaluate(*counts)
    for n in range(1, 20):
        part = slice(500 * n, 500 * n + n)
        out = np.empty(n, dtype=np.int64), np.empty(n)
        got = compiled.evaluate(counts[0][part], counts[1][part], out=out)
        assert got is out or (got[0] is out[0] and got[1] is out[1])
        assert same(out, (want[0][part], want[1][part]))
    shaped = compiled.evaluate(counts[0][:6].reshape(2, 3).T, counts[1][:6].reshape(2, 3).T)
    assert same((shaped[0].T.ravel(), shaped[1].T.ravel()), (want[0][:6], want[1][:6]))


@pytest.mark.parametrize("value", [-1e-17, -5e-17, -(2.0**-54)])
@pytest.mark.parametrize("n", [1, 9, 5000])
def test_a_sum_that_rounds_to_a_whole_second_is_carried(value: float, n: int) -> None:
    # 0 - 1e-17 is 1 - 1e-17 of the second before, which is no float: it is 0 of this one.
    whole, fraction = np.array([-(2**62), 0, 100, 200]), np.array([0.0, 0.0, 0.0, 0.0])
    powers = np.array([[np.nan, value, 0.25, np.nan]])
    table = PieceTable(whole, fraction, np.array([0, 50, 150, 150]), np.array([0, 7, 7, 0]), powers, 0, 100)
    at = np.full(n, 30), np.zeros(n)
    assert table.one(30, 0.0) == (37, 0.0)
    # All in one piece, and in no order over two.
    both = np.append(at[0], [130, 40]), np.append(at[1], [0.5, 0.0])
    for counts, want in ((at, at), (both, (np.append(at[0], [130, 40]), np.append(at[1], [0.75, 0.0])))):
        out = np.empty_like(counts[0]), np.empty_like(counts[1])
        table.map(*counts, out, Scratch(4096))
        assert same(out, (want[0] + 7, want[1]))


def test_one_among_many_pieces_of_a_second(compiled: tscale.CompiledChain) -> None:
    # A thousand pieces that start within three seconds: a single instant finds its own like any other.
    rng = np.random.default_rng(7)
    starts = np.sort(rng.random(1000) * 3.0)
    starts[[0, 500]] = 0.0, starts[501]  # and one of no length
    whole = np.concatenate([[-(2**62)], np.floor(starts).astype(np.int64), [3]])
    fraction = np.concatenate([[0.0], starts % 1.0, [0.0]])
    powers = np.concatenate([[np.nan], rng.random(1000), [np.nan]])[None]
    zeros = np.zeros(1002, dtype=np.int64)
    table = PieceTable(whole, fraction, zeros, zeros, powers, 0, 86400)
    at = rng.integers(0, 3, 3000), rng.random(3000)
    at[0][:1000], at[1][:1000] = whole[1:-1], fraction[1:-1]
    out = np.empty_like(at[0]), np.empty_like(at[1])
    table.map(*at, out, Scratch(4096))
    for w, f, ow, of in zip(*at, *out, strict=True):
        assert table.one(int(w), float(f)) == (ow, of)


def test_threads_share_it(compiled: tscale.CompiledChain, counts: tuple) -> None:
    want = compiled.evaluate(*counts)
    good = []

    def work() -> None:
        good.extend(same(compiled.evaluate(*counts), want) for _ in range(3))

    jobs = [threading.Thread(target=work) for _ in range(4)]
    for job in jobs:
        job.start()
    for job in jobs:
        job.join()
    assert good == [True] * 12


def test_nothing_in_it_can_be_changed(compiled: tscale.CompiledChain, tmp_path: Path) -> None:
    compiled.save(tmp_path / "file")
    for one in (compiled, pickle.loads(pickle.dumps(compiled)), tscale.load_compiled(tmp_path / "file")):
        before = [(name, id(value)) for table in one._tables for name, value in vars(table).items()]
        arrays = [value for table in one._tables for value in vars(table).values() if isinstance(value, np.ndarray)]
        arrays += [part for pair in one._span for part in pair]
        assert len(arrays) == 22
        assert not any(array.flags.writeable for array in arrays)
        # Nothing is made on first use either, which two threads might do at once.
        one(one.span), one.inverse(one.inverse_span), one.rate(one.span), one(one.span[0])
        assert before == [(name, id(value)) for table in one._tables for name, value in vars(table).items()]
        assert set(vars(one)) == {"start", "end", "certificate", "_span", "_tables"}


def test_the_rate_is_the_derivative(compiled: tscale.CompiledChain, counts: tuple) -> None:
    t = tscale.Instants.from_seconds(counts[0][:500], counts[1][:500], scale="UTC")
    # An error of 1e-13 s or so in polynomials of degree 6 over half an hour: 1e-15.
    assert np.max(np.abs(compiled.rate(t) - CHAIN.rate(t))) < 2e-15
    assert compiled.certificate.rate_error < 2e-15
    assert compiled.rate(t[0]).shape == ()


def test_it_travels_by_pickle(compiled: tscale.CompiledChain, counts: tuple) -> None:
    other = pickle.loads(pickle.dumps(compiled))
    assert same(other.evaluate(*counts), compiled.evaluate(*counts))
    assert other.certificate == compiled.certificate
    assert (other.start, other.end) == (compiled.start, compiled.end)
    assert (other.span == compiled.span).all()


def test_what_it_says_of_itself(compiled: tscale.CompiledChain) -> None:
    assert str(compiled) == str(CHAIN)
    assert "2020-01-01T00:00:00.000000000 to 2020-01-06T00:00:00.000000000, to 1e-12 s" in repr(compiled)
    assert compiled.span.to_iso(0).tolist() == ["2020-01-01T00:00:00", "2020-01-06T00:00:00"]
    assert compiled.inverse_span.node == compiled.end


# ---- refused -------------------------------------------------------------------------------------


def test_outside_the_span(compiled: tscale.CompiledChain) -> None:
    span = compiled.span
    for t in (span[0].shifted(-1e-9), span[1].shifted(1e-9), span[0].shifted(-1e12), span[1].shifted(1e12)):
        with pytest.raises(OutOfSpan, match=r"1 of 1 instants are outside the span .*2020-01-01T00:00:00"):
            compiled(t)
        with pytest.raises(OutOfSpan):
            compiled(t.reshape(1))
        with pytest.raises(OutOfSpan):
            compiled.rate(t)
    t = span[:1].shifted(np.array([[-1.0, 1.0], [3.0, 1e7]]))
    with pytest.raises(OutOfSpan, match="2 of 4") as caught:
        compiled(t)
    assert caught.value.mask.tolist() == [[True, False], [False, True]]
    with pytest.raises(OutOfSpan, match=r"what 2020-01-01.* is mapped to") as caught:
        compiled.inverse(compiled.inverse_span.shifted(np.array([-1e-9, 0.0])))
    assert caught.value.mask.tolist() == [True, False]
    many = np.full(600_000, span.whole[0]), np.zeros(600_000)
    many[0][555_555] -= 1
    with pytest.raises(OutOfSpan) as caught:
        compiled.evaluate(*many, threads=2)
    assert np.flatnonzero(caught.value.mask).tolist() == [555_555]


def test_instants_of_another_kind(compiled: tscale.CompiledChain) -> None:
    for wrong in (
        tscale.Instants.from_iso("2020-01-02", scale="TT"),
        tscale.Instants.from_iso("2020-01-02", scale="UTC", place="GEOCENTER"),
    ):
        with pytest.raises(ScaleMismatch, match="takes UTC@TOPOCENTER on this side"):
            compiled(wrong)
    with pytest.raises(ScaleMismatch, match="takes TDB@BARYCENTER on this side"):
        compiled.inverse(compiled.span)
    with pytest.raises(InvalidInput, match="maps Instants, got float"):
        compiled(3.0)  # type: ignore[arg-type]


@pytest.mark.parametrize("fraction", [1.0, -1e-9, 5.0, float("nan"), float("inf")])
def test_counts_that_are_not_normalised(compiled: tscale.CompiledChain, fraction: float) -> None:
    whole = np.full(3, compiled.span.whole[0] + 100)
    for threads in (1, 2):
        with pytest.raises(InvalidInput, match=r"1 of 3 fractions are not in \[0, 1\)") as caught:
            compiled.evaluate(whole, np.array([0.5, fraction, 0.0]), threads=threads)
        assert caught.value.mask.tolist() == [False, True, False]


def test_arrays_of_the_wrong_kind(compiled: tscale.CompiledChain) -> None:
    whole = np.full(3, compiled.span.whole[0] + 100)
    with pytest.raises(InvalidInput, match=r"counts are \(int64 whole, float64 fraction\), got float64"):
        compiled.evaluate(whole.astype(float), 0.0)
    with pytest.raises(InvalidInput, match="shapes that broadcast"):
        compiled.evaluate(whole, np.zeros(2))
    for threads in (0, -1, 1.5, True):
        with pytest.raises(InvalidInput, match="threads is a whole number from 1 up"):
            compiled.evaluate(whole, 0.0, threads=threads)  # type: ignore[arg-type]
    frozen = np.zeros(3)
    frozen.flags.writeable = False
    for out in (
        (np.zeros(3), np.zeros(3)),
        (np.zeros(3, dtype=np.int64), np.zeros(4)),
        (np.zeros(3, dtype=np.int64), frozen),
        (np.zeros((3, 1), dtype=np.int64), np.zeros((3, 1))),
        np.zeros(3),
        3,
    ):
        with pytest.raises(InvalidInput, match="out is a pair of writable arrays"):
            compiled.evaluate(whole, 0.0, out=out)  # type: ignore[arg-type]
