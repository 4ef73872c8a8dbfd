"""A family as text for the terminal."""

from __future__ import annotations

import textwrap

from atlas.families.reader import Family


def family_text(family: Family) -> str:
    """Return title, formulas, parameters, states, default view, source and note of a family."""
    lines = [f"{family.name}: {family.title}", ""]
    lines += [f"  {line}" for line in family.formula_lines()]
    lines += ["", "parameters"]
    for parameter in family.parameters:
        lines.append(f"  {parameter.name} = {parameter.default}{_words(parameter.label, parameter.unit)}")
    lines.append("state")
    for state in family.states:
        domain = f", domain {state.domain[0]} to {state.domain[1]}" if state.domain else ""
        lines.append(f"  {state.name}{_words(state.label, state.unit)}, starts at {state.start}{domain}")
    lines.append(f"escape\n  beyond {family.escape} in size")
    if family.across and family.up:
        across, up = family.across, family.up
        lines.append("view")
        lines.append(f"  --across {across.name}={across.low}:{across.high} --up {up.name}={up.low}:{up.high}")
    for word, text in (("source", family.source), ("note", family.note)):
        if text:
            lines.append(word)
            lines += textwrap.wrap(text, 98, initial_indent="  ", subsequent_indent="  ")
    return "\n".join(lines)


def _words(label: str, unit: str) -> str:
    return (f", {label}" if label else "") + (f" ({unit})" if unit else "")
