"""A family as text for the terminal."""

from __future__ import annotations

import textwrap

from atlas.families.reader import Family, State
from atlas.formula.expression import unparse


def family_text(family: Family) -> str:
    """Return title, formulas, parameters, states, observables, default view, source and note of a family."""
    lines = [f"{family.name}: {family.title}", ""]
    lines += [f"  {line}" for line in family.formula_lines()]
    lines += ["", "parameters"]
    for parameter in family.parameters:
        lines.append(f"  {parameter.name} = {parameter.default}{_words(parameter.label, parameter.unit)}")
    for pattern in family.patterns:
        entries = ", ".join(map(str, pattern.entries))
        lines.append(f"  {pattern.name} = {entries} in turn{_words(pattern.label, pattern.unit)}")
    lines.append("state")
    for state in family.states:
        lines.append(
            f"  {state.name}{_words(state.label, state.unit)}, starts at {state.start}{_kept(state)}"
        )
    if family.observables:
        lines.append("observables")
    for one in family.observables:
        lines.append(f"  {one.name} = {unparse(one.node)}{_words(one.label, one.unit)}")
    lines.append(f"escape\n  beyond {family.escape} in size")
    if family.extinct:
        lines.append("extinct")
        lines += [f"  {name} below {threshold} in size" for name, threshold in family.extinct]
    if family.across and family.up:
        across, up = family.across, family.up
        lines.append("view")
        lines.append(f"  --across {across.name}={across.low}:{across.high} --up {up.name}={up.low}:{up.high}")
    for word, text in (("source", family.source), ("note", family.note)):
        if text:
            lines.append(word)
            lines += textwrap.wrap(text, 98, initial_indent="  ", subsequent_indent="  ")
    return "\n".join(lines)


def _kept(state: State) -> str:
    domain = f", domain {state.domain[0]} to {state.domain[1]}" if state.domain else ""
    return domain + (f", periodic from {state.wrap[0]} to {state.wrap[1]}" if state.wrap else "")


def _words(label: str, unit: str) -> str:
    return (f", {label}" if label else "") + (f" ({unit})" if unit else "")
