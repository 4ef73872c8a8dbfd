"""Lyapunov spectra against exact algebra and published values; sources stand in the records."""

from __future__ import annotations

import json
import math
from typing import Any

import numpy as np
import pytest
import xarray

import atlas
from atlas.planes.exponents import Spectra, kaplan_yorke
from atlas.planes.fates import CHAOTIC, ESCAPES, FATES, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from atlas.planes.pixels import FateRules
from tests.reference.published import published
from tiles.errors import Refusal
from tiles.number import exact


def spectrum(name: str, parameters: dict[str, Any] | None = None, **more: Any) -> xarray.Dataset:
    """Return the exponents of a family of the catalogue, 200 000 steps by default."""
    found: xarray.Dataset = atlas.lyapunov_spectrum(
        atlas.family(name), parameters, **{"steps": 200_000, **more}
    )
    return found


def agrees(found: xarray.Dataset, value: float, digits: float = 2e-4, start: int = 0) -> bool:
    """Return whether the largest exponent lies within 4 standard errors of a printed value."""
    error = float(found.error[start, 0])
    return abs(float(found.lyapunov[start, 0]) - value) < 4 * error + digits


def test_henon() -> None:
    found = spectrum("henon", {"a": "1.4", "b": "0.3"}, steps=1_000_000)
    assert agrees(found, float(published("hen.lyap").value))
    assert abs(float(found.lyapunov[0, 0]) - float(published("hen.lyap").value)) < 2e-3
    assert abs(float(found.dimension[0]) - float(published("hen.ky").value)) < 2e-3
    assert abs(float(found["sum"][0]) - math.log(0.3)) < 1e-10
    assert found.lyapunov.sum() == pytest.approx(math.log(0.3), abs=1e-10)
    assert found.fate[0] == CHAOTIC


@pytest.mark.parametrize("name", ["hen.1.3", "hen.lyapnum.1.2"])
def test_henon_elsewhere(name: str) -> None:
    record = published(name)
    found = spectrum("henon", {"a": record.parameters["a"]})
    if isinstance(record.value, dict):
        assert found.fate[0] == PERIODIC
        assert found.period[0] == record.value["period"]
        assert float(found.lyapunov[0, 0]) == pytest.approx(float(record.value["lyapunov"]), abs=1e-6)
        assert found.error.sum() == found.dimension[0] == 0
    else:
        assert agrees(found, float(record.value))


@pytest.mark.parametrize(
    ("family", "name", "parameters", "total"),
    [
        ("lozi", "loz.lyap", {"a": "1.7", "b": "0.5"}, float(published("loz.sum").value)),
        ("ikeda", "ike.lyap", {"u": "0.9"}, float(published("ike.sum").value.removeprefix("u=0.9: "))),
        ("delayed_logistic", "dl.lyap227", {"r": "2.27"}, None),
    ],
)
def test_exponents_and_dimensions_in_print(
    family: str, name: str, parameters: dict[str, str], total: float | None
) -> None:
    found = spectrum(family, parameters, steps=400_000)
    value = published(name).value
    assert agrees(found, float(value["lyapunov"]))
    assert abs(float(found.dimension[0]) - float(value["ky"])) < 3e-3
    if total is not None:
        assert abs(float(found["sum"][0]) - total) < 1e-10


def test_ikeda_at_smaller_reflectivity() -> None:
    assert agrees(spectrum("ikeda", {"u": "0.7"}), float(published("ike.lyapnum.0.7").value))


@pytest.mark.parametrize("kick", [5, 10, 20])
def test_the_standard_map_preserves_area_and_stretches_as_theory_says(kick: int) -> None:
    starts = [{"theta": "2", "p": "0.5"}, {"theta": "3", "p": "1"}]
    found = spectrum("standard", {"K": kick}, starts=starts, steps=400_000)
    assert (np.abs(found["sum"]) < 1e-9).all()
    assert (found.fate == CHAOTIC).all()
    assert float(found.lyapunov[:, 0].mean()) == pytest.approx(
        float(published(f"std.lyap.{kick}").value), abs=3e-3
    )
    np.testing.assert_allclose(found.dimension, 2, atol=1e-9)
    if kick >= 10:
        theory = math.log(kick / 2) + 1 / (kick * kick - 4)
        assert float(found.lyapunov[:, 0].mean()) == pytest.approx(theory, abs=3e-3)


