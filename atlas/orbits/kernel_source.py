"""Writes the module that counts the orbits of a family: step, kernels in lanes, kernels of single orbits."""

from __future__ import annotations

import re

from atlas.orbits.lane_kernels import ADVANCE, CHUNK, PART, RETURNS, SAMPLE
from atlas.orbits.orbit_kernels import AGAIN, DECIDE, FILLED, GONE, ONE_ORBIT, READY, REPLAY, SLOW
from atlas.orbits.step import StepSource

DISTURB = (
    "z = lk[l] + np.uint64({number}) * np.uint64(0x9E3779B97F4A7C15)",
    "z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)",
    "z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)",
    "z = z ^ (z >> np.uint64(31))",
    "factor = 1.0 - float(z >> np.uint64(11)) * 2.0 ** -93",
)
"""Multiplies a state by 1 - u * 2**-40 with u hashed from orbit and step by the finaliser of SplitMix64
(Steele, Lea & Flood 2014, OOPSLA; constants from memory)."""


def kernel_source(source: StepSource, up: int, *, log: bool, lanes: int) -> str:
    """Write the module that counts the orbits of a family.

    Parameters
    ----------
    source : StepSource
        The compiled map.
    up : int
        Number of the state variable that is counted.
    log : bool
        Whether its axis is logarithmic.
    lanes : int
        Orbits in a group.

    Returns
    -------
    str
    """
    disturbed = [
        _expand(text.replace(f"def {name}(", f"def {name}_disturbed("), source, step=step, disturb=True)
        for name, text, step in (
            ("advance", ADVANCE, "step"),
            ("sample", SAMPLE, "step"),
            ("replay", REPLAY, "one_step"),
        )
    ]
    many = [_expand(text, source) for text in (ADVANCE, RETURNS, SAMPLE)]
    single = [_expand(text, source, step="one_step") for text in (ONE_ORBIT, REPLAY)]
    constants = {
        "NX": str(source.states),
        "NC": str(max(source.coefficients, 1)),
        "LANES": str(lanes),
        "CHUNK": str(CHUNK),
        "PART": str(PART),
        "UNROLL": "1" if source.slow_calls else "4",
        "SCALED": "log" if log else "",
        "UP": f"x{up}",
        "READY": str(READY),
        "AGAIN": str(AGAIN),
        "FILLED": str(FILLED),
        "SLOW": str(SLOW),
        "GONE": str(GONE),
    }
    text = "\n".join([source.text, _one_step(source), *single, *many, *disturbed, DECIDE])
    return re.sub(r"\b(" + "|".join(constants) + r")\b", lambda match: constants[match[0]], text)


def _arguments(source: StepSource) -> str:
    return f"({', '.join([*source.state_names, *source.coefficient_names])})"


def _one_step(source: StepSource) -> str:
    """Write step and slope as functions of their own, for code that follows one orbit: compiled only once."""
    call = _arguments(source)
    return "\n".join(
        f"@compiled\ndef one_{name}{call}:\n    return {name}{call}\n" for name in ("step", "slope")
    )


def _expand(text: str, source: StepSource, *, step: str = "step", disturb: bool = False) -> str:
    states, coefficients = source.state_names, source.coefficient_names
    call = _arguments(source)
    if source.slow_calls:
        text = re.sub(r" *BEGIN_REST\n.*?END_REST\n", "", text, flags=re.DOTALL)
    text = re.sub(r" *(BEGIN|END)_REST\n", "", text)
    every = {
        "OUTSIDE": "(not (" + " and ".join(f"abs({name}) < bound" for name in states) + "))",
        "SAME": "(" + " & ".join(f"({name} == rx[{k}, l])" for k, name in enumerate(states)) + ")",
        "DISTANCE": _largest([f"abs({name} - rx[{k}, l])" for k, name in enumerate(states)]),
        "LARGEST": _largest([f"abs({name})" for name in states]),
        "STATE": f"({', '.join(states)},)",
        "SLOPE": f"one_slope{call}",
    }
    blocks = {
        "LOAD": [f"{name} = lx[{k}, l]" for k, name in enumerate(states)]
        + [f"{name} = lc[{k}, l]" for k, name in enumerate(coefficients)],
        "LOAD_ORBIT": [f"{name} = x[{k}, m]" for k, name in enumerate(states)]
        + [f"{name} = c[{k}, m]" for k, name in enumerate(coefficients)],
        "STORE": [f"lx[{k}, l] = {name}" for k, name in enumerate(states)],
        "STEP": [f"{', '.join(states)} = {step}{call}"],
    }
    if disturb:
        blocks["STEP"] += [*DISTURB, *(f"{name} = {name} * factor" for name in states)]
    lines = []
    for line in text.splitlines():
        word, _, number = line.strip().partition(" ")
        indent = line[: len(line) - len(line.lstrip())]
        if word in blocks:
            lines += [indent + one.replace("{number}", number) for one in blocks[word]]
        else:
            lines.append(re.sub(r"\b(" + "|".join(every) + r")\b", lambda match: every[match[0]], line))
    return "\n".join(lines)


def _largest(terms: list[str]) -> str:
    return terms[0] if len(terms) == 1 else f"max({', '.join(terms)})"
