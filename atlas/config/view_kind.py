"""Which views of a family can be drawn, and what can be drawn of each."""

from __future__ import annotations

from atlas.config.draws import DRAWS, OBSERVABLE, PARAMETER, PLANE_DRAWS, STATE
from atlas.families.reader import Family
from atlas.reading.place import Place, shown
from tiles.errors import nearest
from tiles.palette import PALETTES
from tiles.window import Axis, View

ALLOWED = (
    "allowed are a parameter across with a state variable or observable up, two parameters, "
    "and two state variables or observables"
)


def drawn_view(family: Family, across: Axis, up: Axis, place: Place) -> View:
    """Return the view of two axes, if it is of a kind that can be drawn.

    Parameters
    ----------
    family : Family
        Whose parameters, state variables and observables the axes name.
    across, up : Axis
        The axes.
    place : Place
        Where the keys ``across`` and ``up`` stand.

    Raises
    ------
    ConfigRefused
        When an axis names nothing that the family has, or a pattern; when both name the same; when a state
        variable lies across and a parameter up; and when the axis of a periodic state variable is
        logarithmic or longer than its period.
    """
    kinds = [kind_of_axis(family, axis, place.at(key)) for key, axis in (("across", across), ("up", up))]
    if across.name == up.name:
        raise place.at("up").refusal(f"{shown(up.name)} stands on both axes; {ALLOWED}")
    if kinds[1] == PARAMETER and kinds[0] != PARAMETER:
        raise place.at("across").refusal(
            f"{_one(kinds[0])} ({across.name}) across and a parameter ({up.name}) up cannot be drawn; "
            "swap the axes"
        )
    for key, axis in (("across", across), ("up", up)):
        _check_period(family, axis, place.at(key))
    return View(across, up)


def kind_of_axis(family: Family, axis: Axis, place: Place) -> str:
    """Return what an axis names: a parameter, a state variable or an observable.

    Raises
    ------
    ConfigRefused
        When it names a pattern, or nothing that the family has.
    """
    if axis.name in family.parameter_names:
        return PARAMETER
    if axis.name in family.state_names:
        return STATE
    if axis.name in family.observable_names:
        return OBSERVABLE
    for pattern in family.patterns:
        if axis.name == pattern.name:
            letters = dict.fromkeys(entry for entry in pattern.entries if isinstance(entry, str))
            remedy = (
                f"name one of its letters: {', '.join(letters)}" if letters else "it has no letters to name"
            )
            raise place.refusal(f"{shown(axis.name)} is a pattern in time, which cannot be an axis; {remedy}")
    hint = nearest(axis.name, [*family.parameter_names, *family.state_names, *family.observable_names])
    kinds = "parameter, state variable or observable" if family.observables else "parameter or state variable"
    raise place.refusal(f"the family '{family.name}' has no {kinds} {shown(axis.name)}{hint}")


def _check_period(family: Family, axis: Axis, place: Place) -> None:
    for state in family.states:
        if state.name != axis.name or state.wrap is None:
            continue
        low, high = state.wrap
        if axis.scale == "log":
            raise place.refusal(
                f"{shown(axis.name)} is wrapped to {low} to {high} and cannot have a log axis; write linear"
            )
        if axis.low < low or high < axis.high:
            raise place.refusal(
                f"{axis.low} to {axis.high} reaches beyond {low} to {high}, to which {shown(axis.name)} is "
                "wrapped; stay inside"
            )


def draws_of(family: Family, view: View) -> tuple[str, ...]:
    """Return what can be drawn of a view, the default first."""
    if view.up.name in family.parameter_names:
        return tuple(draw for draw in PLANE_DRAWS if _lacking(family, draw) is None)
    two_states = {view.across.name, view.up.name} <= set(family.state_names)
    return ("density", "basin") if two_states else ("density",)


def checked_draw(family: Family, view: View, given: str | None, place: Place) -> str:
    """Return what is drawn of a view: as given, else the default for its axes.

    Raises
    ------
    ConfigRefused
        When the axes or the family do not allow it, with what they allow.
    """
    allowed = draws_of(family, view)
    if given is None:
        return allowed[0]
    if given in allowed:
        return given
    hint = f"allowed: {', '.join(allowed)}"
    needed = _lacking(family, given)
    if needed is not None and view.up.name in family.parameter_names:
        raise place.refusal(f"{shown(given)} needs {needed}, which the family '{family.name}' lacks; {hint}")
    across, up = (kind_of_axis(family, axis, place) for axis in (view.across, view.up))
    raise place.refusal(
        f"{shown(given)} cannot be drawn of {_one(across)} ({view.across.name}) across and {_one(up)} "
        f"({view.up.name}) up; {hint}"
    )


def _lacking(family: Family, draw: str) -> str | None:
    """Return what a family needs and lacks for something to be drawn of two parameters, or None."""
    states = len(family.states)
    if draw == "lyapunov_2" and states < 2:
        return "two state variables"
    if draw == "rotation" and states != 2 and not any(state.wrap for state in family.states):
        return "a state variable with wrap, or two state variables"
    return None


def checked_palette(draw: str, given: str | None, explicit: bool, place: Place) -> str:
    """Return the palette of what is drawn: as given, else the one that fits.

    Parameters
    ----------
    draw : str
        One of `atlas.config.draws.DRAWS`.
    given : str or None
        A name of `tiles.palette.PALETTES`.
    explicit : bool
        Whether it was given for this output; a common default that does not fit is passed over.
    place : Place
        Where the key stands.

    Raises
    ------
    ConfigRefused
        When a palette given for this output does not fit, with those that do.
    """
    row = DRAWS[draw]
    if given is None or PALETTES[given].kind != row.palette_kind:
        if given is not None and explicit:
            fitting = ", ".join(name for name, one in PALETTES.items() if one.kind == row.palette_kind)
            raise place.refusal(
                f"{shown(given)} is a {PALETTES[given].kind} palette and {draw} needs a {row.palette_kind} "
                f"one; allowed: {fitting}"
            )
        return row.palette
    return given


def _one(kind: str) -> str:
    return f"an {kind}" if kind == OBSERVABLE else f"a {kind}"
