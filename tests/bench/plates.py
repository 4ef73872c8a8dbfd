"""A whole plate against the NumPy script that users write today, and one thread against two."""

from __future__ import annotations

import io
import tempfile
import time
from pathlib import Path

import numpy as np
from PIL import Image

from atlas.config.load import plate_from_parts
from atlas.orbits.histogram import Histogram, count_histogram
from atlas.orbits.schedule import schedule
from atlas.output.printing import Sheet, make_sheet, sheet_of
from atlas.output.reporter import Silence
from tests.bench.timing import best_times, report
from tests.bench.twins import numpy_picture, numpy_sweep

TOTAL = 300_000_000
FEW = 400


def run() -> None:
    """Print the ratios."""
    plate = plate_from_parts(
        "logistic", ("r", "3.6", "4"), ("x", "0", "1"), size="180x110", dpi=600, formats=["png"]
    )
    columns, rows = sheet_of(plate).views[0].columns, sheet_of(plate).views[0].rows
    plate = plate_from_parts(
        "logistic", ("r", "3.6", "4"), ("x", "0", "1"),
        size="180x110", dpi=600, formats=["png"], samples=TOTAL // (plate.values_per_column * columns),
    )  # fmt: skip
    sheet = sheet_of(plate)
    with tempfile.TemporaryDirectory() as folder:
        out = Path(folder)
        counting = _counting(sheet)
        whole, drawing = _whole(sheet, out, counting[2])
        numpy_counting, numpy_whole = _numpy(columns, rows, out)
        pillow = _pillow(out / "plate.png")
    ratio = numpy_counting / counting[2]
    report("plate of 4252 x 2598 px, 3e8 samples: counting", "100 x", f"{ratio:.0f} x NumPy")
    report("the whole plate", "20 x", f"{numpy_whole / whole:.0f} x NumPy ({whole:.2f} s)")
    report("the stage after counting", "1.5 x", f"{drawing / pillow:.2f} x Pillow's 24-bit level-6 encode")
    report("two threads against one, counting", "1.8 x", f"{counting[1] / counting[2]:.2f} x")


def _counting(sheet: Sheet) -> dict[int, float]:
    view = sheet.views[0]
    counter = view.counter()

    def count(workers: int) -> Histogram:
        with schedule(workers) as opened:
            return count_histogram(counter, opened)

    count(2)
    times = best_times({"1": lambda: count(1), "2": lambda: count(2)}, 6)
    return {1: times["1"], 2: times["2"]}


def _whole(sheet: Sheet, out: Path, counting: float) -> tuple[float, float]:
    files = sheet.files(out)

    def make() -> None:
        with schedule(2) as opened:
            make_sheet(sheet, files, opened, Silence())

    make()
    whole = best_times({"ours": make}, 4)["ours"]
    return whole, whole - counting


def _numpy(columns: int, rows: int, out: Path) -> tuple[float, float]:
    begin = time.perf_counter()
    counts = numpy_sweep(3.6, 4.0, columns, rows, FEW)
    counting = (time.perf_counter() - begin) * TOTAL / (FEW * columns)
    begin = time.perf_counter()
    numpy_picture(counts, out / "numpy.png", 4252, 2598, 600)
    return counting, counting + time.perf_counter() - begin


def _pillow(path: Path) -> float:
    picture = Image.fromarray(np.asarray(Image.open(path).convert("RGB")))
    return best_times({"pillow": lambda: picture.save(io.BytesIO(), "PNG", compress_level=6)}, 3)["pillow"]
