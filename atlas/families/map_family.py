"""A map family: state variables, parameters, helper expressions and one step formula a variable."""

from __future__ import annotations

import json
from dataclasses import dataclass
from hashlib import blake2b
from typing import Any

from atlas.formula.expression import Node, derivative, substitute, unparse
from tiles.number import Exact
from tiles.window import Axis


@dataclass(frozen=True)
class State:
    """A state variable.

    Attributes
    ----------
    name : str
        As formulas write it.
    start : Exact
        Where orbits start unless told otherwise.
    label, unit : str
        What figures print beside the symbol; empty when there is nothing to say.
    domain : pair of Exact, optional
        The closed interval in which the variable means something.
    """

    name: str
    start: Exact
    label: str = ""
    unit: str = ""
    domain: tuple[Exact, Exact] | None = None


@dataclass(frozen=True)
class Parameter:
    """A parameter.

    Attributes
    ----------
    name : str
        As formulas write it.
    default : Exact
        The value it has unless told otherwise.
    label, unit : str
        What figures print beside the symbol; empty when there is nothing to say.
    """

    name: str
    default: Exact
    label: str = ""
    unit: str = ""


@dataclass(frozen=True)
class Family:
    """A family of iterated maps, checked and complete.

    Attributes
    ----------
    name, title : str
        The word that configs use, and the name in prose.
    states : tuple of State
        One to three state variables, by name.
    parameters : tuple of Parameter
        By name.
    helpers : tuple of (str, Node)
        Named expressions, each after those that it uses.
    step : tuple of Node
        The next value of each state variable, in the order of ``states``.
    escape : Exact
        Positive; an orbit has escaped when a state variable is not below it in size.
    source, note : str
        Where the family comes from, and what to beware of.
    across, up : Axis, optional
        A view that shows the family well.

    Examples
    --------
    >>> from atlas.families.catalogue import family
    >>> family("logistic").formula_lines()
    ['x -> r * x * (1 - x)']
    """

    name: str
    title: str
    states: tuple[State, ...]
    parameters: tuple[Parameter, ...]
    helpers: tuple[tuple[str, Node], ...]
    step: tuple[Node, ...]
    escape: Exact
    source: str = ""
    note: str = ""
    across: Axis | None = None
    up: Axis | None = None

    @property
    def state_names(self) -> tuple[str, ...]:
        """The names of the state variables."""
        return tuple(state.name for state in self.states)

    @property
    def parameter_names(self) -> tuple[str, ...]:
        """The names of the parameters."""
        return tuple(parameter.name for parameter in self.parameters)

    def label_and_unit(self, name: str) -> tuple[str, str]:
        """Return what figures print beside the symbol of a state variable or parameter."""
        for state in self.states:
            if state.name == name:
                return state.label, state.unit
        for parameter in self.parameters:
            if parameter.name == name:
                return parameter.label, parameter.unit
        return "", ""

    def inlined_step(self) -> tuple[Node, ...]:
        """Return the step formulas with every helper written out."""
        written: dict[str, Node] = {}
        for name, node in self.helpers:
            written[name] = substitute(node, written)
        return tuple(substitute(node, written) for node in self.step)

    def jacobian(self) -> tuple[tuple[Node, ...], ...]:
        """Return the exact derivative of the step, helpers written out.

        Returns
        -------
        tuple of tuple of Node
            Row i, column j: the derivative of the next value of state i with respect to state j.

        Raises
        ------
        FormulaRefused
            When a derivative is no real number anywhere.
        """
        return tuple(
            tuple(derivative(node, name) for name in self.state_names) for node in self.inlined_step()
        )

    def formula_lines(self) -> list[str]:
        """Return the formulas as text: the helpers, then one line a state variable."""
        helpers = [f"{name} = {unparse(node)}" for name, node in self.helpers]
        steps = zip(self.state_names, self.step, strict=True)
        return helpers + [f"{name} -> {unparse(node)}" for name, node in steps]

    def as_config(self) -> dict[str, Any]:
        """Return the family as a config holds it, numbers and formulas as text, without what is empty.

        :func:`atlas.families.reader.family_from_config` makes the same family of it again.
        """
        steps = zip(self.state_names, self.step, strict=True)
        config: dict[str, Any] = {
            "title": self.title,
            "state": {state.name: _state_config(state) for state in self.states},
            "parameters": {parameter.name: _parameter_config(parameter) for parameter in self.parameters},
            "helpers": {name: unparse(node) for name, node in self.helpers},
            "step": {name: unparse(node) for name, node in steps},
            "escape": str(self.escape),
            "source": self.source,
            "note": self.note,
            "across": _axis_config(self.across),
            "up": _axis_config(self.up),
        }
        return {key: value for key, value in config.items() if value}

    def digest(self) -> str:
        """Return 32 hexadecimal digits that tell two families apart, their names left aside."""
        text = json.dumps(self.as_config(), sort_keys=True, ensure_ascii=True, separators=(",", ":"))
        return blake2b(text.encode("ascii"), digest_size=16).hexdigest()


def _state_config(state: State) -> dict[str, Any]:
    domain = [str(end) for end in state.domain] if state.domain else None
    entry = {"label": state.label, "unit": state.unit, "start": str(state.start), "domain": domain}
    return {key: value for key, value in entry.items() if value}


def _parameter_config(parameter: Parameter) -> dict[str, Any]:
    entry = {"default": str(parameter.default), "label": parameter.label, "unit": parameter.unit}
    return {key: value for key, value in entry.items() if value}


def _axis_config(axis: Axis | None) -> Any:
    if axis is None:
        return None
    if axis.scale == "linear" and axis.label is None:
        return [axis.name, str(axis.low), str(axis.high)]
    entry = {"name": axis.name, "low": str(axis.low), "high": str(axis.high), "scale": axis.scale}
    return {**entry, "label": axis.label} if axis.label else entry
