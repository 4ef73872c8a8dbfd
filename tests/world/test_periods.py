"""A column of one parameter value has as many occupied cells as the published cycle has points."""

from __future__ import annotations

import numpy as np
import pytest

from tests.reference.published import Published, ids, published
from tests.world.views import at, outside

PARAMETER = {
    "log": ("logistic", "r"),
    "ric": ("ricker", "r"),
    "has": ("hassell", "growth"),
    "sin": ("sine", "r"),
    "cub": ("cubic", "r"),
    "gau": ("gauss", "beta"),
}
RECORDS = [
    record
    for short in PARAMETER
    for record in map(published, ids(f"{short}.lyap."))
    if isinstance(record.value, dict) and "period" in record.value
]


# Sources: exact algebra for logistic r = 2.5, 3.2, 3.4 and Ricker r = 1.5; else common practice, no source:
# cycles refined in arbitrary precision.
@pytest.mark.parametrize("record", RECORDS, ids=lambda record: record.id)
def test_the_attractor_has_the_published_period(record: Published) -> None:
    name, parameter = PARAMETER[record.id.split(".")[0]]
    given = {key.replace("lambda", "growth"): str(value) for key, value in record.parameters.items()}
    start = given.pop("x0", "0.3")
    value = given.pop(parameter)
    period = record.value["period"]
    made = at(name, parameter, value, rows=9973, set=given, starts=[start], samples=20 * period)
    column = made.counts.values[:, 0]
    assert np.count_nonzero(column) == period
    assert set(column[column > 0]) == {20}
    assert outside(made) == 0


def test_the_records_cover_six_families() -> None:
    assert {record.id.split(".")[0] for record in RECORDS} == set(PARAMETER)
    assert len(RECORDS) > 25


@pytest.mark.parametrize("beta", ["-0.8", "-0.75"])
def test_coexisting_attractors_of_the_gauss_map_need_a_start_each(beta: str) -> None:
    """Which attractor is drawn depends on the start; both starts show both; common practice, no source."""
    starts = ("0", "-0.8")
    wanted = [published(f"gau.lyap.x0={start}.{beta}") for start in starts]
    one, other = (
        at("gauss", "beta", beta, rows=9973, starts=[start]).counts.values[:, 0] > 0 for start in starts
    )
    both = at("gauss", "beta", beta, rows=9973, starts=starts).counts.values[:, 0] > 0
    assert [one.sum(), other.sum()] == [record.value["period"] for record in wanted]
    assert not (one & other).any()
    np.testing.assert_array_equal(both, one | other)
