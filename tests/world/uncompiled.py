"""Counts small cases and prints them as JSON: run with and without compilation, it must print the same."""

from __future__ import annotations

import json
import sys
from typing import Any

import numpy as np

from atlas.families.catalogue import family
from atlas.families.map_family import Family
from atlas.orbits.orbit import LANES, OrbitCounter, Rules
from atlas.planes.finder import FateFinder, Region
from atlas.planes.pixels import FateRules
from atlas.planes.turns import rotation
from tiles.number import Exact, exact
from tiles.strip import PER_COLUMN
from tiles.window import View

CASES: dict[str, tuple[str, Any, Any, Rules, tuple[str, ...]]] = {
    "cascade and escapes": ("logistic", ("r", "2.9", "4.2"), ("x", 0, 1), Rules(60, 300, 90, 2, 8), ("0.3",)),
    "slow at 3": ("logistic", ("r", "2.99", "3.01"), ("x", "0.6", "0.7"), Rules(50, 400, 20, 1, 4), ("0.3",)),
    "collapse at 4": ("logistic", ("r", "3", "5"), ("x", 0, 1), Rules(10, 50, 40, 1, 4), ("0.5", "0")),
    "exponential": ("ricker", ("r", "1.8", "3.6"), ("x", 0, "3.8"), Rules(30, 100, 40, 1, 8), ("0.3",)),
    "sine": ("sine", ("r", "0.7", "1.1"), ("x", 0, 1), Rules(30, 100, 40, 1, 8), ("0.3",)),
}
COLUMNS, ROWS = 5, 23
STATES = "two states"
PLANE = "plane"


def counted(case: str, lanes: int = LANES) -> dict[str, Any]:
    """Return everything that a counter says of a case, as plain numbers."""
    name, across, up, rules, starts = CASES[case]
    return _counts(family(name), View(across, up), rules, [{"x": exact(start)} for start in starts], lanes)


def counted_states(lanes: int = LANES) -> dict[str, Any]:
    """Return the same of a map of two variables, of which the second is counted."""
    view, rules = View(("a", "0.2", "2.6"), ("y", "-0.4", "0.4")), Rules(20, 100, 30, 1, 6)
    return _counts(family("henon"), view, rules, [{}], lanes)


def _counts(
    mapped: Family, view: View, rules: Rules, begin: list[dict[str, Exact]], lanes: int
) -> dict[str, Any]:
    counter = OrbitCounter(mapped, view, COLUMNS, ROWS, rules, starts=begin, lanes=lanes)
    result = counter.count(0, COLUMNS)
    columns = {kind: getattr(result.strip, kind).tolist() for kind in PER_COLUMN}
    return {
        "counts": result.strip.counts.tolist(),
        **columns,
        "filled": result.filled,
        "on_repelling": result.on_repelling,
    }


def plane(lanes: int = LANES) -> dict[str, Any]:
    """Return every number that is known of the pixels of a small plane, as text that tells all bits apart."""
    view, rules = View(("a", "0.1", "1.6"), ("b", "0.1", "0.4")), FateRules(40, 64, 100, 6)
    found = FateFinder(family("henon"), view, 5, 3, rules, lanes=lanes).find(Region(0, 5, 0, 3))
    numbers = {
        name: getattr(found, name).reshape(-1)
        for name in ("fate", "period", "exponents", "error", "escape", "x", "turn", "collapsed", "repelling")
    }
    numbers["rotation"] = rotation(found, None)
    return {name: [str(value) for value in values.tolist()] for name, values in numbers.items()}


if __name__ == "__main__":
    with np.errstate(all="ignore"):
        made = {case: counted(case, lanes=2) for case in CASES}
        json.dump({**made, STATES: counted_states(lanes=2), PLANE: plane(lanes=2)}, sys.stdout)
