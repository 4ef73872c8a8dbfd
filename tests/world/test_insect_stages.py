"""The three-stage insect map: equilibria, extinction, and where the equilibrium loses its stability.

Sources: B. Dennis, R. A. Desharnais, J. M. Cushing and R. F. Costantino 1995, Ecol. Monogr. 65, 261; R. F.
Costantino et al. 1997, Science 275, 389 (citations and parameters from memory); exact algebra.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
import pytest

from atlas.families.catalogue import family
from tests.reference.multipliers import cycle_matrix, is_stable, jury, matrix, multipliers, root, stepped
from tests.reference.published import published

OWN = family("insect_stages")
PARAMETERS = {parameter.name: float(parameter.default) for parameter in OWN.parameters}
STAGES = ("larvae", "pupae", "adults")


def growth(given: Mapping[str, float]) -> float:
    """Return how many adults one adult leaves over its life when there are few."""
    return given["b"] * (1 - given["mul"]) / given["mua"]


def equilibrium(given: Mapping[str, float]) -> dict[str, float]:
    """Return the state that stays: one equation for the adults, whose left side grows with them."""

    def larvae(adults: float) -> float:
        return given["mua"] * adults * math.exp(given["cpa"] * adults) / (1 - given["mul"])

    def left(adults: float) -> float:
        eaten = given["cel"] * larvae(adults) + (given["cea"] + given["cpa"]) * adults
        return eaten - math.log(growth(given))

    adults = root(left, 0.0, math.log(growth(given)) / (given["cea"] + given["cpa"]) + 1)
    return {"larvae": larvae(adults), "pupae": (1 - given["mul"]) * larvae(adults), "adults": adults}


def at_equilibrium(**given: float) -> np.ndarray:
    """Return the Jacobian there, after checking that it stays."""
    values = {**PARAMETERS, **given}
    return cycle_matrix(OWN, {**values, **equilibrium(values)}, 1)


def worst(cpa: float) -> float:
    return min(jury(at_equilibrium(cpa=cpa)))


def orbit(steps: int, start: Mapping[str, float], **given: float) -> list[dict[str, float]]:
    values, states = {**PARAMETERS, **given, **start}, []
    for _ in range(steps):
        values |= stepped(OWN, values)
        states.append({name: values[name] for name in STAGES})
    return states


def test_the_default_parameters_are_those_of_the_experiments() -> None:
    record = published("lpa97.seq")
    assert {name: float(value) for name, value in record.parameters.items()} == {
        name: PARAMETERS[name] for name in record.parameters
    }


def test_the_published_equilibrium() -> None:
    """lpa97.eq0: larvae, pupae, adults."""
    record = published("lpa97.eq0")
    given = {name: float(value) for name, value in record.parameters.items()}
    told = {name: float(record.number(k)) for k, name in enumerate(STAGES)}
    assert equilibrium(given) == pytest.approx(told, rel=1e-11)
    assert stepped(OWN, {**given, **told}) == pytest.approx(told, rel=1e-11)


def test_the_equilibrium_without_cannibalism_by_larvae() -> None:
    """lpa.cel0: A = ln R0 / (cea + cpa), L = b A exp(-cea A); exact algebra."""
    record = published("lpa.cel0")
    given = {name: float(value) for name, value in record.parameters.items()}
    assert growth(given) == pytest.approx(float(record.number("R0")), rel=1e-12)
    adults = math.log(growth(given)) / (given["cea"] + given["cpa"])
    assert adults == pytest.approx(float(record.number("A")), rel=1e-12)
    found = equilibrium(given)
    assert found["adults"] == pytest.approx(adults, rel=1e-11)
    assert found["larvae"] == pytest.approx(float(record.number("L")), rel=1e-11)


@pytest.mark.parametrize(("b", "mul", "mua"), [(6.598, 0.2055, 0.96), (0.8, 0.2, 0.5), (1.2, 0.5, 0.61)])
def test_the_insects_die_out_below_a_growth_of_1(b: float, mul: float, mua: float) -> None:
    """lpa.R0: b (1 - mul) / mua = 1; there the origin has the multiplier 1."""
    assert published("lpa.R0").number() == 1
    given = {**PARAMETERS, "b": b, "mul": mul, "mua": mua}
    nobody = dict.fromkeys(STAGES, 0.0)
    product = matrix(OWN, {**given, **nobody})
    assert is_stable(product) == (growth(given) < 1)
    edge = matrix(OWN, {**given, "b": mua / (1 - mul), **nobody})
    assert min(abs(multipliers(edge) - 1)) < 1e-12
    assert jury(edge)[0] == pytest.approx(0, abs=1e-12)


def test_the_jury_conditions_say_what_the_multipliers_say() -> None:
    verdicts = set()
    for b in np.linspace(1.5, 20, 12):
        for mua in np.linspace(0.05, 0.95, 10):
            for cpa in (0.0, 0.01, 0.2):
                verdicts.add(is_stable(at_equilibrium(b=float(b), mua=float(mua), cpa=cpa)))
    assert verdicts == {True, False}


def test_the_equilibrium_is_stable_without_cannibalism_of_pupae_and_lost_before_a_twentieth() -> None:
    """lpa97.seq: an equilibrium at cpa = 0, a cycle of period 8 at cpa = 0.05."""
    record = published("lpa97.seq")
    assert (record.value["0"], record.value["0.05"]) == ("1", "8")
    assert worst(0.0) > 0 > worst(0.05)
    edge = root(worst, 0.0, 0.05)
    found = multipliers(at_equilibrium(cpa=edge))
    assert abs(found[0]) == pytest.approx(1, abs=1e-9)
    assert found[0].imag != 0  # a pair turns: Neimark-Sacker
    assert abs(found[2]) < 1


def test_orbits_near_the_equilibrium_return_below_the_boundary_and_leave_above_it() -> None:
    edge = root(worst, 0.0, 0.05)

    def distances(cpa: float) -> tuple[float, float]:
        rest = equilibrium({**PARAMETERS, "cpa": cpa})
        begun = {name: number * (1 + 1e-4) for name, number in rest.items()}
        states = orbit(400, begun, cpa=cpa)
        sizes = [max(abs(state[name] / rest[name] - 1) for name in STAGES) for state in states]
        return max(sizes[:40]), max(sizes[-40:])

    first, last = distances(0.5 * edge)
    assert last < 0.5 * first
    first, last = distances(2 * edge)
    assert last > 2 * first


@pytest.mark.parametrize(("cpa", "period"), [("0", 1), ("0.05", 8), ("1.0", 3)])
def test_the_published_cycles(cpa: str, period: int) -> None:
    """lpa97.seq, from the family's own start."""
    assert published("lpa97.seq").value[cpa] == str(period)
    start: dict[str, Any] = {state.name: float(state.start) for state in OWN.states}
    states = orbit(4000, start, cpa=float(cpa))[-24:]

    def returns(after: int) -> bool:
        return all(states[k] == pytest.approx(states[k + after], rel=1e-6) for k in range(8))

    assert [after for after in range(1, 13) if returns(after)] == list(range(period, 13, period))
