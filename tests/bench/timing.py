"""Best times of functions that are run in turn, so that a noisy machine disturbs them alike."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping


def best_times(functions: Mapping[str, Callable[[], object]], rounds: int) -> dict[str, float]:
    """Return the least wall time of each function over some rounds, in seconds."""
    best = dict.fromkeys(functions, float("inf"))
    for _ in range(rounds):
        for name, function in functions.items():
            begin = time.perf_counter()
            function()
            best[name] = min(best[name], time.perf_counter() - begin)
    return best


def report(what: str, asked: str, got: str) -> None:
    """Print one line of the result."""
    print(f"  {what:<58} asked {asked:<10} got {got}", flush=True)
