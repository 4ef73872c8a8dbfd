"""Rows of the catalogue by the kind of their default view."""

from __future__ import annotations

from atlas.families.catalogue import NAMES, family

WITHOUT_ATTRACTOR = ("nicholson_bailey",)
"""Families whose orbits all leave whatever the parameters: after a transient their view is empty."""


def bifurcation_rows() -> tuple[str, ...]:
    """Return the families whose default view has a parameter across and a state variable up."""
    return tuple(name for name in NAMES if _axes(name) == ("parameter", "state"))


def drawn_rows() -> tuple[str, ...]:
    """Return those of :func:`bifurcation_rows` that are drawn and whose picture shows an attractor."""
    return tuple(
        name for name in bifurcation_rows() if name not in WITHOUT_ATTRACTOR and len(family(name).states) == 1
    )


def _axes(name: str) -> tuple[str, ...]:
    own = family(name)
    kinds = dict.fromkeys(own.parameter_names, "parameter") | dict.fromkeys(own.state_names, "state")
    return tuple(kinds[axis.name] for axis in (own.across, own.up) if axis)
