"""The fates of the pixels of a view: a parameter, or the initial value of a state variable, along each
axis."""

from __future__ import annotations

import copy
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.families.map_family import Family
from atlas.orbits.orbit import LANES, Stopped
from atlas.orbits.setting import Setting, hashed
from atlas.orbits.step import StepSource, load_module, step_source
from atlas.planes.pixels import FateRules, Pixels
from atlas.planes.plane_source import plane_source
from atlas.planes.turns import winding_number
from tiles.number import Exact
from tiles.window import View

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Region:
    """A rectangle of pixels: columns ``left … right - 1``, rows ``low … high - 1``, row 0 the lowest."""

    left: int
    right: int
    low: int
    high: int

    @property
    def shape(self) -> tuple[int, int]:
        """Columns and rows."""
        return self.right - self.left, self.high - self.low


class FateFinder:
    """Finds the fates of the pixels of a view.

    Parameters
    ----------
    family : Family
    view : View
        Each axis names a parameter, or a state variable whose initial value runs along it.
    columns, rows : int
        Resolution of the whole view.
    rules : FateRules
    set : mapping of str to Exact, optional
        Parameters that differ from the family's defaults.
    starts : sequence of mappings of str to Exact, optional
        Initial conditions; variables left out start where the family says.
    extinct : mapping of str to Exact, optional
        State variables and the size below which an orbit is extinct; by default the family's.
    lanes : int
        Orbits that advance together; changes nothing but speed.
    """

    def __init__(
        self,
        family: Family,
        view: View,
        columns: int,
        rows: int,
        rules: FateRules,
        *,
        set: Mapping[str, Exact] | None = None,
        starts: Sequence[Mapping[str, Exact]] = (),
        extinct: Mapping[str, Exact] | None = None,
        lanes: int = LANES,
    ) -> None:
        self.family, self.view, self.columns, self.rows = family, view, columns, rows
        self.rules, self.lanes = rules, lanes
        self.setting = Setting(family, set, starts)
        thresholds = dict(family.extinct) if extinct is None else dict(extinct)
        self.low = np.array([float(thresholds.get(name, 0)) for name in family.state_names])

    @cached_property
    def source(self) -> StepSource:
        """The compiled map."""
        return step_source(self.family, self.family.state_names)

    @property
    def winding(self) -> int | None:
        """Number of the periodic state variable whose turns are counted, if there is one."""
        return winding_number(self.source.widths)

    @cached_property
    def module(self) -> ModuleType:
        """The compiled kernels."""
        text = plane_source(
            self.source,
            lanes=self.lanes,
            mortal=np.flatnonzero(self.low).tolist(),
            winding=self.winding,
        )
        return load_module(text)

    def warm(self) -> None:
        """Compile the kernels, so that a later timing or progress bar does not include it."""
        assert self.module
        short = copy.copy(self)
        short.rules = FateRules(0, 64, 0, 1)
        short.find(Region(0, 1, 0, 1))

    def find(self, region: Region, *, start: int = 0, stop: NDArray[np.uint8] | None = None) -> Pixels:
        """Find the fates of the pixels of a region, column by column, each from its lowest row up.

        Parameters
        ----------
        region : Region
        start : int
            Number of the initial condition.
        stop : ndarray of uint8, shape (1,), optional
            When another thread sets it, the work ends early.

        Raises
        ------
        Stopped
            When ``stop`` was set.
        """
        first, varying = self._beginnings(region, start)
        orbits = self.setting.orbits(self.module, self.source, first, self._keys(region, start), varying)
        found = Pixels(
            self.module, self.rules, orbits, self.low, np.zeros(1, np.uint8) if stop is None else stop
        )
        found.run()
        if stop is not None and stop[0]:
            raise Stopped("the work was interrupted")
        return found

    def _beginnings(self, region: Region, start: int) -> tuple[Floats, dict[str, Floats]]:
        columns, rows = region.shape
        across = self.view.across.values(self.columns, 1, region.left, region.right).reshape(-1)
        up = self.view.up.values(self.rows, 1, region.low, region.high).reshape(-1)
        along = {
            self.view.across.name: np.repeat(across, rows),
            self.view.up.name: np.tile(up, columns),
        }
        first = np.repeat(self.setting.starts[start][:, None], columns * rows, axis=1)
        for number, name in enumerate(self.family.state_names):
            if name in along:
                first[number] = along.pop(name)
        return first, along

    def _keys(self, region: Region, start: int) -> NDArray[np.uint64]:
        columns = np.arange(region.left, region.right, dtype=np.uint64)[:, None]
        rows = np.arange(region.low, region.high, dtype=np.uint64)[None, :]
        return hashed(hashed(hashed(columns) ^ rows) ^ np.uint64(start)).reshape(-1)
