"""Records of what a map family is made of: state variables, parameters, patterns and observables."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from atlas.formula.expression import Node, unparse
from tiles.number import Exact


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
    wrap : pair of Exact, optional
        The interval [low, high) of a periodic variable, into which every step is brought back.
    """

    name: str
    start: Exact
    label: str = ""
    unit: str = ""
    domain: tuple[Exact, Exact] | None = None
    wrap: tuple[Exact, Exact] | None = None

    def as_config(self) -> dict[str, Any]:
        """Return the entry of a config, without what is empty."""
        return _filled(
            label=self.label,
            unit=self.unit,
            start=str(self.start),
            domain=_ends(self.domain),
            wrap=_ends(self.wrap),
        )


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

    def as_config(self) -> dict[str, Any]:
        """Return the entry of a config, without what is empty."""
        return _filled(default=str(self.default), label=self.label, unit=self.unit)


@dataclass(frozen=True)
class Pattern:
    """A parameter that follows a repeating list in time.

    Attributes
    ----------
    name : str
        As formulas write it.
    entries : tuple of str or Exact
        Names of plain parameters, or numbers. The first holds in the step from x(0) to x(1), the second in
        the next, and so on, over and over.
    label, unit : str
        What is printed beside the symbol; empty when there is nothing to say.
    """

    name: str
    entries: tuple[str | Exact, ...]
    label: str = ""
    unit: str = ""

    def as_config(self) -> dict[str, Any]:
        """Return the entry of a config, without what is empty."""
        return _filled(pattern=[str(entry) for entry in self.entries], label=self.label, unit=self.unit)


@dataclass(frozen=True)
class Observable:
    """A quantity that is computed from the state and can be drawn like a state variable.

    Attributes
    ----------
    name : str
        As axes name it.
    node : Node
        Its formula, over state variables, plain parameters and helpers.
    label, unit : str
        What figures print beside the symbol; empty when there is nothing to say.
    """

    name: str
    node: Node
    label: str = ""
    unit: str = ""

    def as_config(self) -> Any:
        """Return the entry of a config: the formula alone where nothing else is said."""
        entry = _filled(formula=unparse(self.node), label=self.label, unit=self.unit)
        return entry if len(entry) > 1 else entry["formula"]


def _ends(interval: tuple[Exact, Exact] | None) -> list[str] | None:
    return [str(end) for end in interval] if interval else None


def _filled(**entry: Any) -> dict[str, Any]:
    return {key: value for key, value in entry.items() if value}
