"""Points sorted by tile column on disk, so that a tile set is counted strip by strip in bounded memory."""

from __future__ import annotations

import tempfile
import threading
from collections.abc import Iterator
from pathlib import Path
from types import TracebackType
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from atlas.points.cells import Codes
from atlas.points.counting import StripCounter
from tiles.grid import TILE
from tiles.store import written
from tiles.strip import Strip

_SHIFT = 32


class Spool:
    """A nameless file of placed points, 8 bytes each, that vanishes with the process; a context manager.

    Every chunk of points is sorted and stored in one piece; a tile column is one segment of each piece.

    Parameters
    ----------
    folder : Path
        On the disk that takes the file; it must be there.
    columns, rows : int
        Cells of the whole view.
    """

    def __init__(self, folder: Path, columns: int, rows: int) -> None:
        self.folder, self.rows = folder, rows
        self._bounds = np.arange(0, columns + TILE, TILE, dtype=np.int64) << _SHIFT
        self._cuts: list[NDArray[np.int64]] = []
        self._size = 0
        self._turn = threading.Lock()
        with written(folder):
            self._file: Any = tempfile.TemporaryFile(dir=folder)  # noqa: SIM115 - closed by __exit__

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._file.close()

    def add(self, columns: Codes, codes: Codes) -> None:
        """Store points; parameters as for `StripCounter.add`, columns counted from 0."""
        keys = np.sort(columns << _SHIFT | codes)
        with written(self.folder):
            self._file.write(keys.data)
        self._cuts.append(self._size + np.searchsorted(keys, self._bounds))
        self._size += keys.size

    def source(self, first: int, last: int) -> Strip:
        """Return the strip of columns ``first … last - 1``; called in worker threads."""
        counter = StripCounter(first, last - first, self.rows)
        for tile_column in range(first // TILE, -(-last // TILE)):
            for keys in self._segments(tile_column):
                low, high = np.searchsorted(keys, np.array([first, last]) << _SHIFT)
                part = keys[low:high]
                counter.add((part >> _SHIFT) - first, part & ((1 << _SHIFT) - 1))
        return counter.strip()

    def _segments(self, tile_column: int) -> Iterator[NDArray[np.int64]]:
        for cuts in self._cuts:
            begin, end = cuts[tile_column : tile_column + 2].tolist()
            if end > begin:
                with self._turn, written(self.folder):
                    self._file.seek(8 * begin)
                    data = self._file.read(8 * (end - begin))
                yield np.frombuffer(data, np.int64)
