"""What the names, the starts and the default view of a map family must keep to."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping
from typing import Any

from atlas.families.records import State
from atlas.formula.expression import IDENTIFIER, is_identifier
from atlas.reading.place import Place, shown
from tiles.errors import nearest
from tiles.number import Exact
from tiles.window import Axis

OUTPUT_NAMES = frozenset(
    {
        *("counts", "density", "exposure", "below", "above", "escaped", "unsettled", "collapsed"),
        *("fate", "period", "lyapunov", "lyapunov_2", "lyapunov_error", "rotation", "escape"),
        *("attractors", "basin", "attractor", "left", "right", "filled", "on_repelling", "sweep"),
    }
)
"""Variables of the datasets whose dimensions carry the names of state variables and parameters."""


def check_names(values: Mapping[str, Any], place: Place) -> None:
    """Refuse names that are none, that mean something else or that stand for two things."""
    sections = {
        "state": "a state variable",
        "parameters": "a parameter",
        "helpers": "a helper",
        "observables": "an observable",
    }
    seen: dict[str, str] = {}
    for section, what in sections.items():
        for name in values[section]:
            spot = place.at(section)
            check_name(name, spot, what)
            if not is_identifier(name):
                raise spot.refusal(f"{shown(name)} belongs to the formula language; name {what} otherwise")
            if section != "helpers" and name in OUTPUT_NAMES:
                raise spot.refusal(
                    f"{shown(name)} is a variable of the results; name {what} otherwise and label it so"
                )
            if name in seen:
                raise spot.refusal(f"{shown(name)} is {seen[name]} already; every name stands for one thing")
            seen[name] = what


def check_name(name: Any, place: Place, what: str) -> None:
    """Refuse what cannot name something."""
    if not isinstance(name, str) or not re.fullmatch(IDENTIFIER, name):
        raise place.refusal(
            f"{shown(name)} cannot name {what}; write a letter, then letters, digits and underscores, "
            "at most 40 in all"
        )


def check_states(states: Collection[State], escape: Exact, place: Place) -> None:
    """Refuse starts outside the escape bound or their interval, and intervals that contradict each other."""
    for state in states:
        spot = place.at(state.name)
        if abs(float(state.start)) >= float(escape):
            raise spot.at("start").refusal(f"{state.start} is not below the escape bound {escape} in size")
        if state.domain and not state.domain[0] <= state.start <= state.domain[1]:
            low, high = state.domain
            raise spot.at("start").refusal(f"{state.start} lies outside the domain from {low} to {high}")
        if state.wrap:
            _check_wrap(state, state.wrap, escape, spot)


def _check_wrap(state: State, wrap: tuple[Exact, Exact], escape: Exact, place: Place) -> None:
    low, high = wrap
    if state.domain:
        raise place.at("wrap").refusal("a periodic variable has no other domain; take 'domain' or 'wrap' out")
    if max(abs(float(low)), abs(float(high))) > float(escape):
        raise place.at("wrap").refusal(
            f"the interval from {low} to {high} reaches beyond the escape bound {escape}"
        )
    if not low <= state.start < high:
        raise place.at("start").refusal(
            f"{state.start} lies outside the periodic interval; start from {low} up to below {high}"
        )


def check_extinct(values: Mapping[str, Any], place: Place) -> None:
    """Refuse thresholds of what is no state variable, and those that the escape bound leaves no room for."""
    for name, threshold in values["extinct"].items():
        if name not in values["state"]:
            raise place.refusal(f"{shown(name)} is no state variable{nearest(name, values['state'])}")
        if float(threshold) >= float(values["escape"]):
            raise place.at(name).refusal(f"{threshold} is not below the escape bound {values['escape']}")


def check_view(values: Mapping[str, Any], place: Place) -> None:
    """Refuse a default view with one axis, with the same axis twice or of names that cannot be axes."""
    axes = {key: values[key] for key in ("across", "up") if values[key] is not None}
    for key, axis in axes.items():
        _check_axis(axis, values, place.at(key))
    if len({axis.name for axis in axes.values()}) != len(axes):
        raise place.at("up").refusal(f"{shown(axes['up'].name)} stands on both axes; name two different ones")
    if len(axes) == 1:
        given, missing = sorted(("across", "up"), key=lambda key: key not in axes)
        raise place.refusal(f"'{given}' is given without '{missing}'; a default view needs both")


def _check_axis(axis: Axis, values: Mapping[str, Any], place: Place) -> None:
    patterns = {name: entry["pattern"] for name, entry in values["parameters"].items() if "pattern" in entry}
    known = [*(name for name in values["parameters"] if name not in patterns), *values["state"]]
    known += values["observables"]
    if axis.name in patterns:
        letters = sorted({entry for entry in patterns[axis.name] if isinstance(entry, str)})
        remedy = f"name one of its letters: {', '.join(letters)}" if letters else "give its numbers names"
        raise place.refusal(f"{shown(axis.name)} follows a pattern in time and is no axis; {remedy}")
    if axis.name not in known:
        hint = nearest(axis.name, known)
        raise place.refusal(
            f"{shown(axis.name)} is neither a parameter nor a state variable nor an observable{hint}"
        )
    wrap = values["state"].get(axis.name, {}).get("wrap")
    if wrap and axis.scale == "log":
        raise place.refusal(f"{shown(axis.name)} is periodic and has no logarithmic axis; write a linear one")
    if wrap and not wrap[0] <= axis.low < axis.high <= wrap[1]:
        raise place.refusal(
            f"the axis from {axis.low} to {axis.high} reaches beyond the periodic interval "
            f"from {wrap[0]} to {wrap[1]}"
        )
