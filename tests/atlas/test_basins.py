"""Basin charts: against a slow twin, against exact algebra, and whatever the workers and the regions."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import Any

import numpy as np
import pytest

import atlas
from atlas.attractors.basins import Basins, chart_basins
from atlas.families.catalogue import family
from atlas.orbits.orbit import Stopped
from atlas.orbits.schedule import schedule
from atlas.planes import survey
from atlas.planes.fates import CLASS_ESCAPES, CLASS_UNSETTLED, ESCAPES, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from atlas.planes.pixels import FateRules
from tests.atlas.basin_cases import CUBIC, NEWTON, area, chart, finder
from tests.reference.attractors import ESCAPED, State, sorted_starts
from tiles.errors import Refusal

BURGERS = family("burgers")
COUPLED = family("coupled_logistic")
HENON = family("henon")
QUADRATIC = family("complex_quadratic")
PARAMETERS = atlas.View(("a", 0, 1), ("b", 0, 1))


def burgers_step(state: State) -> State:
    x, y = state
    return 0.75 * x - y * y, 1.55 * y + x * y


def coupled_step(state: State) -> State:
    x, y = (3.5 * one * (1 - one) for one in state)
    return 0.95 * x + 0.05 * y, 0.95 * y + 0.05 * x


def _row_major(basins: Basins) -> list[int]:
    return [
        ESCAPED if number == CLASS_ESCAPES else number for number in basins.classes.T.reshape(-1).tolist()
    ]


@pytest.mark.parametrize(
    ("found", "step", "kept"),
    [
        (lambda: finder(BURGERS, ("x", -1, "0.3"), ("y", -1, 1), (9, 8), b="1.55"), burgers_step, 600),
        (
            lambda: finder(COUPLED, ("x", "0.02", "0.98"), ("y", "0.05", 1), (8, 7), r="3.5", eps="0.05"),
            coupled_step,
            16,
        ),
    ],
    ids=["quasi-periodic", "cycles"],
)
def test_numbers_are_those_of_a_slow_twin(found: Any, step: Any, kept: int) -> None:
    made = found()
    basins = chart(made)
    x, y = made.view.across.values(made.columns, 1), made.view.up.values(made.rows, 1)
    starts = [(float(a), float(b)) for b in y.reshape(-1) for a in x.reshape(-1)]
    twin = sorted_starts(step, starts, settle=3000, kept=kept, near=0.02)
    assert _row_major(basins) == twin
    assert len(basins.attractors) == max(twin) == 2
    assert [one.orbits for one in basins.attractors] == [twin.count(1), twin.count(2)]


def test_mirror_images_are_two_attractors_with_mirrored_boxes() -> None:
    found = chart(finder(BURGERS, ("x", -1, "0.3"), ("y", -1, 1), (12, 12), b="1.55")).attractors
    below, above = sorted(found, key=lambda one: float(one.mean[1]))
    assert below.fate == above.fate == QUASI_PERIODIC
    assert below.high[1] < 0 < above.low[1]
    assert np.allclose([below.low[1], below.high[1]], [-above.high[1], -above.low[1]], atol=2e-3)
    assert np.allclose(below.mean, above.mean * [1, -1], atol=2e-2)


def test_basins_of_a_cubic_end_at_the_unstable_fixed_point_and_its_preimages() -> None:
    columns = 1200
    basins = chart(finder(CUBIC, ("x", "-1.5", "1.5"), ("y", -1, 1), (columns, 2)))
    low, middle, high = sorted(np.roots([-1, 0, 0.5, 0.1]).real)
    edges = fresh = {round(float(middle), 9)}
    for _ in range(12):
        roots = [root for y in fresh for root in np.roots([-1, 0, 1.5, 0.1 - y]) if abs(root.imag) < 1e-9]
        fresh = {round(float(root.real), 9) for root in roots if abs(root.real) < 1.7} - edges
        edges = edges | fresh
    assert [one.number for one in basins.attractors] == [1, 2]
    first = 1 if basins.attractors[0].points[0, 0] > 0 else -1
    assert np.allclose(sorted(one.points[0, 0] for one in basins.attractors), [low, high], rtol=0, atol=1e-6)
    centres = -1.5 + (np.arange(columns) + 0.5) * 3 / columns
    crossed = np.array([sum(a < edge < b for edge in edges) for a, b in pairwise(centres)])
    changed = np.diff(basins.classes[:, 0].astype(int)) != 0
    assert (changed == (crossed % 2 == 1)).all()
    assert changed.sum() == 3
    at = np.searchsorted(centres, high)
    assert (basins.classes[at] == (1 if first > 0 else 2)).all()


def test_newton_basins_hold_a_third_of_a_disc_each() -> None:
    made = finder(NEWTON, ("x", -2, 2), ("y", -2, 2), (240, 240))
    basins = chart(made)
    assert [one.fate for one in basins.attractors] == [FIXED_POINT] * 3
    roots = [complex(*one.points[0]) for one in basins.attractors]
    assert sorted(round(math.degrees(np.angle(root)) % 360) for root in roots) == [0, 120, 240]
    assert np.allclose(np.abs(roots), 1, atol=1e-6)
    centres = made.view.across.values(240, 1).reshape(-1)
    inside = centres[:, None] ** 2 + centres[None] ** 2 < 1.9**2
    shares = [float((basins.classes[inside] == number).mean()) for number in (1, 2, 3)]
    error = math.sqrt(2 / 9 / inside.sum())
    assert all(abs(share - 1 / 3) < 3 * error for share in shares), shares


def area_bound(c: float, terms: int) -> float:
    """Return an upper bound of the area of a filled Julia set, which falls to the area like a power of terms.

    That is Gronwall's area theorem for psi(w) = w + sum of b_n w**-n, with psi(w**2) = psi(w)**2 + c.
    """
    b = np.zeros(terms + 1)
    b[1] = -c / 2
    for m in range(1, terms):
        half = b[m // 2] if m % 2 == 0 else 0.0
        b[m + 1] = (half - float(b[1:m] @ b[m - 1 : 0 : -1])) / 2
    return math.pi * (1 - float(np.arange(terms + 1) @ b**2))


def test_the_basin_of_a_cycle_of_period_2_has_the_area_of_its_filled_julia_set() -> None:
    basins = chart(finder(QUADRATIC, ("re", -2, 2), ("im", "-1.25", "1.25"), (320, 200), c_re="-1", c_im="0"))
    (cycle,) = basins.attractors
    assert (cycle.fate, cycle.period) == (PERIODIC, 2)
    real = QUADRATIC.state_names.index("re")
    assert np.allclose(sorted(cycle.points[:, real]), [-1, 0], atol=1e-5)
    assert np.allclose(cycle.points[:, 1 - real], 0, atol=1e-5)
    found, error = area(basins, 1, 10), 10 * cycle.error
    bounds = [area_bound(-1.0, terms) for terms in (256, 1024, 4096)]
    assert found < bounds[2] < bounds[1] < bounds[0]
    first, second = bounds[0] - bounds[1], bounds[1] - bounds[2]
    assert abs(bounds[2] - second**2 / (first - second) - found) < 3 * error
    assert cycle.share + basins.fates[ESCAPES] / (320 * 200) == pytest.approx(1)


def test_shares_sum_to_one_and_have_binomial_errors() -> None:
    basins = chart(finder(COUPLED, ("x", 0, 1), ("y", 0, 1), (31, 30), r="3.5", eps="0.05"))
    assert sum(one.orbits for one in basins.attractors) + sum(basins.fates.values()) == 31 * 30
    for one in basins.attractors:
        assert one.share == one.orbits / 930
        assert one.error == pytest.approx(math.sqrt(one.share * (1 - one.share) / 930))
        assert int((basins.classes == one.number).sum()) == one.orbits


def test_the_number_of_an_attractor_is_that_of_its_lowest_start() -> None:
    basins = chart(finder(COUPLED, ("x", 0, 1), ("y", 0, 1), (31, 30), r="3.5", eps="0.05"))
    rows = basins.classes.T.reshape(-1)
    firsts = [int(np.flatnonzero(rows == one.number)[0]) for one in basins.attractors]
    assert firsts == sorted(firsts) == [one.lowest for one in basins.attractors]


def test_orbits_that_are_slow_to_reach_a_cycle_are_in_its_basin() -> None:
    slow = {"a": "-0.1265625", "b": "1.803125"}
    made = finder(CUBIC, ("x", "-1.2", "1.2"), ("y", -1, 1), (300, 8), rules=FateRules(), **slow)
    basins = chart(made)
    assert sorted(one.fate for one in basins.attractors) == [FIXED_POINT, FIXED_POINT]
    assert sum(one.orbits for one in basins.attractors) == 2400


def _described(basins: Basins) -> list[Any]:
    return [
        (one.number, one.fate, one.period, one.orbits, one.lowest, one.points.tolist(), one.low.tolist())
        for one in basins.attractors
    ]


@pytest.mark.parametrize(
    "made",
    [
        lambda lanes: finder(COUPLED, ("x", 0, 1), ("y", 0, 1), (61, 53), r="3.5", eps="0.05", lanes=lanes),
        lambda lanes: finder(BURGERS, ("x", -1, "0.3"), ("y", -1, 1), (61, 53), b="1.55", lanes=lanes),
    ],
    ids=["cycles", "quasi-periodic"],
)
def test_workers_and_regions_change_nothing(made: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    whole = chart(made(64))
    monkeypatch.setattr(survey, "PIXELS_AT_ONCE", 500)
    monkeypatch.setattr(survey, "REGION_ROWS", 17)
    for workers in (1, 2, 7):
        other = chart(made(64), workers)
        assert other.digest() == whole.digest()
        assert _described(other) == _described(whole)
        assert other.fates == whole.fates


def test_the_box_that_was_guessed_too_small_is_found_again(monkeypatch: pytest.MonkeyPatch) -> None:
    made = finder(BURGERS, ("x", -1, "0.3"), ("y", -1, 1), (40, 40), b="1.55")
    whole = chart(made)
    told: list[int] = []
    monkeypatch.setattr("atlas.attractors.basins.PILOT", 1)
    monkeypatch.setattr("atlas.attractors.basins.MARGIN", -0.4)
    with schedule(1) as opened:
        again = chart_basins(made, opened, told.append)
    assert again.digest() == whole.digest()
    assert sum(told) == 1600


def test_where_areas_are_preserved_the_chart_says_so_and_does_not_list_thousands() -> None:
    made = finder(HENON, ("x", "-1", "1"), ("y", "-1", "1"), (24, 24), a="0.2", b="-1")
    whole = chart(made)
    stayed = 576 - sum(whole.fates.values())
    assert whole.steady == stayed > 300
    assert len(whole.attractors) > 3
    few = chart(made, most=3)
    assert [one.number for one in few.attractors] == [1, 2, 3]
    assert few.further == len(whole.attractors) - 3
    assert few.further_orbits == sum(one.orbits for one in whole.attractors[3:])
    numbered = whole.classes < CLASS_UNSETTLED
    assert (few.classes == np.where(numbered, np.minimum(whole.classes, 4), whole.classes)).all()
    assert few.shares()["volume_preserving_orbits"] == stayed


def test_further_cycles_are_one_class() -> None:
    basins = chart(finder(COUPLED, ("x", 0, 1), ("y", 0, 1), (31, 30), r="3.5", eps="0.05"), most=1)
    assert (len(basins.attractors), basins.further) == (1, 1)
    assert basins.further_orbits == int((basins.classes == 2).sum()) > 0
    assert basins.attractors[0].orbits + basins.further_orbits == 930


def test_a_chart_without_attractors_is_all_escapes() -> None:
    basins = chart(finder(HENON, ("x", 5, 6), ("y", 5, 6), (5, 4)))
    assert not basins.attractors
    assert basins.fates == {ESCAPES: 20}
    assert (basins.classes == CLASS_ESCAPES).all()


def test_a_stopped_chart_has_no_result() -> None:
    made = finder(HENON, ("x", -1, 1), ("y", -1, 1), (40, 40), rules=FateRules(100, 10**9, 100, 8))
    with schedule(1) as opened:
        opened.stop[0] = 1
        with pytest.raises(Stopped):
            chart_basins(made, opened)


def test_a_dataset_of_basins_is_labelled() -> None:
    view = atlas.View(across=("x", 0, 1), up=("y", 0, 1))
    for _ in range(2):
        ds = atlas.basins(COUPLED, view, size=(31, 30), set={"r": "3.5", "eps": "0.05"}, workers=1)
    whole = chart(
        finder(COUPLED, ("x", 0, 1), ("y", 0, 1), (31, 30), r="3.5", eps="0.05",
               rules=FateRules(1000, 2000, 1_000_000, 64))
    )  # fmt: skip
    assert ds.attractor.dims == ("y", "x")
    assert ds.attractor.dtype == np.uint16
    assert (ds.attractor.values == whole.classes.T).all()
    assert sorted(ds.period_of.values.tolist()) == [2, 4]
    assert (ds.period.values == ds.period_of.values[ds.attractor.values.astype(int) - 1]).all()
    assert ds.share.sum() == pytest.approx(1)
    assert ds.share_error.dims == ("number",)
    assert ds["mean"].sel(state="x").shape == (2,)
    assert ds.points.dims == ("number", "point", "state")
    assert ds.attractor.attrs["flag_meanings"] == "attractor_1 attractor_2"
    assert ds.attrs["fate_names"][int(ds.kind[0])] == "periodic"
    record = ds.attrs["atlas-certificate"]
    assert '"draw":"basin"' in record
    assert ds.attrs["counts_digest"] in record


@pytest.mark.parametrize(
    ("call", "sentence"),
    [
        (lambda view: atlas.basins(HENON, view, size=(8, 0)), "size"),
        (lambda view: atlas.basins(HENON, (1, 2), size=(8, 8)), "view"),  # type: ignore[arg-type]
        (lambda view: atlas.basins(HENON, view, size=(8, 8), steps=3), "steps"),
        (lambda view: atlas.basins(family("logistic"), view, size=(8, 8)), "up: the family"),
        (
            lambda view: atlas.basins(HENON, atlas.View(("a", 0, 1), ("b", 0, 1)), size=(8, 8)),
            "draw: 'basin'",
        ),
        (lambda view: atlas.basins(HENON, view, size=(10**6, 10**6)), "a Dataset of"),
    ],
)
def test_what_is_no_basin_chart_gets_one_sentence(call: Any, sentence: str) -> None:
    with pytest.raises(Refusal) as caught:
        call(atlas.View(across=("x", 0, 1), up=("y", 0, 1)))
    assert str(caught.value).startswith(sentence)
