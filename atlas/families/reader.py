"""Reading map families from configs: everything is checked here, each fault told in one sentence."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from typing import Any

from atlas.errors import FormulaRefused
from atlas.families.checks import (
    OUTPUT_NAMES,
    check_extinct,
    check_name,
    check_names,
    check_states,
    check_view,
)
from atlas.families.keys import FAMILY_KEYS
from atlas.families.map_family import Family
from atlas.families.patterns import check_patterns
from atlas.families.records import Observable, Parameter, Pattern, State
from atlas.formula.expression import Node, Size, check_powers, free_names, parse, size
from atlas.reading.place import Place, shown
from atlas.reading.section import read_section
from tiles.errors import nearest

__all__ = ["OUTPUT_NAMES", "Family", "Observable", "Parameter", "Pattern", "State", "family_from_config"]

MOST_NODES = 1000
DEEPEST = 120


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
    check_name(name, place, "a family")
    values = read_section(FAMILY_KEYS, mapping, place)
    check_names(values, place)
    states = tuple(State(key, **entry) for key, entry in values["state"].items())
    check_states(states, values["escape"], place.at("state"))
    check_extinct(values, place.at("extinct"))
    check_view(values, place)
    parameters, patterns = _parameters(values, place.at("parameters"))
    helpers = _helpers(values, place.at("helpers"))
    family = Family(
        name=name,
        title=values["title"] or name.replace("_", " "),
        states=states,
        parameters=parameters,
        helpers=helpers,
        step=_steps(values, place.at("step")),
        patterns=patterns,
        observables=_observables(values, helpers, place.at("observables")),
        extinct=tuple(values["extinct"].items()),
        **{key: values[key] for key in ("escape", "source", "note", "across", "up")},
    )
    _check_written_out(family, place)
    return family


def _place(where: str) -> Place:
    file, _, path = where.rpartition(": ")
    return Place(file, (path,) if path else ())


def _parameters(values: Mapping[str, Any], place: Place) -> tuple[tuple[Parameter, ...], tuple[Pattern, ...]]:
    entries = {name: dict(entry) for name, entry in values["parameters"].items()}
    plain = {name: entry for name, entry in entries.items() if "default" in entry}
    lists = {name: entry.pop("pattern") for name, entry in entries.items() if name not in plain}
    check_patterns(lists, plain, place)
    parameters = tuple(Parameter(name, **entry) for name, entry in plain.items())
    return parameters, tuple(Pattern(name, lists[name], **entries[name]) for name in lists)


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


def _observables(
    values: Mapping[str, Any], helpers: Collection[tuple[str, Node]], place: Place
) -> tuple[Observable, ...]:
    changing = {name for name, entry in values["parameters"].items() if "pattern" in entry}
    names = {*values["state"], *values["parameters"], *values["helpers"]}
    for name, node in helpers:
        if free_names(node) & changing:
            changing.add(name)
    found = []
    for name, entry in values["observables"].items():
        node = parse(entry["formula"], names, where=str(place.at(name)))
        if used := sorted(free_names(node) & changing):
            raise place.at(name).refusal(
                f"{shown(used[0])} follows a pattern in time; an observable is a formula of the state and of "
                "parameters with a default"
            )
        found.append(Observable(name, node, entry["label"], entry["unit"]))
    return tuple(found)


def _check_written_out(family: Family, place: Place) -> None:
    sizes: dict[str, Size] = {}
    for name, node in family.helpers:
        sizes[name] = _checked_size(node, sizes, place.at("helpers").at(name))
    steps = {
        place.at("step").at(name): node for name, node in zip(family.state_names, family.step, strict=True)
    }
    observed = {place.at("observables").at(one.name): one.node for one in family.observables}
    for spot, node in [*steps.items(), *observed.items()]:
        _checked_size(node, sizes, spot)
    written = [*family.inlined_step(), *map(family.inlined_observable, family.observable_names)]
    for spot, node in zip([*steps, *observed], written, strict=True):
        try:
            check_powers(node)
        except FormulaRefused as problem:
            raise FormulaRefused(f"{spot}: {problem}") from None


def _checked_size(node: Node, sizes: Mapping[str, Size], place: Place) -> Size:
    measured = size(node, sizes)
    if measured.nodes > MOST_NODES or measured.depth > DEEPEST:
        raise FormulaRefused(
            f"{place}: with its helpers written out the formula has {measured.nodes} parts on "
            f"{measured.depth} levels; at most {MOST_NODES} on {DEEPEST} are allowed"
        )
    return measured
