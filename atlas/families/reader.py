"""Reading map families from configs: everything is checked here, each fault told in one sentence."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping
from typing import Any

from atlas.errors import FormulaRefused
from atlas.families.keys import FAMILY_KEYS
from atlas.families.map_family import Family, Parameter, State
from atlas.formula.expression import (
    IDENTIFIER,
    Node,
    Size,
    check_powers,
    free_names,
    is_identifier,
    parse,
    size,
)
from atlas.reading.place import Place, shown
from atlas.reading.section import read_section
from tiles.errors import nearest

__all__ = ["Family", "Parameter", "State", "family_from_config"]

MOST_NODES = 1000
DEEPEST = 120
OUTPUT_NAMES = frozenset(
    {"counts", "density", "exposure", "below", "above", "escaped", "unsettled", "collapsed", "fate", "period"}
)
"""Variables of the datasets whose dimensions carry the names of state variables and parameters."""


def family_from_config(name: str, mapping: Mapping[str, Any], *, where: str = "") -> Family:
    """Make a family of what a config says about it.

    The order of keys means nothing: state variables and parameters come in the order of the alphabet,
    helpers each after those that it uses.

    Parameters
    ----------
    name : str
        The word that configs use for the family.
    mapping : mapping
        The keys of :data:`atlas.families.keys.FAMILY_KEYS`; scalars may be texts.
    where : str
        What a refusal begins with: ``fishery.yaml: families.sound``.

    Returns
    -------
    Family

    Raises
    ------
    ConfigRefused
        When a key, a name or a value is wrong.
    FormulaRefused
        When a formula is none, or is too large with its helpers written out.

    Examples
    --------
    >>> family = family_from_config(
    ...     "halving", {"state": {"x": {"start": 1}}, "step": {"x": "x / 2"}}, where="halving.yaml"
    ... )
    >>> family.formula_lines()
    ['x -> x / 2']
    """
    place = _place(where)
    _check_name(name, place, "a family")
    values = read_section(FAMILY_KEYS, mapping, place)
    _check_names(values, place)
    states = tuple(State(key, **entry) for key, entry in values["state"].items())
    parameters = tuple(Parameter(key, **entry) for key, entry in values["parameters"].items())
    _check_starts(states, values["escape"], place)
    _check_view(values, place)
    family = Family(
        name=name,
        title=values["title"] or name.replace("_", " "),
        states=states,
        parameters=parameters,
        helpers=_helpers(values, place.at("helpers")),
        step=_steps(values, place.at("step")),
        **{key: values[key] for key in ("escape", "source", "note", "across", "up")},
    )
    _check_written_out(family, place)
    return family


def _place(where: str) -> Place:
    file, _, path = where.rpartition(": ")
    return Place(file, (path,) if path else ())


def _check_names(values: Mapping[str, Any], place: Place) -> None:
    sections = {"state": "a state variable", "parameters": "a parameter", "helpers": "a helper"}
    seen: dict[str, str] = {}
    for section, what in sections.items():
        for name in values[section]:
            spot = place.at(section)
            _check_name(name, spot, what)
            if not is_identifier(name):
                raise spot.refusal(f"{shown(name)} belongs to the formula language; name {what} otherwise")
            if section != "helpers" and name in OUTPUT_NAMES:
                raise spot.refusal(
                    f"{shown(name)} is a variable of the results; name {what} otherwise and label it so"
                )
            if name in seen:
                raise spot.refusal(f"{shown(name)} is {seen[name]} already; every name stands for one thing")
            seen[name] = what


def _check_name(name: Any, place: Place, what: str) -> None:
    if not isinstance(name, str) or not re.fullmatch(IDENTIFIER, name):
        raise place.refusal(
            f"{shown(name)} cannot name {what}; write a letter, then letters, digits and underscores, "
            "at most 40 in all"
        )


def _check_starts(states: Collection[State], escape: Any, place: Place) -> None:
    for state in states:
        spot = place.at("state").at(state.name).at("start")
        if abs(float(state.start)) >= float(escape):
            raise spot.refusal(f"{state.start} is not below the escape bound {escape} in size")
        if state.domain and not state.domain[0] <= state.start <= state.domain[1]:
            low, high = state.domain
            raise spot.refusal(f"{state.start} lies outside the domain from {low} to {high}")


def _check_view(values: Mapping[str, Any], place: Place) -> None:
    axes = {key: values[key] for key in ("across", "up") if values[key] is not None}
    known = [*values["parameters"], *values["state"]]
    for key, axis in axes.items():
        if axis.name not in known:
            hint = nearest(axis.name, known)
            raise place.at(key).refusal(
                f"{shown(axis.name)} is neither a parameter nor a state variable{hint}"
            )
    if len({axis.name for axis in axes.values()}) != len(axes):
        raise place.at("up").refusal(f"{shown(axes['up'].name)} stands on both axes; name two different ones")
    if len(axes) == 1:
        given, missing = sorted(("across", "up"), key=lambda key: key not in axes)
        raise place.refusal(f"'{given}' is given without '{missing}'; a default view needs both")


def _helpers(values: Mapping[str, Any], place: Place) -> tuple[tuple[str, Node], ...]:
    names = {*values["state"], *values["parameters"], *values["helpers"]}
    waiting = {
        name: parse(text, names, where=str(place.at(name))) for name, text in values["helpers"].items()
    }
    ordered: list[tuple[str, Node]] = []
    while waiting:
        ready = [name for name, node in waiting.items() if not free_names(node) & waiting.keys()]
        if not ready:
            raise _circle(waiting, place)
        ordered += [(name, waiting.pop(name)) for name in ready]
    return tuple(ordered)


def _circle(waiting: Mapping[str, Node], place: Place) -> Exception:
    way: list[str] = []
    name = min(waiting)
    while name not in way:
        way.append(name)
        name = min(free_names(waiting[name]) & waiting.keys())
    circle = way[way.index(name) :]
    if len(circle) == 1:
        return place.at(name).refusal("the helper uses itself; a helper may use others but not itself")
    told = " uses ".join([*circle, circle[0]])
    return place.at(name).refusal(f"the helpers form a circle: {told}; take one of them out")


def _steps(values: Mapping[str, Any], place: Place) -> tuple[Node, ...]:
    states, given = values["state"], values["step"]
    for name in given:
        if name not in states:
            raise place.refusal(f"{shown(name)} is no state variable{nearest(name, states)}")
    for name in states:
        if name not in given:
            raise place.refusal(f"the step of '{name}' is missing; write a formula for its next value")
    names = {*states, *values["parameters"], *values["helpers"]}
    return tuple(parse(given[name], names, where=str(place.at(name))) for name in states)


def _check_written_out(family: Family, place: Place) -> None:
    sizes: dict[str, Size] = {}
    for name, node in family.helpers:
        sizes[name] = _checked_size(node, sizes, place.at("helpers").at(name))
    for name, node in zip(family.state_names, family.step, strict=True):
        _checked_size(node, sizes, place.at("step").at(name))
    for name, node in zip(family.state_names, family.inlined_step(), strict=True):
        try:
            check_powers(node)
        except FormulaRefused as problem:
            raise FormulaRefused(f"{place.at('step').at(name)}: {problem}") from None


def _checked_size(node: Node, sizes: Mapping[str, Size], place: Place) -> Size:
    measured = size(node, sizes)
    if measured.nodes > MOST_NODES or measured.depth > DEEPEST:
        raise FormulaRefused(
            f"{place}: with its helpers written out the formula has {measured.nodes} parts on "
            f"{measured.depth} levels; at most {MOST_NODES} on {DEEPEST} are allowed"
        )
    return measured
