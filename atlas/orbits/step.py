"""The compiled map: a family's formulas as straight-line source, one step of one orbit a call."""

from __future__ import annotations

import hashlib
import importlib.util
import os
import sys
import tempfile
import threading
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from types import ModuleType

from numba import __version__ as numba_version

import atlas.arithmetic.functions as functions
from atlas.arithmetic.float64 import POLYNOMIALS, StraightLine, hoist
from atlas.errors import FormulaRefused
from atlas.families.reader import Family
from atlas.formula.tree import Node, free_names
from atlas.orbits.volumes import carried, compounds, lengths
from tiles.number import Exact

_LOADING = threading.Lock()
HEADER = f"""\
import numpy as np
from numba import njit
from atlas.arithmetic.functions import bits_of, float_from, {", ".join(POLYNOMIALS)}

inlined = njit(inline="always", error_model="numpy")
compiled = njit(nogil=True, error_model="numpy", cache=True)


@inlined
def around(difference, width):
    d = abs(difference)
    other = width - d
    return d if d < other else other


@inlined
def exponent_of(x):
    return float(((bits_of(x) >> 52) & 2047) - 1023)


@inlined
def two_to(exponent):
    return float_from((int(exponent) + 1023) << 52)
"""


@dataclass(frozen=True)
class StepSource:
    """Source of the functions of a family that kernels call.

    Attributes
    ----------
    text : str
        ``step(x0…, c0…)`` returns the next state, ``slope(x0…, c0…)`` the Jacobian row by row,
        ``carry(x0…, v0…, c0…)`` the next state and what becomes of the vectors that the compound matrices of
        the Jacobian map (see `atlas.orbits.volumes`), ``minors(x0…, c0…)`` the entries of those matrices,
        ``lift(x0…, c0…)`` the next state before periodic variables are wrapped, ``drawn0``, ``drawn1`` the
        drawn observables, and ``coefficients(parameters, out)`` fills what depends on parameters alone, once
        per parameter value.
    states, coefficients : int
        How many state variables and coefficients there are.
    slow_calls : int
        Calls of polynomial functions in a step.
    drawn : tuple of str
        Expressions of what the axes show: ``x0``, or a call of ``drawn0``.
    widths : tuple of float
        Length of the interval of each periodic state variable; 0 for the others.
    word : tuple of int
        Number of the set of coefficients that holds at each time, repeating.
    letters : tuple of mapping of str to str or Exact
        What the patterns are in each of these sets.
    """

    text: str
    states: int
    coefficients: int
    slow_calls: int
    drawn: tuple[str, ...]
    widths: tuple[float, ...]
    word: tuple[int, ...]
    letters: tuple[Mapping[str, str | Exact], ...]

    @property
    def state_names(self) -> list[str]:
        """Identifiers of the state variables: ``x0``, ``x1`` …"""
        return [f"x{k}" for k in range(self.states)]

    @property
    def coefficient_names(self) -> list[str]:
        """Identifiers of the coefficients: ``c0``, ``c1`` …"""
        return [f"c{k}" for k in range(self.coefficients)]

    @property
    def vector_names(self) -> list[str]:
        """Identifiers of the components of the vectors that compound matrices carry: ``v0``, ``v1`` …"""
        return [f"v{k}" for k in range(sum(lengths(self.states)))]

    @property
    def rows(self) -> int:
        """Rows of the array of coefficients of all letters; at least 1."""
        return max(self.coefficients, 1) * len(self.letters)


