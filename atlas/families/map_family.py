"""A map family: state variables, parameters, helper expressions and one step formula a variable."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from hashlib import blake2b
from math import lcm
from typing import Any

from atlas.families.records import Observable, Parameter, Pattern, State
from atlas.families.wrapping import wrapped
from atlas.formula.expression import Node, derivative, substitute, unparse
from tiles.number import Exact
from tiles.window import Axis


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
        Those with one value for all time, by name.
    helpers : tuple of (str, Node)
        Named expressions, each after those that it uses.
    step : tuple of Node
        The next value of each state variable, in the order of ``states``.
    escape : Exact
        Positive; an orbit has escaped when a state variable is not below it in size.
    patterns : tuple of Pattern
        Parameters that follow a repeating list in time, by name.
    observables : tuple of Observable
        By name.
    extinct : tuple of (str, Exact)
        State variables, by name, with the positive size below which each counts as extinct.
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
    patterns: tuple[Pattern, ...] = ()
    observables: tuple[Observable, ...] = ()
    extinct: tuple[tuple[str, Exact], ...] = ()
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
        """The names of the plain parameters."""
        return tuple(parameter.name for parameter in self.parameters)

    @property
    def pattern_names(self) -> tuple[str, ...]:
        """The names of the parameters that follow a pattern."""
        return tuple(pattern.name for pattern in self.patterns)

    @property
    def observable_names(self) -> tuple[str, ...]:
        """The names of the observables."""
        return tuple(observable.name for observable in self.observables)

    def label_and_unit(self, name: str) -> tuple[str, str]:
        """Return what figures print beside a symbol; two empty texts for a name that the family lacks."""
        named: list[State | Parameter | Pattern | Observable] = [*self.states, *self.parameters]
        named += [*self.patterns, *self.observables]
        for one in named:
            if one.name == name:
                return one.label, one.unit
        return "", ""

    def word(self) -> tuple[dict[str, str | Exact], ...]:
        """Return what every pattern is at each time, over the combined length of all patterns.

        Returns
        -------
        tuple of dict
            Entry n holds in the step from x(n) to x(n + 1), and again after as many steps as there are
            entries: the least common multiple of the patterns' lengths, not more than
            :data:`atlas.families.patterns.LONGEST_WORD`. One empty entry without patterns.

        Examples
        --------
        >>> from atlas.families.catalogue import family
        >>> family("forced_logistic").word()
        ({'r': 'a'}, {'r': 'b'})
        """
        length = lcm(*(len(pattern.entries) for pattern in self.patterns))
        return tuple(
            {pattern.name: pattern.entries[time % len(pattern.entries)] for pattern in self.patterns}
            for time in range(length)
        )

    def with_patterns(self, given: Mapping[str, Sequence[str | Exact]]) -> Family:
        """Return the family with other entries of some patterns.

        Parameters
        ----------
        given : mapping of str to sequence
            Entries by the name of their pattern, checked by
            :func:`atlas.families.patterns.check_patterns`.

        Returns
        -------
        Family

        Raises
        ------
        KeyError
            When the family has no such pattern.
        """
        if unknown := sorted(set(given) - set(self.pattern_names)):
            raise KeyError(unknown[0])
        patterns = tuple(
            replace(pattern, entries=tuple(given.get(pattern.name, pattern.entries)))
            for pattern in self.patterns
        )
        return replace(self, patterns=patterns)

    def inlined_step(self) -> tuple[Node, ...]:
        """Return the step formulas with every helper written out and no periodic variable brought back."""
        written = self._written_helpers()
        return tuple(substitute(node, written) for node in self.step)

    def wrapped_step(self) -> tuple[Node, ...]:
        """Return the step formulas with helpers written out and periodic variables brought back.

        A periodic variable of the interval [low, high) becomes ``low + mod(f - low, high - low)``. In
        float64 a value just below ``low`` can be rounded onto ``high``.
        """
        steps = zip(self.inlined_step(), self.states, strict=True)
        return tuple(wrapped(node, state.wrap) if state.wrap else node for node, state in steps)

    def inlined_observable(self, name: str) -> Node:
        """Return the formula of an observable with every helper written out.

        Raises
        ------
        KeyError
            When the family has no such observable.
        """
        nodes = {observable.name: observable.node for observable in self.observables}
        return substitute(nodes[name], self._written_helpers())

    def _written_helpers(self) -> dict[str, Node]:
        written: dict[str, Node] = {}
        for name, node in self.helpers:
            written[name] = substitute(node, written)
        return written

    def jacobian(self) -> tuple[tuple[Node, ...], ...]:
        """Return the exact derivative of the step, helpers written out; wrapping changes none of it.

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
            "state": {state.name: state.as_config() for state in self.states},
            "parameters": {one.name: one.as_config() for one in self.parameters}
            | {one.name: one.as_config() for one in self.patterns},
            "helpers": {name: unparse(node) for name, node in self.helpers},
            "step": {name: unparse(node) for name, node in steps},
            "observables": {one.name: one.as_config() for one in self.observables},
            "escape": str(self.escape),
            "extinct": {name: str(threshold) for name, threshold in self.extinct},
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


def _axis_config(axis: Axis | None) -> Any:
    if axis is None:
        return None
    if axis.scale == "linear" and axis.label is None:
        return [axis.name, str(axis.low), str(axis.high)]
    entry = {"name": axis.name, "low": str(axis.low), "high": str(axis.high), "scale": axis.scale}
    return {**entry, "label": axis.label} if axis.label else entry
