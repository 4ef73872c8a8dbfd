"""The C twin, compiled when gcc is there, and the plain NumPy script that users write today."""

from __future__ import annotations

import ctypes
import shutil
import subprocess
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

SOURCE = Path(__file__).with_name("twin.c")


def pointer(array: NDArray[Any]) -> ctypes.c_void_p:
    """Return the address of an array's data."""
    return array.ctypes.data_as(ctypes.c_void_p)


class CTwin:
    """The functions of twin.c; ``fast`` adds -ffast-math and the vector math library."""

    def __init__(self, folder: Path, *, fast: bool = False) -> None:
        library = folder / ("fast.so" if fast else "plain.so")
        flags = ["-ffast-math"] if fast else []
        libraries = ["-lmvec", "-lm"] if fast else ["-lm"]
        command = ["gcc", "-O3", "-march=native", *flags, "-shared", "-fPIC", str(SOURCE), "-o", str(library)]
        subprocess.run([*command, *libraries], check=True)
        self._library = ctypes.CDLL(str(library))

    def iterate(self, family: str, x: NDArray[np.float64], r: NDArray[np.float64], steps: int) -> None:
        """Advance orbits in full groups of 32."""
        function = getattr(self._library, f"iterate_{family}")
        function(pointer(x), pointer(r), ctypes.c_long(x.size // 32), ctypes.c_long(steps))

    def iterate_henon(
        self, x: NDArray[np.float64], y: NDArray[np.float64], a: NDArray[np.float64],
        b: NDArray[np.float64], steps: int,
    ) -> None:  # fmt: skip
        """Advance orbits of the Henon map in full groups of 32."""
        arrays = map(pointer, (x, y, a, b))
        self._library.iterate_henon(*arrays, ctypes.c_long(x.size // 32), ctypes.c_long(steps))

    def count(
        self, x: NDArray[np.float64], r: NDArray[np.float64], transient: int, samples: int,
        counts: NDArray[np.uint32],
    ) -> None:  # fmt: skip
        """Count 32 orbits a column on the interval from 0 to 1."""
        columns, stride = counts.shape
        self._library.count_logistic(
            pointer(x), pointer(r), ctypes.c_long(columns), ctypes.c_long(transient), ctypes.c_long(samples),
            ctypes.c_double(0.0), ctypes.c_double(stride - 2.0), ctypes.c_long(stride - 2), pointer(counts),
        )  # fmt: skip


def has_compiler() -> bool:
    """Return whether gcc is there."""
    return shutil.which("gcc") is not None


def numpy_sweep(low: float, high: float, columns: int, rows: int, samples: int) -> NDArray[np.int64]:
    """Count as users do today: one parameter a column, whole arrays, ``np.add.at``."""
    r = np.linspace(low, high, columns)
    x = np.full(columns, 0.3)
    counts = np.zeros((rows, columns), np.int64)
    at = np.arange(columns)
    for _ in range(200):
        x = r * x * (1 - x)
    for _ in range(samples):
        x = r * x * (1 - x)
        row = (x * rows).astype(np.int64)
        inside = (row >= 0) & (row < rows)
        np.add.at(counts, (row[inside], at[inside]), 1)
    return counts


def numpy_picture(counts: NDArray[np.int64], path: Path, width: int, height: int, dpi: int) -> None:
    """Draw counts as users do today: ``imshow`` and ``savefig``."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(width / dpi, height / dpi), dpi=dpi)
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    axes.imshow(np.log1p(counts), origin="lower", aspect="auto", extent=(3.6, 4, 0, 1), cmap="Blues")
    figure.savefig(path)
