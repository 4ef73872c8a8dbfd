"""Orbit histograms: the orbits of every column, run and counted; `atlas.orbits.block` decides about each."""

from __future__ import annotations

import copy
import threading
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.families.reader import Family
from atlas.orbits.block import Block, CountedAxis, Orbits
from atlas.orbits.block import Rules as Rules
from atlas.orbits.kernel_source import kernel_source
from atlas.orbits.orbit_kernels import GONE, SLOW
from atlas.orbits.setting import Setting, counted_axis, hashed
from atlas.orbits.step import StepSource, load_module, step_source
from tiles.errors import Failure, TooLarge
from tiles.number import Exact
from tiles.strip import Strip
from tiles.window import View

LANES = 64
MOST_VALUES_KEPT = 1 << 20
MOST_CELLS = (1 << 31) - 1


class Stopped(Failure):
    """Another thread asked the counting to end; there is no result."""


@dataclass(frozen=True)
class Counted:
    """A strip of counted columns, and how it came about.

    Attributes
    ----------
    strip : Strip
    filled : int
        Samples that exact repeats filled without running them.
    on_repelling : int
        Orbits whose start was put exactly on a repelling cycle; counted there, not disturbed.
    """

    strip: Strip
    filled: int
    on_repelling: int


class OrbitCounter:
    """Counts the orbits of a family over a view of one parameter across and one state variable up.

    Parameters
    ----------
    family : Family
    view : View
        ``across`` names a parameter, ``up`` a state variable.
    columns, rows : int
        Resolution of the whole view.
    rules : Rules
    set : mapping of str to Exact, optional
        Parameters that differ from the family's defaults.
    starts : sequence of mappings of str to Exact, optional
        Initial conditions; variables left out start where the family says.
    lanes : int
        Orbits that advance together; changes nothing but speed.
    """

    def __init__(
        self,
        family: Family,
        view: View,
        columns: int,
        rows: int,
        rules: Rules,
        *,
        set: Mapping[str, Exact] | None = None,
        starts: Sequence[Mapping[str, Exact]] = (),
        lanes: int = LANES,
    ) -> None:
        self.family = family
        self.view = view
        self.columns = columns
        self.rows = rows
        self.rules = rules
        self.lanes = lanes
        self.setting = Setting(family, set, starts)
        self._local = threading.local()

    @property
    def starts(self) -> NDArray[np.float64]:
        """Initial conditions, shape (starts, states)."""
        return self.setting.starts

    @property
    def orbits_per_column(self) -> int:
        """Parameter values times starts."""
        return self.rules.values_per_column * len(self.starts)

    @property
    def exposure(self) -> int:
        """Samples that every column receives."""
        return self.orbits_per_column * self.rules.samples

    @cached_property
    def module(self) -> ModuleType:
        """The compiled kernels of the family for this view."""
        text = kernel_source(
            self.source, [self.view.up.scale == "log"], lanes=self.lanes, every=self.rules.every
        )
        return load_module(text)

    @cached_property
    def window(self) -> CountedAxis:
        """The cells of ``up`` as kernels take them."""
        return counted_axis(self.view.up, self.rows)

    def at(self, columns: int, rows: int, rules: Rules) -> OrbitCounter:
        """Return a counter of the same orbits at another resolution and under other rules."""
        other = copy.copy(self)
        for cached in ("window", "_all_values"):
            other.__dict__.pop(cached, None)
        other.columns, other.rows, other.rules = columns, rows, rules
        other._local = threading.local()
        return other

    def with_samples(self, samples: int) -> OrbitCounter:
        """Return a counter that counts another number of states of each orbit."""
        return self.at(self.columns, self.rows, replace(self.rules, samples=samples))

    def warm(self) -> None:
        """Compile the kernels, so that a later timing or progress bar does not include it."""
        few_rules = Rules(0, 0, 1, 1, every=self.rules.every)
        few = OrbitCounter(self.family, self.view, self.columns, self.rows, few_rules, lanes=self.lanes)
        few.__dict__["module"] = self.module
        counts = np.zeros(2 * (self.rows + 2), np.uint32)
        block = few._run(0, 1, counts, np.zeros(1, np.uint8))
        block.sample(np.zeros(1, np.int64))

    def count(
        self,
        first: int,
        last: int,
        *,
        out: NDArray[np.uint32] | None = None,
        stop: NDArray[np.uint8] | None = None,
    ) -> Counted:
        """Count the columns ``first … last - 1``.

        Parameters
        ----------
        first, last : int
            Range of columns of the view.
        out : ndarray of uint32, shape (last - first, rows), optional
            Where the counts are written; a new array without it.
        stop : ndarray of uint8, shape (1,), optional
            When another thread sets it, the work ends early.

        Returns
        -------
        Counted

        Raises
        ------
        Stopped
            When ``stop`` was set.
        """
        width, rules = last - first, self.rules
        stride = self.rows + 2
        if (width + 1) * stride > MOST_CELLS:
            raise TooLarge(
                f"{width} columns of {self.rows} rows are too many cells for one strip; take fewer columns"
            )
        counts = self._scratch((width + 1) * stride)
        block = self._run(first, last, counts, np.zeros(1, np.uint8) if stop is None else stop)
        if stop is not None and stop[0]:
            raise Stopped("the work was interrupted")
        table = counts[: width * stride].reshape(width, stride)
        if out is None:
            out = np.empty((width, self.rows), np.uint32)
        out[:] = table[:, 1:-1]
        outcomes = block.outcome.reshape(width, self.orbits_per_column)

        def samples_of(flags: NDArray[np.bool_]) -> NDArray[np.uint64]:
            orbits: NDArray[np.uint64] = flags.sum(axis=1, dtype=np.uint64)
            return orbits * np.uint64(rules.samples)

        strip = Strip(
            first,
            out,
            exposure=np.full(width, self.exposure, np.uint64),
            below=table[:, 0].astype(np.uint64),
            above=table[:, -1].astype(np.uint64),
            escaped=samples_of(outcomes == GONE),
            unsettled=samples_of(outcomes == SLOW),
            collapsed=block.again.reshape(outcomes.shape).sum(axis=1, dtype=np.uint64),
        )
        return Counted(strip, int(block.filled.sum()), int(block.on_repelling.sum()))

    def _scratch(self, size: int) -> NDArray[np.uint32]:
        """Return zeros that this thread uses again for its next strip."""
        kept = getattr(self._local, "counts", None)
        if kept is None or kept.size < size:
            kept = self._local.counts = np.empty(size, np.uint32)
        counts: NDArray[np.uint32] = kept[:size]
        counts[:] = 0
        return counts

    def _run(self, first: int, last: int, counts: NDArray[np.uint32], stop: NDArray[np.uint8]) -> Block:
        stride = np.int32(self.rows + 2)
        base = np.repeat(np.arange(last - first, dtype=np.int32) * stride, self.orbits_per_column)
        block = Block(self.module, self.rules, (self.window,), self.orbits(first, last), base, counts, stop)
        ready = block.settle()
        block.sample(ready)
        block.run_again()
        return block

    @cached_property
    def source(self) -> StepSource:
        """The compiled map."""
        return step_source(self.family, (self.view.up.name,))

    def orbits(self, first: int, last: int) -> Orbits:
        """Return the orbits of the columns ``first … last - 1``: column by column, value by value."""
        values, starts = self._values(first, last), self.starts
        varying = {self.view.across.name: np.repeat(values, len(starts))}
        start = np.tile(starts.T, values.size)
        return self.setting.orbits(self.module, self.source, start, self._keys(first, last), varying)

    def _values(self, first: int, last: int) -> NDArray[np.float64]:
        across, each = self.view.across, self.rules.values_per_column
        if self.columns * each > MOST_VALUES_KEPT:
            return across.values(self.columns, each, first, last).reshape(-1)
        kept: NDArray[np.float64] = self._all_values[first * each : last * each]
        return kept

    @cached_property
    def _all_values(self) -> NDArray[np.float64]:
        return self.view.across.values(self.columns, self.rules.values_per_column).reshape(-1)

    def _keys(self, first: int, last: int) -> NDArray[np.uint64]:
        columns = np.arange(first, last, dtype=np.uint64)[:, None, None]
        values = np.arange(self.rules.values_per_column, dtype=np.uint64)[None, :, None]
        starts = np.arange(len(self.starts), dtype=np.uint64)[None, None, :]
        return hashed(hashed(hashed(columns) ^ values) ^ starts).reshape(-1)
