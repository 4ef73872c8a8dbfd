"""Phase portraits: against a slow twin, exactly; their totals, copies, automatic samples and Datasets."""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import pytest
import xarray

import atlas
from atlas.families.catalogue import family
from atlas.families.reader import family_from_config
from atlas.orbits.orbit import Rules, Stopped
from atlas.orbits.portrait import SIDES, Portrait, PortraitCounter, copies_of, most_samples
from atlas.orbits.portrait_counts import automatic_samples, count_portrait, workers_that_fit
from atlas.orbits.schedule import schedule
from tests.reference.orbits import MASK, key, mixed
from tests.reference.published import published
from tiles.errors import Refusal, TooLarge
from tiles.number import exact
from tiles.window import View

HENON = family_from_config(
    "henon",
    {
        "state": {"x": {"start": "0.1"}, "y": {"start": "0.1"}},
        "parameters": {"a": {"default": "1.4"}},
        "step": {"x": "1 - a * x * x + y", "y": "0.3 * x"},
        "observables": {"sum": "x + y"},
        "escape": "1000",
    },
)
PART = View(("x", "-0.9", "0.8"), ("y", "-0.2", "0.25"))
WHOLE = View(("x", "-1.5", "1.5"), ("y", "-0.45", "0.45"))
STARTS = ({"x": exact("0.1"), "y": exact("0.1")}, {"x": exact("3"), "y": exact("0")}, {"x": exact("-0.5")})
State = tuple[float, float]


def _start(own: State, start: int, copy: int) -> State:
    """Return where a copy of a start begins."""
    if copy == 0:
        return own
    seed = key(0, copy, start)
    factors = []
    for variable in (1, 2):
        u = mixed(((seed ^ variable) + 0x9E3779B97F4A7C15) & MASK) >> 11
        factors.append(1.0 - float(u) * 2.0**-93)
    return own[0] * factors[0], own[1] * factors[1]


def _twin(
    counter: PortraitCounter, starts: Sequence[State], shown: Callable[[float, float], State]
) -> tuple[np.ndarray[Any, Any], dict[str, int]]:
    """Count chaotic and escaping orbits of the Henon map one by one, in plain Python."""
    rules, rows = counter.rules, counter.rows
    edges = [
        axis.edges(cells) for axis, cells in ((counter.view.across, counter.columns), (counter.view.up, rows))
    ]
    counts = np.zeros((counter.columns + 2, rows + 2), np.uint32)
    totals = dict.fromkeys((*SIDES, "escaped"), 0)
    settled = rules.transient + (rules.phase - rules.transient) % rules.every
    for number, own in enumerate(starts):
        for copy in range(counter.copies):
            x, y = _start(own, number, copy)
            for n in range(1, settled + rules.every * counter.samples_of_a_copy + 1):
                x, y = 1.0 - 1.4 * x * x + y, 0.3 * x
                if abs(x) > 1000.0:
                    assert n < settled
                    totals["escaped"] += counter.samples_of_a_copy
                    break
                if n > settled and n % rules.every == rules.phase:
                    column, row = (
                        int(np.searchsorted(e, value, "right"))
                        for e, value in zip(edges, shown(x, y), strict=True)
                    )
                    counts[column, row] += 1
    totals["left"], totals["right"] = int(counts[0].sum()), int(counts[-1].sum())
    totals["below"], totals["above"] = int(counts[1:-1, 0].sum()), int(counts[1:-1, -1].sum())
    return counts[1:-1, 1:-1], totals


def _counted(counter: PortraitCounter, workers: int = 1, **more: Any) -> Portrait:
    with schedule(workers) as opened:
        return count_portrait(counter, opened, **more)


def _check(portrait: Portrait) -> None:
    totals = portrait.totals
    inside = int(portrait.counts.sum(dtype=np.uint64))
    assert inside + sum(totals[k] for k in (*SIDES, "escaped", "unsettled")) == totals["exposure"]


