"""Every refusal that needs arithmetic, made before any work: what a job needs in samples, time and memory."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from atlas.errors import PlanRefused, shown
from atlas.orbits.orbit import OrbitCounter
from tiles.errors import TooLarge
from tiles.window import Axis, View

BASE_MEMORY = 225 << 20
"""What the libraries take, measured: 215 MiB, and 45 MiB more when a map is compiled for the first time."""
LABELS_MEMORY, BYTES_PER_CELL = 60 << 20, 17
"""Of a Dataset: what its library takes, and counts and densities where both stand twice for a moment."""
DEFAULT_MEMORY = 2 << 30
LEAST_MEMORY = 1 << 30
EPSILON = 2.0**-53
MOST_ORBITS = 1 << 17
_UNITS = {"": 1, "B": 1, "KiB": 1 << 10, "MiB": 1 << 20, "GiB": 1 << 30, "TiB": 1 << 40}
_UNITS |= {"kB": 10**3, "MB": 10**6, "GB": 10**9, "TB": 10**12}


def parse_memory(given: str | int | None) -> int:
    """Read a memory budget such as ``2GiB`` or ``1500MB``; the default is 2 GiB.

    Raises
    ------
    PlanRefused
        For a text that is no size, and for less than 1 GiB.
    """
    if given is None:
        return DEFAULT_MEMORY
    text = str(given).strip()
    found = re.fullmatch(r"(\d{1,15}(?:\.\d{1,6})?)\s*([A-Za-z]*)", text)
    if not found or found[2] not in _UNITS:
        raise PlanRefused(f"--memory: {shown(text)} is no amount of memory; write for example 2GiB or 1500MB")
    size = int(float(found[1]) * _UNITS[found[2]])
    if size < LEAST_MEMORY:
        raise PlanRefused(f"--memory: {text} is too little; this program needs 1GiB at least")
    return size


def size_text(size: float) -> str:
    """Return an amount of memory or disk for people, such as ``1.4 GiB``."""
    for unit in ("B", "KiB", "MiB", "GiB", "TiB"):
        if size < 1024 or unit == "TiB":
            return f"{size:.0f} {unit}" if unit in ("B", "KiB") else f"{size:.1f} {unit}"
        size /= 1024
    raise AssertionError(size)


def check_counter(counter: OrbitCounter, where: str = "") -> None:
    """Refuse what the kernels cannot count: too many orbits, too many samples, too deep a zoom.

    Raises
    ------
    PlanRefused
    """
    lead = f"{where}: " if where else ""
    if counter.orbits_per_column > MOST_ORBITS:
        raise PlanRefused(
            f"{lead}{counter.orbits_per_column} orbits a column are too many; use at most {MOST_ORBITS}, "
            "fewer values_per_column or fewer starts"
        )
    if counter.exposure >= 1 << 32:
        most = ((1 << 32) - 1) // counter.orbits_per_column
        raise PlanRefused(
            f"{lead}{counter.exposure} samples a column are more than a count can hold; "
            f"use at most {most} samples"
        )
    _check_depth(counter.view.across, counter.columns * counter.rules.values_per_column, 2.0, lead)
    _check_depth(counter.view.up, counter.rows, 8.0, lead)
    low, high = float(counter.view.across.low), float(counter.view.across.high)
    # measured: in a narrower view the rounding of the map moves orbits by more than a cell
    needed = 5.0 * counter.rows * EPSILON * max(abs(low), abs(high))
    if high - low < needed:
        raise PlanRefused(
            f"{lead}the axis '{counter.view.across.name}' is {high - low:.1e} wide, finer than float64 "
            f"can resolve on {counter.rows} rows: rounding in the map grows to a cell of the picture; "
            f"use fewer rows, or make it at least {needed:.1e} wide"
        )


def check_portrait(
    view: View, columns: int, rows: int, *, samples: int, exposure: int, most: int, where: str = ""
) -> None:
    """Refuse a phase portrait that the kernels cannot count.

    Parameters
    ----------
    view : View
    columns, rows : int
    samples, most : int
        Asked for, of each start, and what may be asked for.
    exposure : int
        Samples of all starts, rounded up to whole numbers for each orbit.
    where : str
        What a sentence calls the output.

    Raises
    ------
    PlanRefused
    """
    lead = f"{where}: " if where else ""
    if exposure >= 1 << 32:
        raise PlanRefused(
            f"{lead}{samples} samples of each start, {exposure} in all, are more than a count can hold; "
            f"use at most {most} samples"
        )
    for axis, cells in ((view.across, columns), (view.up, rows)):
        _check_depth(axis, cells, 8.0, lead)


def check_pixels(view: View, columns: int, rows: int, where: str = "") -> None:
    """Refuse a plane or a basin chart whose pixels float64 cannot tell apart.

    Raises
    ------
    PlanRefused
    """
    lead = f"{where}: " if where else ""
    _check_depth(view.across, columns, 2.0, lead)
    _check_depth(view.up, rows, 2.0, lead)


def _check_depth(axis: Axis, cells: int, steps: float, lead: str) -> None:
    low, high = float(axis.low), float(axis.high)
    largest = max(abs(low), abs(high))
    cell = axis.cell_size(cells) * (min(abs(low), abs(high)) if axis.scale == "log" else 1.0)
    needed = steps * 2.0 * EPSILON * (min(abs(low), abs(high)) if axis.scale == "log" else largest)
    if cell < needed:
        raise PlanRefused(
            f"{lead}a cell of the axis '{axis.name}' would be {cell:.1e}, finer than float64 can resolve "
            f"there; widen the interval or use fewer cells, {needed:.1e} each at least"
        )


@dataclass(frozen=True)
class Need:
    """What an output needs.

    Attributes
    ----------
    pixels : (int, int)
        Of the sheet, or of the deepest level of a tile set.
    samples : int
        Counted samples in all, at least.
    seconds : float
        Estimated time.
    memory : int
        Estimated peak memory of the process in bytes.
    """

    pixels: tuple[int, int]
    samples: int
    seconds: float
    memory: int


def check_memory(needed: int, budget: int, what: str, remedy: str) -> None:
    """Refuse what does not fit into the memory budget, with the figure it would need.

    Raises
    ------
    TooLarge
    """
    if needed > budget:
        raise TooLarge(
            f"{what} would need {size_text(needed)} of memory and the budget is {size_text(budget)}; {remedy}"
        )


def check_fits(where: str, pixels: tuple[int, int], needed: int, budget: int) -> None:
    """Refuse an output that does not fit into the memory budget, with the figure it would need.

    Raises
    ------
    TooLarge
    """
    what = f"{where}: {pixels[0]} x {pixels[1]} pixels"
    check_memory(needed, budget, what, "make it smaller or raise --memory")


def check_arrays(size: tuple[int, int], budget: int) -> None:
    """Refuse a Dataset of counts and densities that does not fit into the memory budget."""
    columns, rows = size
    if min(size) < 1:
        raise PlanRefused(f"size: {columns} x {rows} cells is no size; both must be 1 at least")
    needed = BASE_MEMORY + LABELS_MEMORY + BYTES_PER_CELL * columns * rows
    check_memory(
        needed, budget, f"a Dataset of {columns} x {rows} cells", "ask for fewer cells or raise memory"
    )


def check_layers(size: tuple[int, int], item_sizes: Sequence[int], budget: int) -> None:
    """Refuse a Dataset of layers that does not fit into the memory budget.

    Parameters
    ----------
    size : (int, int)
        Columns and rows.
    item_sizes : sequence of int
        Bytes of a number of each layer.
    budget : int
    """
    columns, rows = size
    needed = BASE_MEMORY + LABELS_MEMORY + 2 * sum(item_sizes) * columns * rows
    check_memory(
        needed, budget, f"a Dataset of {columns} x {rows} pixels", "ask for fewer pixels or raise memory"
    )
