"""Planes: exponents against plain iteration, whole planes against NumPy, early exits, threads, memory."""

from __future__ import annotations

import resource
import subprocess
import sys
import tempfile
import time
from functools import partial
from pathlib import Path

import numpy as np

from atlas.families.catalogue import family
from atlas.families.map_family import Family
from atlas.orbits.orbit import OrbitCounter, Rules
from atlas.orbits.orbit_kernels import READY
from atlas.orbits.schedule import schedule
from atlas.planes.finder import FateFinder, Region
from atlas.planes.pixels import FateRules
from atlas.planes.survey import whole_plane
from tests.bench.timing import best_times, report
from tests.bench.twins import CTwin, has_compiler
from tiles.number import Exact, exact
from tiles.window import View

ORBITS, STEPS = 2048, 20_000
WORD = np.zeros(1, np.int64)
FORCED = View(("a", 2, 4), ("b", 2, 4))
RULES = FateRules(1000, 2000, 3000)
WIDE = """
tile_sets:
  wide: {family: forced_logistic, across: [a, 2, 4], up: [b, 2, 4], levels: {across: 7, up: 6},
    pairs: [[7, 6]], transient: 100, steps: 100, transient_limit: 200}
"""


def run() -> None:
    """Print the ratios."""
    _rates()
    _whole_plane()
    _early_exits()
    _threads()


def _rates() -> None:
    """Compare iteration with exponents, and both with C."""
    logistic = View(("r", "3.6", "4"), ("x", 0, 1))
    _exponents("logistic", logistic, {"r": np.linspace(3.6, 4.0, ORBITS)}, [0.3], "0.4 x")
    a, b = np.linspace(1.39, 1.4, ORBITS), np.full(ORBITS, 0.3)
    _exponents("henon", View(("a", 1, "1.4"), ("x", -2, 2)), {"a": a, "b": b}, [0.1, 0.1], "0.2 x")
    if not has_compiler():
        print("  gcc is not there; the C twin cannot be compiled")
        return
    with tempfile.TemporaryDirectory() as folder:
        twin = CTwin(Path(folder))
    counter = OrbitCounter(family("henon"), View(("a", 1, "1.4"), ("x", -2, 2)), 64, 64, Rules())
    c, key, order, outcome = _arrays(counter.module, counter.source, [a, b])
    ours, x, y = np.full((2, ORBITS), 0.1), np.full(ORBITS, 0.1), np.full(ORBITS, 0.1)
    times = best_times(
        {
            "C": lambda: twin.iterate_henon(x, y, a, b, STEPS),
            "ours": lambda: counter.module.advance(ours, c, WORD, key, order, 0, STEPS, 1e6, outcome),
        },
        12,
    )
    rate = ORBITS * STEPS / times["ours"] / 1e9
    got = f"{times['C'] / times['ours']:.2f} x C ({rate:.2f} G/s)"
    report("henon, iterate only, escapes on", "0.8 x", got)


def _arrays(module, source, parameters):  # type: ignore[no-untyped-def]
    c = np.empty((source.rows, ORBITS))
    module.coefficients(np.array(parameters), c)
    return c, np.zeros(ORBITS, np.uint64), np.arange(ORBITS), np.full(ORBITS, READY, np.int8)


