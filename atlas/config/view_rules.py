"""What a family allows: which parameters are set, where orbits start, which sizes count as extinct."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from atlas.config.settings import Setting
from atlas.families.patterns import check_patterns
from atlas.families.reader import Family
from atlas.reading.place import Place, shown
from tiles.errors import nearest
from tiles.number import Exact
from tiles.window import View


def with_patterns(family: Family, given: Mapping[str, Setting], place: Place) -> Family:
    """Return the family with the patterns that ``set`` gives it.

    Raises
    ------
    ConfigRefused
        For a pattern that the family does not have, for an entry that is no plain parameter of it, and when
        its patterns repeat together too late.
    """
    patterns = {name: entries for name, entries in given.items() if not isinstance(entries, Exact)}
    for name in patterns:
        if name in family.parameter_names:
            raise place.at(name).refusal(f"{shown(name)} is a plain parameter, no pattern; write a number")
        if name not in family.pattern_names:
            hint = nearest(name, family.pattern_names) if family.patterns else ", and no pattern at all"
            raise place.refusal(f"the family '{family.name}' has no pattern {shown(name)}{hint}")
    if not patterns:
        return family
    changed = family.with_patterns(patterns)
    check_patterns({one.name: one.entries for one in changed.patterns}, changed.parameter_names, place)
    return changed


def checked_set(
    family: Family, given: Mapping[str, Setting], view: View | None, place: Place
) -> dict[str, Exact]:
    """Return the values given to parameters, sorted by name.

    Raises
    ------
    ConfigRefused
        For a name that is no parameter of the family and for one that runs along an axis of the view, if
        there is one.
    """
    letters = {pattern.name: pattern.entries for pattern in family.patterns}
    numbers = {name: value for name, value in given.items() if isinstance(value, Exact)}
    for name in numbers:
        if view is not None and name in (view.across.name, view.up.name):
            raise place.at(name).refusal(f"{shown(name)} already runs along an axis; remove it here")
        if name in letters:
            now = ", ".join(map(str, letters[name]))
            raise place.at(name).refusal(
                f"{shown(name)} is the pattern [{now}], which no number can replace; "
                f"set its letters, or write {{pattern: [{numbers[name]}]}}"
            )
        if name not in family.parameter_names:
            hint = nearest(name, [*family.parameter_names, *letters])
            raise place.refusal(f"the family '{family.name}' has no parameter {shown(name)}{hint}")
    return dict(sorted(numbers.items()))


def checked_starts(
    family: Family, given: Sequence[Mapping[str, Exact]] | None, place: Place
) -> tuple[dict[str, Exact], ...]:
    """Return the states that orbits start from, each complete: what is not given is the family's own start.

    Raises
    ------
    ConfigRefused
        For a name that is no state variable, for a start beyond the escape bound and for one outside the
        interval to which the variable is wrapped.
    """
    own = {state.name: state.start for state in family.states}
    starts = []
    for number, start in enumerate(given if given is not None else ({},), 1):
        spot = place.at(number) if given is not None else place
        for name, value in start.items():
            if name not in own:
                hint = nearest(name, own)
                raise spot.refusal(f"the family '{family.name}' has no state variable {shown(name)}{hint}")
            if abs(float(value)) >= float(family.escape):
                raise spot.at(name).refusal(
                    f"the start {value} lies beyond the escape bound {family.escape}; start inside it"
                )
            _check_wrapped(family, name, value, spot.at(name))
        starts.append({**own, **start})
    return tuple(starts)


def _check_wrapped(family: Family, name: str, start: Exact, place: Place) -> None:
    for state in family.states:
        if state.name == name and state.wrap and not state.wrap[0] <= start < state.wrap[1]:
            low, high = state.wrap
            raise place.refusal(
                f"the start {start} lies outside {low} to {high}, to which {shown(name)} is wrapped; "
                f"start at {low} or more and below {high}"
            )


def checked_extinct(family: Family, given: Mapping[str, Exact], place: Place) -> dict[str, Exact]:
    """Return the sizes below which state variables count as extinct, sorted by name.

    Raises
    ------
    ConfigRefused
        For a name that is no state variable and for a size that is not below the escape bound.
    """
    for name, size in given.items():
        if name not in family.state_names:
            hint = nearest(name, family.state_names)
            raise place.refusal(f"the family '{family.name}' has no state variable {shown(name)}{hint}")
        if float(size) >= float(family.escape):
            raise place.at(name).refusal(
                f"{size} is not below the escape bound {family.escape}; write a size that is"
            )
    return dict(sorted(given.items()))