@pytest.mark.parametrize(
    ("view", "shown", "rules"),
    [
        (PART, lambda x, y: (x, y), Rules(100, 100, 9000)),
        (View(("sum", "-1", 1), ("x", -1, "0.9")), lambda x, y: (x + y, x), Rules(50, 50, 300)),
        (PART, lambda x, y: (x, y), Rules(100, 100, 300, every=3, phase=2)),
    ],
    ids=["copies", "observable", "records"],
)
def test_counts_equal_the_slow_twin(view: View, shown: Callable[[float, float], State], rules: Rules) -> None:
    counter = PortraitCounter(HENON, view, 31, 23, rules, starts=STARTS)
    assert counter.copies == (2 if rules.samples > 5000 else 1)
    portrait = _counted(counter)
    counts, totals = _twin(counter, ((0.1, 0.1), (3.0, 0.0), (-0.5, 0.1)), shown)
    np.testing.assert_array_equal(portrait.counts, counts)
    assert {name: portrait.totals[name] for name in totals} == totals
    assert all(totals.values())
    _check(portrait)


def test_neither_workers_nor_lanes_nor_groups_matter() -> None:
    rules = Rules(200, 200, 9_000)
    starts = [{"x": exact(f"0.0{n}")} for n in range(1, 10)] * 12
    counter = PortraitCounter(HENON, WHOLE, 40, 30, rules, starts=starts)
    portrait = _counted(counter)
    assert counter.orbits == 216
    assert _counted(counter, 7).digest() == portrait.digest()
    assert _counted(counter, 3, at_once=1).digest() == portrait.digest()
    other = PortraitCounter(HENON, WHOLE, 40, 30, rules, starts=starts, lanes=7)
    assert _counted(other, 2).digest() == portrait.digest()
    room = counter.room()
    for first, last in ((0, 1), (1, 100), (100, 216)):
        counter.count(first, last, room)
    table = room[: counter.cells].reshape(42, 32)
    np.testing.assert_array_equal(table[1:-1, 1:-1], portrait.counts)


def test_progress_is_told_of_every_sample_and_the_stop_flag_is_heard() -> None:
    counter, told = PortraitCounter(HENON, WHOLE, 40, 30, Rules(100, 100, 30_000)), list[int]()
    _counted(counter, 2, progress=told.append)
    assert sum(told) == counter.exposure == 30_002
    with pytest.raises(Stopped):
        counter.count(0, 1, counter.room(), stop=np.ones(1, np.uint8))