def _exponents(
    name: str, view: View, parameters: dict[str, np.ndarray], start: list[float], asked: str
) -> None:
    counter = OrbitCounter(family(name), view, 64, 64, Rules())
    finder = FateFinder(family(name), view, 64, 64, RULES)
    states = len(start)
    given = list(parameters.values())
    c, key, order, outcome = _arrays(counter.module, counter.source, given)
    other = _arrays(finder.module, finder.source, given)[0]
    x, z = (np.repeat(np.array(start)[:, None], ORBITS, axis=1) for _ in range(2))
    vectors, logs = np.ones((3 * states - 3 or 1, ORBITS)), np.zeros((states, ORBITS))
    since, gone, low = np.zeros(ORBITS, np.int64), np.zeros(ORBITS, np.int8), np.zeros(states)

    def measure() -> None:
        for first in range(0, STEPS, STEPS // 16):
            finder.module.measure(
                z, vectors, other, WORD, key, order, first, STEPS // 16, 1e6, low, gone, since, logs
            )

    times = best_times(
        {
            "iterate": lambda: counter.module.advance(x, c, WORD, key, order, 0, STEPS, 1e6, outcome),
            "measure": measure,
        },
        12,
    )
    rate = ORBITS * STEPS / times["measure"] / 1e9
    got = f"{times['iterate'] / times['measure']:.2f} x iterate only ({rate:.2f} G/s)"
    report(f"{name}, {'exponent' if states == 1 else 'two exponents'}", asked, got)


def _whole_plane() -> None:
    """Compare 2000 x 2000 pixels with NumPy on whole arrays, of which a part is timed."""
    finder = FateFinder(family("forced_logistic"), FORCED, 2000, 2000, RULES, starts=_starts())
    finder.warm()

    def ours() -> None:
        with schedule(2) as opened:
            whole_plane(finder, ("fate", "period"), opened)

    ours()
    times = best_times({"ours": ours}, 3)
    theirs = _numpy_plane(2000, 1000, 2000)
    report(
        "forced logistic, 2000 x 2000, 1000 + 2000 steps", "50 x",
        f"{theirs / times['ours']:.0f} x NumPy ({times['ours']:.2f} s; NumPy {theirs:.0f} s from a part)",
    )  # fmt: skip


def _numpy_plane(size: int, transient: int, steps: int, part: int = 12) -> float:
    """Return the time of whole arrays without compaction, from a few steps of each sort."""
    a, b = np.meshgrid(np.linspace(2, 4, size), np.linspace(2, 4, size))
    x = np.full_like(a, 0.5)
    begin = time.perf_counter()
    for n in range(part):
        x = (a if n % 2 == 0 else b) * x * (1 - x)
    each = (time.perf_counter() - begin) / part
    reference, period, growth = x.copy(), np.zeros(x.shape, np.int64), np.zeros_like(x)
    begin = time.perf_counter()
    for n in range(part):
        r = a if n % 2 == 0 else b
        growth += np.log(np.abs(r * (1 - 2 * x)) + 1e-300)
        x = r * x * (1 - x)
        back = (np.abs(x - reference) < 1e-6) & (period == 0)
        period[back] = n + 1
    measured = (time.perf_counter() - begin) / part
    return transient * each + steps * measured


def _starts() -> list[dict[str, Exact]]:
    return [{"x": exact("0.5")}]


def _early_exits() -> None:
    """Compare pixels that meet a cycle with pixels that never do."""
    region = Region(0, 64, 0, 256)
    windows = {
        "periodic": View(("a", "2.5", "2.6"), ("b", "3.1", "3.2")),
        "chaotic": View(("a", "3.9", 4), ("b", "3.9", 4)),
    }
    finders = {
        name: FateFinder(family("forced_logistic"), view, 1000, 1000, RULES, starts=_starts())
        for name, view in windows.items()
    }
    for finder in finders.values():
        finder.find(region)
    times = best_times({name: partial(finder.find, region) for name, finder in finders.items()}, 12)
    pixels = region.shape[0] * region.shape[1]
    report(
        "chaotic pixels against periodic ones", "5 x",
        f"{times['chaotic'] / times['periodic']:.1f} x ({times['periodic'] / pixels * 1e6:.2f} us a pixel)",
    )  # fmt: skip


def _threads() -> None:
    """Compare two threads with one."""
    chosen: list[tuple[str, Family, View]] = [
        ("forced logistic", family("forced_logistic"), FORCED),
        ("henon", family("henon"), View(("a", 1, "1.4"), ("b", "0.1", "0.3"))),
    ]
    for name, one, view in chosen:
        finder = FateFinder(one, view, 1000, 1000, RULES)
        finder.warm()

        def plane(workers: int, finder: FateFinder = finder) -> None:
            with schedule(workers) as opened:
                whole_plane(finder, ("fate", "period"), opened)

        plane(1)
        times = best_times({"1": partial(plane, 1), "2": partial(plane, 2)}, 5)
        report(f"{name} plane, two threads", "1.8 x", f"{times['1'] / times['2']:.2f} x one")


def memory() -> None:
    """Print the peak memory of a set of 32768 x 16384 pixels, 100 + 100 steps, written tile by tile."""
    with tempfile.TemporaryDirectory() as folder:
        config = Path(folder) / "wide.yaml"
        config.write_text(WIDE)
        script = "import sys, atlas; atlas.render(sys.argv[1], sys.argv[2], memory='1GiB')"
        begin = time.perf_counter()
        subprocess.run([sys.executable, "-c", script, str(config), str(Path(folder) / "out")], check=True)
        seconds = time.perf_counter() - begin
    peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024
    report(
        "32768 x 16384 pixels, 100 + 100 steps, index and site",
        "1024 MiB",
        f"{peak:.0f} MiB, {seconds:.0f} s",
    )
