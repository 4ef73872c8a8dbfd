"""Index and site against the bare compression and encoding of the same tiles, and the peak of memory."""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np

from tests.bench.timing import report
from tiles import png
from tiles.codec import encode
from tiles.grid import TILE, Address
from tiles.index import Index
from tiles.shading import colour_table
from tiles.site import Shades

MAKE = """
import json, resource, sys, threading, time
from pathlib import Path
from atlas.config.load import parse_config
from atlas.orbits.schedule import schedule
from atlas.output.reporter import Silence
from atlas.output.tiled import Places
from atlas.output.tileset import StripSource, make_tile_set
settings, out, index_only = json.loads(sys.argv[1]), Path(sys.argv[2]), sys.argv[3] == "index"
peak, ended = [0], threading.Event()
def watch():
    while not ended.wait(0.05):
        for line in open("/proc/self/smaps_rollup"):
            if line.startswith("Pss:"):
                peak[0] = max(peak[0], int(line.split()[1]) * 1024)
thread = threading.Thread(target=watch); thread.start()
job = parse_config({"tile_sets": {"set": settings}}).tile_sets["set"]
counting, count = [], StripSource.__call__
def counted(source, first, last):
    begin = time.perf_counter(), time.thread_time()
    strip = count(source, first, last)
    counting.append((time.perf_counter() - begin[0], time.thread_time() - begin[1]))
    return strip
class Clock(Silence):
    def begin(self, name, what, total):
        if what == "counting":
            self.begun = time.perf_counter(), time.process_time()
clock = Clock()
StripSource.__call__ = counted
if index_only:
    import atlas.output.tileset as tileset
    tileset.make_site = lambda index, site, *given: site.mkdir(parents=True)
with schedule(2) as opened:
    make_tile_set(job, Places.of(out, "set"), opened, clock)
seconds, cpu = time.perf_counter() - clock.begun[0], time.process_time() - clock.begun[1]
ended.set(); thread.join()
wall, busy = (sum(each) for each in zip(*counting))
print(json.dumps({"seconds": seconds, "cpu": cpu, "counting": wall / 2, "busy": busy, "peak": peak[0]}))
"""


def run(levels: int = 6) -> None:
    """Print the ratio and the peaks."""
    whole = {"family": "logistic", "across": ["r", "2.8", "4"], "up": ["x", "0", "1"], "levels": str(levels)}
    with tempfile.TemporaryDirectory() as folder:
        out = Path(folder)
        made = _make(whole, out, "all")
        bare, busy, tiles = _bare(out / "set" / "index.sqlite")
        ratio = (made["seconds"] - made["counting"]) / bare
        processor = (made["cpu"] - made["busy"]) / busy
        what = f"tile set levels 0-{levels}: index plus site, without counting"
        report(what, "2 x", f"{ratio:.2f} x bare encoding ({processor:.2f} x in processor time)")
        with_counting = f"{made['seconds'] / bare:.2f} x ({made['cpu'] / busy:.2f} x)"
        report("the same with the counting of its orbits", "2 x", with_counting)
        what = f"its peak memory ({tiles} tiles, {made['seconds']:.0f} s)"
        report(what, "1 GiB", f"{made['peak'] / 2**20:.0f} MiB")
    deeper = {"across": str(levels - 2), "up": str(levels + 2)}
    narrow = {**whole, "across": ["r", "3.6", "3.675"], "levels": deeper}
    with tempfile.TemporaryDirectory() as folder:
        made = _make(narrow, Path(folder), "index")
        what = "a 1/16-width strip two levels deeper, index alone: peak"
        report(what, "1 GiB", f"{made['peak'] / 2**20:.0f} MiB")


def _make(settings: dict[str, object], out: Path, what: str) -> dict[str, float]:
    done = subprocess.run(
        [sys.executable, "-c", MAKE, json.dumps(settings), str(out), what],
        check=True,
        stdout=subprocess.PIPE,
        text=True,
    )
    found: dict[str, float] = json.loads(done.stdout)
    return found


def _bare(path: Path) -> tuple[float, float, int]:
    """Compress and encode every stored tile again, on two threads, and nothing else."""
    table = colour_table("blue")
    seconds, busy, tiles = 0.0, 0.0, 0
    with Index.open(path) as index, ThreadPoolExecutor(2) as pool:
        fit = index.fit("equalised")
        assert fit is not None
        for pair in index.pairs:
            shades = Shades(fit, index.view.up.cell_size(TILE << pair[1]))
            for column in index.present(pair):
                work = [
                    (counts, np.ascontiguousarray(shades.lines(index, Address(*pair, column, row))))
                    for row, counts in index.tiles_of_column(pair, column)
                ]
                begin, used = time.perf_counter(), time.process_time()
                list(pool.map(lambda one: (encode(one[0]), png.encode(one[1], table)), work))
                seconds += time.perf_counter() - begin
                busy += time.process_time() - used
                tiles += len(work)
    return seconds, busy, tiles
