"""What a family allows: which views of it are drawn, which parameters are set, where orbits start."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from atlas.families.reader import Family
from atlas.reading.place import Place, shown
from tiles.errors import nearest
from tiles.number import Exact
from tiles.window import Axis, View

DRAWN = "this version draws a parameter across and a state variable up"


def drawn_view(family: Family, across: Axis, up: Axis, place: Place) -> View:
    """Return the view of two axes, if it is of a kind that this version draws.

    Parameters
    ----------
    family : Family
        Whose parameters and state variables the axes name.
    across, up : Axis
        The axes.
    place : Place
        Where the keys ``across`` and ``up`` stand.

    Raises
    ------
    ConfigRefused
        When an axis names nothing that the family has, both name the same, or the kinds of axis are not
        a parameter across and a state variable up.
    """
    kinds = [_kind_of_axis(family, axis, place.at(key)) for key, axis in (("across", across), ("up", up))]
    if across.name == up.name:
        raise place.at("up").refusal(
            f"{shown(up.name)} stands on both axes; a view needs a parameter across and a state variable up"
        )
    if kinds != ["parameter", "state variable"]:
        raise place.at("across").refusal(
            f"a {kinds[0]} ({across.name}) across and a {kinds[1]} ({up.name}) up cannot be drawn; {DRAWN}"
        )
    return View(across, up)


def _kind_of_axis(family: Family, axis: Axis, place: Place) -> str:
    parameters = [parameter.name for parameter in family.parameters]
    states = [state.name for state in family.states]
    if axis.name in parameters:
        return "parameter"
    if axis.name in states:
        return "state variable"
    hint = nearest(axis.name, [*parameters, *states])
    raise place.refusal(
        f"the family '{family.name}' has no parameter or state variable {shown(axis.name)}{hint}"
    )


def checked_set(family: Family, given: Mapping[str, Exact], view: View, place: Place) -> dict[str, Exact]:
    """Return the values given to parameters, sorted by name.

    Raises
    ------
    ConfigRefused
        For a name that is no parameter of the family and for one that runs along an axis.
    """
    names = [parameter.name for parameter in family.parameters]
    for name in given:
        if name in (view.across.name, view.up.name):
            raise place.at(name).refusal(f"{shown(name)} already runs along an axis; remove it here")
        if name not in names:
            hint = nearest(name, names)
            raise place.refusal(f"the family '{family.name}' has no parameter {shown(name)}{hint}")
    return dict(sorted(given.items()))


def checked_starts(
    family: Family, given: Sequence[Mapping[str, Exact]] | None, place: Place
) -> tuple[dict[str, Exact], ...]:
    """Return the states that orbits start from, each complete: what is not given is the family's own start.

    Raises
    ------
    ConfigRefused
        For a name that is no state variable and for a start beyond the escape bound.
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
        starts.append({**own, **start})
    return tuple(starts)
