"""Map families: state variables, parameters, helper expressions and one step formula a variable."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from atlas.expression import Node
from tiles.number import Exact


@dataclass(frozen=True)
class State:
    """A state variable: its name, its label and unit in figures, where orbits start, where it lives."""

    name: str
    label: str
    unit: str
    start: Exact
    domain: tuple[Exact, Exact] | None = None


@dataclass(frozen=True)
class Parameter:
    """A parameter: its name, the value it has unless told otherwise, its label and unit in figures."""

    name: str
    default: Exact
    label: str
    unit: str = ""


@dataclass(frozen=True)
class Family:
    """A family of iterated maps."""

    name: str
    title: str
    states: tuple[State, ...]
    parameters: tuple[Parameter, ...]
    helpers: tuple[tuple[str, Node], ...]
    step: tuple[Node, ...]
    escape: Exact
    source: str = ""
    note: str = ""
    across: tuple[str, str, str] | None = None
    up: tuple[str, str, str] | None = None

    def inlined_step(self) -> tuple[Node, ...]:
        raise NotImplementedError

    def jacobian(self) -> tuple[tuple[Node, ...], ...]:
        raise NotImplementedError

    def as_config(self) -> dict[str, Any]:
        raise NotImplementedError

    def formula_lines(self) -> list[str]:
        raise NotImplementedError

    def digest(self) -> str:
        raise NotImplementedError


def family_from_config(name: str, mapping: Mapping[str, Any], *, where: str) -> Family:
    raise NotImplementedError