def test_a_regular_orbit_of_the_standard_map_has_no_exponents() -> None:
    found = spectrum("standard", {"K": "0.5"}, starts=[{"theta": "1", "p": "2.2"}])
    assert found.fate[0] == QUASI_PERIODIC
    assert (abs(found.lyapunov) < 2e-4).all()
    assert found.dimension[0] == 2


def test_the_logistic_map_at_full_height_within_its_stated_error() -> None:
    found = spectrum("logistic", {"r": 4}, starts=[{"x": "0.3"}, {"x": "0.7"}, {"x": "0.123"}])
    off = np.abs(found.lyapunov[:, 0] - math.log(2))
    assert (off < 3 * found.error[:, 0]).all()
    assert (found.error < 1e-4).all()
    assert (found.dimension == 1).all()


def test_forcing_with_equal_letters_changes_nothing() -> None:
    plain = spectrum("logistic", {"r": "3.9"}, starts=[{"x": "0.4"}])
    forced = spectrum("forced_logistic", {"a": "3.9", "b": "3.9"}, starts=[{"x": "0.4"}])
    other = spectrum(
        "forced_logistic",
        {"r": {"pattern": ["a", "a", "b"]}, "a": "3.9", "b": "3.9"},
        starts=[{"x": "0.4"}],
        steps=199_968,
    )
    assert float(forced.lyapunov[0, 0]) == float(plain.lyapunov[0, 0])
    assert agrees(other, float(plain.lyapunov[0, 0]))


def test_fixed_points_have_the_exponents_of_their_multipliers() -> None:
    turning = spectrum("delayed_logistic", {"r": "1.9"})
    assert turning.fate[0] == FIXED_POINT
    np.testing.assert_allclose(turning.lyapunov, float(published("dl.lyap.below").value), atol=1e-6)
    circle = spectrum("circle", {"Omega": 0, "K": "0.5"})
    np.testing.assert_allclose(circle.lyapunov, float(published("cir.lyap").value), atol=1e-9)


@pytest.mark.parametrize("coupling", ["0.1", "0.2", "0.3", "0.45"])
def test_coupled_maps_in_step_lose_what_the_coupling_takes(coupling: str) -> None:
    """In step the second exponent is the first + ln |1 - 2 eps| (records cl.formula and cl.thr4)."""
    found = spectrum("coupled_logistic", {"r": 4, "eps": coupling}, starts=[{"x": "0.3", "y": "0.3"}])
    first, second = found.lyapunov[0].values
    assert first == pytest.approx(math.log(2), abs=1e-4)
    assert second == pytest.approx(math.log(2) + math.log(1 - 2 * float(coupling)), abs=1e-4)
    assert (second < 0) == (0.25 < float(coupling) < 0.75)


def test_the_larger_exponent_comes_first_where_the_coupling_overshoots() -> None:
    """In step at eps = 1.2 differences grow faster than the common state: ln |1 - 2 eps| = ln 1.4."""
    found = spectrum("coupled_logistic", {"r": 4, "eps": "1.2"}, starts=[{"x": "0.3", "y": "0.3"}])
    np.testing.assert_allclose(found.lyapunov[0], [math.log(2) + math.log(1.4), math.log(2)], atol=1e-4)


INSECTS = published("lpa97.seq")


@pytest.mark.parametrize("cpa", INSECTS.value)
def test_insects_in_three_stages(cpa: str) -> None:
    found = spectrum("insect_stages", {**INSECTS.parameters, "cpa": cpa}, steps=1_000_000)
    expected = INSECTS.value[cpa]
    if expected == "quasiperiodic":
        assert found.fate[0] == QUASI_PERIODIC
        assert found.dimension[0] == 1
    elif "." in expected:
        assert found.fate[0] == CHAOTIC
        assert abs(float(found.lyapunov[0, 0]) - float(expected)) < 2e-3
    else:
        assert found.period[0] == int(expected)
    printed = {"0.05": -0.02571, "1.0": -0.18708}
    if cpa in printed:
        assert float(found.lyapunov[0, 0]) == pytest.approx(printed[cpa], abs=2e-5)
    assert (np.diff(found.lyapunov[0]) <= 0).all()
    assert float(found["sum"][0]) == pytest.approx(float(found.lyapunov[0].sum()), abs=1e-12)