def test_copies_follow_from_samples_and_starts_alone() -> None:
    assert copies_of(1, 1) == copies_of(8191, 1) == 1
    assert copies_of(8192, 1) == 2
    assert copies_of(10**9, 1) == 256
    assert copies_of(10**9, 1024) == copies_of(10**9, 10**6) == 1
    for starts in (1, 3, 64, 1000):
        most = most_samples(starts)
        assert starts * copies_of(most, starts) * -(-most // copies_of(most, starts)) < 1 << 32


# Starts on cycles


def _coupled(starts: Sequence[tuple[str, str]], **set_: str) -> Portrait:
    view = View(("x", 0, 1), ("y", 0, 1))
    begin = [{"x": exact(x), "y": exact(y)} for x, y in starts]
    given = {name: exact(value) for name, value in set_.items()}
    rules = Rules(500, 5000, 20_000)
    return _counted(PortraitCounter(family("coupled_logistic"), view, 20, 20, rules, set=given, starts=begin))


def test_a_start_on_a_repelling_cycle_stays_there_in_every_copy() -> None:
    portrait = _coupled([("0", "0"), ("0.75", "0.75")], r="4", eps="1/2")
    assert portrait.copies == 4
    assert portrait.totals["on_repelling"] == 8
    assert portrait.counts[0, 0] == portrait.counts[15, 15] == 20_000
    assert portrait.totals["filled"] == portrait.totals["exposure"] == 40_000


def test_a_start_near_a_repelling_cycle_does_not() -> None:
    portrait = _coupled([("0.7500001", "0.7500001")], r="4", eps="1/2")
    assert portrait.totals["on_repelling"] == 0
    assert np.count_nonzero(portrait.counts) == 20
    _check(portrait)


def test_cycles_are_filled() -> None:
    portrait = _coupled([("0.3", "0.4")], r="3.2", eps="0.1")
    assert portrait.totals["filled"] == 20_000
    assert sorted(portrait.counts[portrait.counts > 0].tolist()) == [10_000, 10_000]


# Automatic samples


@pytest.mark.parametrize(
    ("name", "view", "starts", "set_"),
    [
        ("henon", View(("x", "-1.5", "1.5"), ("y", "-0.45", "0.45")), ({},), {}),
        ("delayed_logistic", View(("x", 0, 1), ("y", 0, 1)), ({},), {}),
        ("standard", View(("theta", 0, "2*pi"), ("p", 0, "2*pi")), ({"theta": 1, "p": 2}, {"p": 1}), {}),
        ("standard", View(("theta", 0, "2*pi"), ("p", 0, "2*pi")), ({"theta": 1, "p": 2},), {"K": 10}),
        ("coupled_logistic", View(("x", 0, 1), ("y", 0, 1)), ({},), {"r": "3.2"}),
    ],
)
def test_automatic_samples_fill_the_occupied_cells(
    name: str, view: View, starts: Sequence[dict[str, Any]], set_: dict[str, Any]
) -> None:
    begin = [{key: exact(str(value)) for key, value in start.items()} for start in starts]
    given = {key: exact(str(value)) for key, value in set_.items()}
    counter = PortraitCounter(family(name), view, 420, 300, Rules(), set=given, starts=begin)
    samples = automatic_samples(counter)
    portrait = _counted(counter.with_samples(samples), 2)
    assert portrait.reached >= 8
    assert portrait.totals["exposure"] < 10**9
    if set_.get("K") == 10:
        # area is preserved: the chaotic sea is covered evenly
        assert portrait.counts.std() == pytest.approx(math.sqrt(portrait.counts.mean()), rel=0.1)


def test_each_copy_alone_covers_an_invariant_curve() -> None:
    view = View(("x", 0, 1), ("y", 0, 1))
    counter = PortraitCounter(family("delayed_logistic"), view, 420, 300, Rules())
    counter = counter.with_samples(automatic_samples(counter))
    portrait = _counted(counter, 2)
    assert portrait.copies > 1
    assert counter.samples_of_a_copy > 20_000
    first = counter.room()
    counter.count(0, 1, first)
    table = first[: counter.cells].reshape(422, 302)[1:-1, 1:-1]
    missed = np.count_nonzero(portrait.counts) - np.count_nonzero(table)
    assert missed < 0.01 * np.count_nonzero(table)


def test_the_extent_of_the_henon_attractor() -> None:
    view = View(("x", "-1.3", "1.3"), ("y", "-0.5", "0.5"))
    portrait = _counted(PortraitCounter(family("henon"), view, 2600, 4, Rules(samples=3_000_000)), 2)
    occupied = np.flatnonzero(portrait.counts.any(axis=1))
    low, high = (float(published("hen.extent").number(end)) for end in (0, 1))
    assert -1.3 + 0.001 * occupied[0] == pytest.approx(low, abs=2e-3)
    assert -1.3 + 0.001 * (occupied[-1] + 1) == pytest.approx(high, abs=2e-3)


# Memory and Datasets


def test_short_memory_lets_fewer_workers_count() -> None:
    cells = 1002 * 1002
    assert workers_that_fit(1000, 1000, 4_000_000 + 3 * 8 * cells, 8) == 3
    assert workers_that_fit(1000, 1000, 1 << 40, 8) == 8
    assert workers_that_fit(1000, 1000, 8 * cells, 8) == 0
    with pytest.raises(TooLarge, match="40000 x 40000 cells are too many for a phase portrait"):
        PortraitCounter(HENON, WHOLE, 40_000, 40_000, Rules())


def _dataset(**more: Any) -> xarray.Dataset:
    found: xarray.Dataset = atlas.phase_portrait(
        atlas.family("henon"), WHOLE, **{"size": (60, 40), "samples": 20_000, **more}
    )
    return found


def test_the_dataset_is_labelled() -> None:
    ds = _dataset(starts=[{"x": 0, "y": 0}, {"x": 3, "y": 0}])
    assert ds.counts.dims == ds.density.dims == ("y", "x")
    assert (ds.counts.dtype, ds.exposure.dims) == (np.uint32, ())
    assert ds.attrs["copies"] == 4
    assert ds.exposure == 40_000
    assert ds.escaped == 20_000
    assert ds.counts.sum() == 20_000
    assert ds.attrs["cell_area"] == pytest.approx(0.05 * 0.0225)
    assert float((ds.density * ds.attrs["cell_area"]).sum()) == pytest.approx(0.5)
    assert ds.x.attrs["low"] == "-1.5"
    record = json.loads(ds.attrs["atlas-certificate"])
    assert record["counts_digest"] == ds.attrs["counts_digest"]
    assert record["shares"]["escaped"] == 0.5
    assert record["samples"]["copies_of_each_start"] == 4


def test_workers_and_memory_do_not_change_a_dataset() -> None:
    xarray.testing.assert_identical(_dataset(workers=5, memory="4GiB"), _dataset(workers=1))


def test_density_on_log_axes_is_per_log_unit() -> None:
    view = View({"name": "x", "low": "0.05", "high": 1, "scale": "log"}, ("y", 0, 1))
    ds = atlas.phase_portrait(
        atlas.family("coupled_logistic"), view, size=(30, 20), samples=20_000, set={"r": "3.9"}
    )
    assert ds.attrs["cell_area"] == pytest.approx(math.log(20) / 30 / 20)
    share = float(ds.counts.sum() / ds.exposure)
    assert 0.5 < share <= 1
    assert float((ds.density * ds.attrs["cell_area"]).sum()) == pytest.approx(share)


WRONG: list[tuple[dict[str, Any], str]] = [
    ({"size": (0, 4)}, "size[1]: '0' is out of range"),
    ({"samples": 1 << 33}, "are more than a count can hold; use at most 4294967039 samples"),
    ({"samples": "some"}, "samples: 'some' is not auto"),
    ({"starts": [{"z": 0}]}, "starts[1]: the family 'henon' has no state variable 'z'"),
    ({"record": {"every": 0}}, "record.every: '0' is out of range"),
    ({"size": (20_000, 20_000)}, "a Dataset of 20000 x 20000 cells would need"),
    ({"set": {"c": 1}}, "set: the family 'henon' has no parameter 'c'"),
]


@pytest.mark.parametrize(("more", "sentence"), WRONG)
def test_a_wrong_request_gets_one_sentence(more: dict[str, Any], sentence: str) -> None:
    with pytest.raises(Refusal) as caught:
        _dataset(**more)
    assert sentence in str(caught.value)


@pytest.mark.parametrize(
    ("across", "up", "sentence"),
    [
        (("a", 1, "1.4"), ("x", -1, 1), "a across and x up make an orbit histogram; put state variables"),
        (("x", -1, 1), ("z", -1, 1), "up: the family 'henon' has no parameter or state variable 'z'"),
        (("x", 1, "1.0000000000000002"), ("y", -1, 1), "finer than float64 can resolve"),
    ],
)
def test_a_wrong_view_gets_one_sentence(across: Any, up: Any, sentence: str) -> None:
    with pytest.raises(Refusal, match=sentence):
        atlas.phase_portrait(atlas.family("henon"), View(across, up), size=(10, 10))
