"""Counts small cases and prints them as JSON: run with and without compilation, it must print the same."""

from __future__ import annotations

import json
import sys
from typing import Any

import numpy as np

from atlas.families.catalogue import family
from atlas.orbits.orbit import LANES, OrbitCounter, Rules
from tiles.number import exact
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


def counted(case: str, lanes: int = LANES) -> dict[str, Any]:
    """Return everything that a counter says of a case, as plain numbers."""
    name, across, up, rules, starts = CASES[case]
    begin = [{"x": exact(start)} for start in starts]
    counter = OrbitCounter(family(name), View(across, up), COLUMNS, ROWS, rules, starts=begin, lanes=lanes)
    result = counter.count(0, COLUMNS)
    columns = {kind: getattr(result.strip, kind).tolist() for kind in PER_COLUMN}
    return {
        "counts": result.strip.counts.tolist(),
        **columns,
        "filled": result.filled,
        "on_repelling": result.on_repelling,
    }


if __name__ == "__main__":
    with np.errstate(all="ignore"):
        json.dump({case: counted(case, lanes=2) for case in CASES}, sys.stdout)