# The error, the Dataset, refusals


def test_errors_say_how_starts_scatter() -> None:
    starts = [{"x": f"0.{tenth}", "y": "0"} for tenth in range(1, 9)]
    starts += [{"x": f"-0.{tenth}", "y": "0.1"} for tenth in range(1, 9)]
    found = spectrum("henon", starts=starts, steps=20_000)
    scatter = float(found.lyapunov[:, 0].std(ddof=1))
    stated = float(np.sqrt((found.error[:, 0] ** 2).mean()))
    assert stated / 2 < scatter < stated * 2
    assert abs(float(found.lyapunov[:, 0].mean()) - 0.41922) < scatter


def test_neither_lanes_nor_neighbours_matter() -> None:
    family = atlas.family("henon")
    rules = FateRules(200, 2000)
    whole = Spectra(family, rules, starts=[{}, {"x": exact("0.3")}])
    whole.run()
    alone = Spectra(family, rules, lanes=1)
    alone.run()
    np.testing.assert_array_equal(alone.exponents[:, 0], whole.exponents[:, 0])
    np.testing.assert_array_equal(alone.errors[:, 0], whole.errors[:, 0])


def test_escape_has_no_exponents() -> None:
    found = spectrum("henon", starts=[{"x": 3, "y": 3}, {"x": 0, "y": 0}])
    assert found.fate.values.tolist() == [ESCAPES, CHAOTIC]
    assert np.isnan(found.lyapunov[0]).all()
    assert np.isnan(found.dimension[0])
    assert np.isfinite(found.lyapunov[1]).all()


def test_the_dataset_says_what_it_holds() -> None:
    found = spectrum("insect_stages", {"cpa": "0.35"}, steps=640)
    assert found.lyapunov.dims == found.error.dims == ("start", "exponent")
    assert found.sizes == {"start": 1, "exponent": 3, "variable": 3}
    assert found.fate.attrs["flag_meanings"].split()[CHAOTIC] == FATES[CHAOTIC]
    record = json.loads(found.attrs["atlas-certificate"])
    assert record["counts_digest"] == found.attrs["counts_digest"]
    assert record["config"]["settings"]["set"] == {"cpa": "0.35"}
    assert record["samples"] == {"starts": 1}


def test_dimensions_of_spectra() -> None:
    assert kaplan_yorke([0.0, -1.0]) == 1.0
    assert kaplan_yorke([0.2, 0.0, -0.4]) == 2.5
    assert kaplan_yorke([0.2, -math.inf]) == 1.0
    assert kaplan_yorke([0.2, 0.1]) == 2.0
    assert kaplan_yorke([-math.inf, -math.inf]) == 0.0


WRONG: list[tuple[dict[str, Any], str]] = [
    ({"parameters": {"c": 1}}, "parameters: the family 'henon' has no parameter 'c'"),
    ({"parameters": {"a": "x"}}, "parameters.a: 'x' is not a number"),
    ({"starts": [{"z": 1}]}, "starts[1]: the family 'henon' has no state variable 'z'"),
    ({"starts": []}, "starts: an empty list is not a list of states"),
    ({"steps": 10}, "steps: '10' is out of range; write a whole number from 64"),
    ({"transient": -1}, "transient: '-1' is out of range"),
    ({"longest_period": 0}, "longest_period: '0' is out of range"),
]


@pytest.mark.parametrize(("more", "sentence"), WRONG)
def test_a_wrong_request_gets_one_sentence(more: dict[str, Any], sentence: str) -> None:
    with pytest.raises(Refusal) as caught:
        atlas.lyapunov_spectrum(atlas.family("henon"), **more)
    assert str(caught.value).startswith(sentence)


def test_a_name_is_no_family() -> None:
    with pytest.raises(Refusal, match="family: 'henon' is no family"):
        atlas.lyapunov_spectrum("henon")  # type: ignore[arg-type]
