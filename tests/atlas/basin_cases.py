"""Families and charts that the tests of attractors share."""

from __future__ import annotations

from typing import Any

import numpy as np

from atlas.attractors.basins import Basins, chart_basins
from atlas.families.map_family import Family
from atlas.families.reader import family_from_config
from atlas.orbits.schedule import schedule
from atlas.planes.finder import FateFinder
from atlas.planes.pixels import FateRules
from tiles.number import exact
from tiles.window import View

CUBIC = family_from_config(
    "cubic_pair",
    {
        "state": {"x": {"start": "0.1"}, "y": {"start": "0.1"}},
        "parameters": {"a": {"default": "0.1"}, "b": {"default": "1.5"}},
        "step": {"x": "a + b * x - x**3", "y": "y / 2"},
        "escape": "1e6",
    },
    where="tests",
)
NEWTON = family_from_config(
    "newton_cube_roots",
    {
        "state": {"x": {"start": "1"}, "y": {"start": "0"}},
        "parameters": {"third": {"default": "1/3"}},
        "helpers": {"size": "(x**2 + y**2)**2"},
        "step": {
            "x": "2 * third * x + third * (x**2 - y**2) / size",
            "y": "2 * third * y - third * 2 * x * y / size",
        },
        "escape": "1e30",
    },
    where="tests",
)
RULES = FateRules(500, 800, 20_000, 32)


def finder(
    family: Family,
    across: tuple[Any, ...],
    up: tuple[Any, ...],
    size: tuple[int, int],
    *,
    rules: FateRules = RULES,
    starts: Any = (),
    lanes: int = 64,
    **values: str,
) -> FateFinder:
    """Return a finder of fates with parameters set."""
    given = {name: exact(value) for name, value in values.items()}
    return FateFinder(family, View(across, up), *size, rules, set=given, starts=starts, lanes=lanes)


def chart(found: FateFinder, workers: int = 1, **options: Any) -> Basins:
    """Return the basin chart of a finder's view."""
    with schedule(workers) as opened:
        return chart_basins(found, opened, **options)


def area(basins: Basins, number: int, box: float) -> float:
    """Return the area of a basin in a box of known area."""
    return float(np.mean(basins.classes == number)) * box
