"""A family with its parameters set: from values and starts to orbits as kernels take them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.families.map_family import Family
from atlas.orbits.block import CountedAxis, Orbits
from atlas.orbits.step import StepSource, parameter_rows
from tiles.number import Exact
from tiles.window import Axis

Floats = NDArray[np.float64]


class Setting:
    """Values of the parameters that run along no axis, and the starts.

    Parameters
    ----------
    family : Family
    set : mapping of str to Exact, optional
        Parameters that differ from the family's defaults.
    starts : sequence of mappings of str to Exact, optional
        Initial conditions; variables left out start where the family says.
    """

    def __init__(
        self,
        family: Family,
        set: Mapping[str, Exact] | None = None,
        starts: Sequence[Mapping[str, Exact]] = (),
    ) -> None:
        self.family = family
        self.fixed = {one.name: float(one.default) for one in family.parameters}
        self.fixed |= {name: float(value) for name, value in (set or {}).items()}
        self.starts: Floats = np.array(
            [
                [float(start.get(state.name, state.start)) for state in family.states]
                for start in (starts or [{}])
            ]
        )

    def orbits(
        self,
        module: ModuleType,
        source: StepSource,
        start: Floats,
        key: NDArray[np.uint64],
        varying: Mapping[str, Floats],
    ) -> Orbits:
        """Return orbits side by side.

        Parameters
        ----------
        module : module
            The compiled kernels of the source.
        source : StepSource
        start : ndarray of float64, shape (states, orbits)
        key : ndarray of uint64, shape (orbits,)
        varying : mapping of str to ndarray of float64, shape (orbits,)
            Parameters that differ from orbit to orbit.
        """
        names = parameter_rows(self.family)
        table = np.empty((len(names), start.shape[1]))
        values: dict[str, float | Floats] = {**self.fixed, **varying}
        c = np.empty((source.rows, start.shape[1]))
        rows = source.rows // len(source.letters)
        for number, letter in enumerate(source.letters):
            for row, name in zip(table, names, strict=True):
                given = letter.get(name, name)
                row[:] = values[given] if isinstance(given, str) else float(given)
            module.coefficients(table, c[number * rows : (number + 1) * rows])
        word = np.array(source.word, np.int64)
        return Orbits(np.ascontiguousarray(start), c, word, key, float(self.family.escape))


def counted_axis(axis: Axis, cells: int) -> CountedAxis:
    """Return the cells of an axis as kernels take them."""
    edges = axis.edges(cells)
    cell, relative = axis.cell_size(cells), axis.scale == "log"
    low, high = float(edges[0]), float(edges[-1])
    if relative:
        low, high = float(np.log(low)), float(np.log(high))
    slack = 4e-15 * (cells + 2.0 * max(abs(low), abs(high)) / cell)
    return CountedAxis((low, 1.0 / cell, slack), edges, 0.5 * cell, relative)


def hashed(numbers: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """Return well-mixed 64-bit numbers (finaliser of SplitMix64, Steele, Lea & Flood 2014)."""
    z = numbers + np.uint64(0x9E3779B97F4A7C15)
    z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return z ^ (z >> np.uint64(31))
