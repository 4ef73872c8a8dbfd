"""What may be drawn of a view, and the kinds of view that follow from its axes."""

from __future__ import annotations

from dataclasses import dataclass

PARAMETER, STATE, OBSERVABLE = "parameter", "state variable", "observable"

KINDS = {
    "histogram": "an orbit histogram",
    "follow": "a followed attractor",
    "portrait": "a phase portrait",
    "plane": "a parameter plane",
    "basin": "a basin chart",
}
"""What a sentence calls each kind of view."""
DENSITIES = ("histogram", "follow", "portrait")
PLANES = ("plane", "basin")
FOLLOWED = ("up", "down", "both")


@dataclass(frozen=True)
class Draw:
    """One thing that can be drawn: a row of the table :data:`DRAWS`.

    Attributes
    ----------
    name : str
        What a config calls it.
    meaning : str
        What a pixel shows.
    palette : str
        Name of the palette unless another is given.
    palette_kind : {"sequential", "diverging", "cyclic", "categorical"}
        The kind of palette that shows it.
    """

    name: str
    meaning: str
    palette: str
    palette_kind: str


DRAWS = {
    row.name: row
    for row in (
        Draw("density", "how often orbits are in the cell", "blue", "sequential"),
        Draw("fate", "fixed point, cycle, quasi-periodic, chaotic, escapes, extinct", "kinds", "categorical"),
        Draw("period", "least period of the cycle", "kinds", "categorical"),
        Draw("lyapunov", "largest Lyapunov exponent", "balance", "diverging"),
        Draw("lyapunov_2", "second Lyapunov exponent", "balance", "diverging"),
        Draw("rotation", "rotation number", "wheel", "cyclic"),
        Draw("escape", "steps to escape", "blue", "sequential"),
        Draw("attractors", "how many attractors the starts reach", "kinds", "categorical"),
        Draw("basin", "attractor that the start reaches", "kinds", "categorical"),
    )
}
PLANE_DRAWS = tuple(name for name in DRAWS if name not in ("density", "basin"))


def kind_of_view(draw: str, along_parameter: bool, follow: str | None = None) -> str:
    """Return the kind of a view, one of :data:`KINDS`.

    Parameters
    ----------
    draw : str
        What is drawn, one of :data:`DRAWS`.
    along_parameter : bool
        Whether a parameter runs across.
    follow : str, optional
        One of :data:`FOLLOWED` where each column starts from its neighbour's end.

    Examples
    --------
    >>> kind_of_view("fate", True), kind_of_view("density", False)
    ('plane', 'portrait')
    """
    if draw == "basin":
        return "basin"
    if draw in PLANE_DRAWS:
        return "plane"
    if not along_parameter:
        return "portrait"
    return "follow" if follow else "histogram"
