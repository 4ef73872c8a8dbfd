"""The kernels against hand-written C, one thread."""

from __future__ import annotations

import tempfile
from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np

from atlas.families.catalogue import family
from atlas.orbits.histogram import block_width
from atlas.orbits.orbit import OrbitCounter, Rules
from atlas.orbits.orbit_kernels import READY
from tests.bench.timing import best_times, report
from tests.bench.twins import CTwin, has_compiler
from tiles.window import View

ROWS, COLUMNS, TRANSIENT, SAMPLES = 2300, 256, 1000, 2200
ORBITS = 2048
WORD = np.zeros(1, np.int64)


def run() -> None:
    """Print the ratios; without gcc, say so."""
    if not has_compiler():
        print("  gcc is not there; the C twin cannot be compiled")
        return
    with tempfile.TemporaryDirectory() as folder:
        plain, fast = CTwin(Path(folder)), CTwin(Path(folder), fast=True)
    _iterate("logistic", plain, 20_000, 3.6, 4.0, "0.8 x")
    _iterate("ricker", fast, 2_000, 2.6, 3.6, "1.0 x")
    _count(plain)


def _iterate(name: str, twin: CTwin, steps: int, low: float, high: float, asked: str) -> None:
    chosen = family(name)
    assert chosen.across is not None
    assert chosen.up is not None
    counter = OrbitCounter(chosen, View(chosen.across, chosen.up), 64, ROWS, Rules())
    r = np.linspace(low, high, ORBITS)
    ours, theirs = np.full((1, ORBITS), 0.3), np.full(ORBITS, 0.3)
    c, key, order = r[None, :].copy(), np.zeros(ORBITS, np.uint64), np.arange(ORBITS)
    outcome = np.full(ORBITS, READY, np.int8)
    kernels = counter.module
    times = best_times(
        {
            "C": lambda: twin.iterate(name, theirs, r, steps),
            "ours": lambda: kernels.advance(ours, c, WORD, key, order, 0, steps, 1e6, outcome),
        },
        12,
    )
    rate = ORBITS * steps / times["ours"] / 1e9
    ratio = times["C"] / times["ours"]
    report(f"{name}, iterate only, escapes on", asked, f"{ratio:.2f} x C ({rate:.2f} G/s)")


def _count(twin: CTwin) -> None:
    view = View(("r", "3.6", "4"), ("x", 0, 1))
    rules = Rules(TRANSIENT, 1_000_000, SAMPLES, 32)
    counters = {
        "ours": OrbitCounter(family("logistic"), view, COLUMNS, ROWS, replace(rules, repeats=False)),
        "ours, repeats on": OrbitCounter(family("logistic"), view, COLUMNS, ROWS, rules),
    }
    r = view.across.values(COLUMNS, 32).reshape(-1)
    x, counts = np.empty_like(r), np.zeros((COLUMNS, ROWS + 2), np.uint32)
    out = np.empty((COLUMNS, ROWS), np.uint32)
    filled = [0]

    def c() -> None:
        x[:] = 0.3
        counts[:] = 0
        twin.count(x, r, TRANSIENT, SAMPLES, counts)

    def ours(counter: OrbitCounter) -> None:
        width = block_width(counter)
        filled[0] = 0
        for first in range(0, COLUMNS, width):
            last = min(first + width, COLUMNS)
            filled[0] += counter.count(first, last, out=out[first:last]).filled

    for counter in counters.values():
        counter.warm()
    times = best_times({"C": c, **{name: partial(ours, one) for name, one in counters.items()}}, 12)
    total = r.size * SAMPLES
    report(
        "logistic, iterate + histogram, 32 values a column, no repeats", "1.0 x",
        f"{times['C'] / times['ours']:.2f} x C ({total / times['ours'] / 1e9:.2f} G samples/s)",
    )  # fmt: skip
    report(
        "the same with repeats on", "-",
        f"{times['C'] / times['ours, repeats on']:.2f} x C, {filled[0] / total:.1%} of the samples filled",
    )  # fmt: skip
