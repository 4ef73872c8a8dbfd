"""The compiled map: a family's formulas as straight-line source, one step of one orbit a call."""

from __future__ import annotations

import hashlib
import importlib.util
import os
import sys
import tempfile
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from types import ModuleType

from atlas.arithmetic.float64 import POLYNOMIALS, StraightLine, hoist
from atlas.errors import FormulaRefused
from atlas.families.reader import Family
from atlas.formula.tree import Node, free_names

HEADER = f"""\
import numpy as np
from numba import njit
from atlas.arithmetic.functions import {", ".join(POLYNOMIALS)}

inlined = njit(inline="always", error_model="numpy")
compiled = njit(nogil=True, error_model="numpy", cache=True)
"""


@dataclass(frozen=True)
class StepSource:
    """Source of the functions ``step``, ``slope`` and ``coefficients`` of a family.

    Attributes
    ----------
    text : str
        ``step(x0…, c0…)`` returns the next state, ``slope(x0…, c0…)`` the Jacobian row by row, and
        ``coefficients(parameters, out)`` fills what depends on parameters alone, once per parameter value.
    states, coefficients : int
        How many state variables and coefficients there are.
    slow_calls : int
        Calls of polynomial functions in a step.
    """

    text: str
    states: int
    coefficients: int
    slow_calls: int

    @property
    def state_names(self) -> list[str]:
        """Identifiers of the state variables: ``x0``, ``x1`` …"""
        return [f"x{k}" for k in range(self.states)]

    @property
    def coefficient_names(self) -> list[str]:
        """Identifiers of the coefficients: ``c0``, ``c1`` …"""
        return [f"c{k}" for k in range(self.coefficients)]


@cache
def step_source(family: Family) -> StepSource:
    """Write the source of a family's step, of its Jacobian and of its coefficients.

    Parameters
    ----------
    family : Family

    Returns
    -------
    StepSource

    Raises
    ------
    FormulaRefused
        When the step has no derivative.
    """
    states = [state.name for state in family.states]
    steps = list(family.inlined_step())
    try:
        slopes = [entry for row in family.jacobian() for entry in row]
    except FormulaRefused as problem:
        raise FormulaRefused(f"families.{family.name}.step: {problem}") from None
    trees, constants = hoist([*steps, *slopes], states)
    names = {name: f"x{k}" for k, name in enumerate(states)}
    names |= {f"coefficient {k}": f"c{k}" for k in range(len(constants))}
    arguments = ", ".join(names.values())
    step, slow = _function("step", arguments, trees[: len(steps)], names)
    slope, _ = _function("slope", arguments, trees[len(steps) :], names)
    text = "\n\n".join((step, slope, _coefficients(family, constants)))
    return StepSource(text, len(states), len(constants), slow)


def _function(name: str, arguments: str, trees: list[Node], names: dict[str, str]) -> tuple[str, int]:
    body = StraightLine(names)
    results = [body.value(tree) for tree in trees]
    lines = [f"    {line}" for line in body.lines]
    head = f"@inlined\ndef {name}({arguments}):"
    return "\n".join([head, *lines, f"    return {', '.join(results)}"]), body.slow_calls


def _coefficients(family: Family, constants: list[Node]) -> str:
    names = {parameter.name: f"p{k}" for k, parameter in enumerate(family.parameters)}
    body = StraightLine(names)
    used = sorted({name for tree in constants for name in free_names(tree)}, key=list(names).index)
    loads = [f"{names[name]} = parameters[{list(names).index(name)}, m]" for name in used]
    results = [body.value(tree) for tree in constants]
    stores = [f"out[{k}, m] = {result}" for k, result in enumerate(results)]
    lines = [f"        {line}" for line in [*loads, *body.lines, *stores]] or ["        pass"]
    head = "@compiled\ndef coefficients(parameters, out):\n    for m in range(parameters.shape[1]):"
    return "\n".join([head, *lines])


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


def load_module(text: str, stamp: str) -> ModuleType:
    """Import generated source as a module from the cache folder, where its machine code is kept too.

    Parameters
    ----------
    text : str
        Source that uses the names of :data:`HEADER`.
    stamp : str
        Everything outside the text that the machine code depends on.

    Returns
    -------
    module
    """
    digest = hashlib.blake2b("\0".join((HEADER, text, stamp)).encode(), digest_size=12).hexdigest()
    name = f"atlas_map_{digest}"
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
    spec.loader.exec_module(module)
    return module