@cache
def step_source(family: Family, drawn: tuple[str, ...] = ()) -> StepSource:
    """Write the source of a family's step, of its derivatives and of its coefficients.

    Parameters
    ----------
    family : Family
    drawn : tuple of str
        State variables and observables that the axes show.

    Returns
    -------
    StepSource

    Raises
    ------
    FormulaRefused
        When the step has no derivative.
    """
    states = list(family.state_names)
    steps, lifted = list(family.wrapped_step()), list(family.inlined_step())
    try:
        matrices = compounds(family.jacobian())
    except FormulaRefused as problem:
        raise FormulaRefused(f"families.{family.name}.step: {problem}") from None
    vectors = [f"vector {k}" for k in range(sum(lengths(len(states))))]
    minors = [entry for matrix in matrices for row in matrix for entry in row]
    observed = [name for name in drawn if name not in states]
    parts = {
        "step": steps,
        "slope": minors[: len(states) ** 2],
        "carry": steps + carried(matrices, vectors),
        "minors": minors,
        "lift": lifted,
        **{f"drawn{k}": [family.inlined_observable(name)] for k, name in enumerate(observed)},
    }
    trees, constants = hoist([tree for part in parts.values() for tree in part], [*states, *vectors])
    numbers = {f"coefficient {k}": f"c{k}" for k in range(len(constants))}
    variables = {name: f"x{k}" for k, name in enumerate(states)}
    carrying = {name: f"v{k}" for k, name in enumerate(vectors)}
    texts, slow = [], {}
    for name, part in parts.items():
        names = variables | (carrying if name == "carry" else {}) | numbers
        text, slow[name] = _function(name, ", ".join(names.values()), trees[: len(part)], names)
        trees = trees[len(part) :]
        texts.append(text)
    call = ", ".join([*variables.values(), *numbers.values()])
    expressions = [
        variables[name] if name in variables else f"drawn{observed.index(name)}({call})" for name in drawn
    ]
    letters, word = _letters(family)
    return StepSource(
        "\n\n".join([*texts, _coefficients(family, constants)]),
        len(states),
        len(constants),
        slow["step"],
        tuple(expressions),
        tuple(float(state.wrap[1]) - float(state.wrap[0]) if state.wrap else 0.0 for state in family.states),
        word,
        letters,
    )


def _letters(family: Family) -> tuple[tuple[Mapping[str, str | Exact], ...], tuple[int, ...]]:
    """Return the different settings of all patterns, and which of them holds at each time."""
    found: list[Mapping[str, str | Exact]] = []
    word = []
    for setting in family.word():
        if setting not in found:
            found.append(setting)
        word.append(found.index(setting))
    return tuple(found), tuple(word)


def _function(name: str, arguments: str, trees: list[Node], names: dict[str, str]) -> tuple[str, int]:
    body = StraightLine(names)
    results = [body.value(tree) for tree in trees]
    lines = [f"    {line}" for line in body.lines]
    head = f"@inlined\ndef {name}({arguments}):"
    return "\n".join([head, *lines, f"    return {', '.join(results)}"]), body.slow_calls


def _coefficients(family: Family, constants: list[Node]) -> str:
    names = {name: f"p{k}" for k, name in enumerate(parameter_rows(family))}
    body = StraightLine(names)
    used = sorted({name for tree in constants for name in free_names(tree)}, key=list(names).index)
    loads = [f"{names[name]} = parameters[{list(names).index(name)}, m]" for name in used]
    results = [body.value(tree) for tree in constants]
    stores = [f"out[{k}, m] = {result}" for k, result in enumerate(results)]
    lines = [f"        {line}" for line in [*loads, *body.lines, *stores]] or ["        pass"]
    head = "@compiled\ndef coefficients(parameters, out):\n    for m in range(parameters.shape[1]):"
    return "\n".join([head, *lines])


def parameter_rows(family: Family) -> list[str]:
    """Return the names of the rows that ``coefficients`` takes: plain parameters, then patterns."""
    return [*family.parameter_names, *(pattern.name for pattern in family.patterns)]


def cache_folder() -> Path:
    """Return the folder where compiled maps are kept.

    It is the folder that the environment variable ``ATLAS_CACHE`` names, else ``iterated-map-atlas`` under
    ``$XDG_CACHE_HOME`` (``~/.cache`` by default), else, where that cannot be written, a new temporary folder.
    """
    named = os.environ.get("ATLAS_CACHE")
    base = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")
    folder = Path(named) if named else base / "iterated-map-atlas"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except OSError:
        return Path(tempfile.mkdtemp(prefix="iterated-map-atlas-"))


def load_module(text: str) -> ModuleType:
    """Import generated source as a module from the cache folder, where its machine code is kept too.

    Parameters
    ----------
    text : str
        Source that uses the names of :data:`HEADER`.

    Returns
    -------
    module
    """
    stamp = Path(functions.__file__).read_text() + numba_version
    digest = hashlib.blake2b("\0".join((HEADER, text, stamp)).encode(), digest_size=12).hexdigest()
    name = f"atlas_map_{digest}"
    with _LOADING:  # a module that another thread still executes lacks functions
        if name in sys.modules:
            return sys.modules[name]
        path = cache_folder() / f"{name}.py"
        if not path.exists():
            with tempfile.NamedTemporaryFile("w", dir=path.parent, suffix=".part", delete=False) as part:
                part.write(f"{HEADER}\n\n{text}\n")
            os.replace(part.name, path)
        spec = importlib.util.spec_from_file_location(name, path)
        if spec is None or spec.loader is None:
            raise ImportError(f"cannot import {path}")
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module
        try:
            spec.loader.exec_module(module)
        except BaseException:
            del sys.modules[name]
            raise
        return module
