"""Orbit histograms for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np

from atlas.config.view_rules import checked_set, checked_starts, drawn_view
from atlas.families.reader import Family
from atlas.orbits.counting import piloted
from atlas.orbits.histogram import Histogram, count_histogram
from atlas.orbits.orbit import OrbitCounter, Rules
from atlas.orbits.schedule import schedule
from atlas.plan import check_arrays, check_counter, parse_memory
from atlas.reading.place import Place
from tiles.number import Exact, exact
from tiles.strip import PER_COLUMN, Strip
from tiles.tally import density
from tiles.window import View

Number = str | int | float | Exact


def orbit_counts(
    family: Family,
    view: View,
    *,
    size: tuple[int, int],
    set: Mapping[str, Number] | None = None,
    starts: Sequence[Mapping[str, Number]] | None = None,
    transient: int = 1000,
    samples: int | str = 1000,
    values_per_column: int = 4,
    transient_limit: int = 1_000_000,
    longest_period: int = 64,
    workers: int | None = None,
    memory: str | int | None = None,
) -> Any:
    """Count the orbits of a family over a view.

    Parameters
    ----------
    family : Family
        From `atlas.family` or `atlas.load(path).families`.
    view : View
        A parameter across, a state variable up.
    size : (int, int)
        Columns and rows.
    set : mapping of str to number, optional
        Parameters that differ from their defaults.
    starts : sequence of mappings of str to number, optional
        Initial conditions; by default the family's own.
    transient, transient_limit : int
        Steps before sampling, and at most, for orbits that settle slowly.
    samples : int or "auto"
        States counted of each orbit.
    values_per_column : int
        Parameter values spread over each column.
    longest_period : int
        Longest cycle looked for.
    workers : int, optional
        Threads; by default one a processor. The result does not depend on it.
    memory : str or int, optional
        Budget of the whole process, such as ``"2GiB"`` or bytes.

    Returns
    -------
    xarray.Dataset
        ``counts`` (uint32) and ``density`` (float64, counts / (exposure * cell size), per unit of the state
        or, on a log axis, of its natural logarithm) on both axes, up first; ``exposure``, ``below``,
        ``above``, ``escaped``, ``unsettled`` (samples) and ``collapsed`` (orbits) on the across axis.
        Coordinates are cell centres, ascending. In every column
        inside + below + above + escaped + unsettled = exposure.

    Raises
    ------
    Refusal
        For axes, parameters or starts that the family does not have, a size beyond the memory budget, and a
        window finer than float64 resolves.

    Examples
    --------
    >>> import atlas
    >>> view = atlas.View(across=("r", "2.8", "4"), up=("x", 0, 1))
    >>> ds = atlas.orbit_counts(atlas.family("logistic"), view, size=(120, 80), samples=100)
    >>> ds.counts.dims
    ('x', 'r')
    """
    place = Place()
    view = drawn_view(family, view.across, view.up, place)
    given = {name: exact(value) for name, value in (set or {}).items()}
    begin = None if starts is None else [{k: exact(v) for k, v in one.items()} for one in starts]
    rules = Rules(
        transient,
        max(transient, transient_limit),
        1 if samples == "auto" else int(samples),
        values_per_column,
        longest_period,
    )
    counter = OrbitCounter(
        family,
        view,
        *size,
        rules,
        set=checked_set(family, given, view, place.at("set")),
        starts=checked_starts(family, begin, place.at("starts")),
    )
    check_counter(counter)
    check_arrays(size, parse_memory(memory))
    with schedule(workers) as opened:
        if samples == "auto":
            counter = counter.with_samples(piloted(counter, opened))
        histogram = count_histogram(counter, opened)
    return dataset(histogram, counter)


def dataset(histogram: Histogram, counter: OrbitCounter) -> Any:
    """Return a histogram as an xarray Dataset, as `orbit_counts` describes it."""
    return labelled(
        counter.view,
        histogram.strip,
        {
            "family": counter.family.name,
            "formula": "; ".join(counter.family.formula_lines()),
            "samples": histogram.samples,
            "samples_filled_by_repeats": histogram.filled,
            "orbits_on_repelling_start": histogram.on_repelling,
            "counts_digest": histogram.digest(),
        },
        counter.family.label_and_unit,
    )


def labelled(
    view: View,
    strip: Strip,
    attributes: Mapping[str, Any],
    label_and_unit: Callable[[str], tuple[str, str]],
) -> Any:
    """Return the counts of a whole view as an xarray Dataset.

    Parameters
    ----------
    view : View
    strip : Strip
        All columns.
    attributes : mapping
        Of the Dataset; ``cell_size`` is added.
    label_and_unit : callable
        Returns label and unit of an axis by its name.
    """
    import xarray

    columns, rows = strip.counts.shape
    across, up = view.across.name, view.up.name
    cell = view.up.cell_size(rows)
    made = xarray.Dataset(
        {
            "counts": ((up, across), np.ascontiguousarray(strip.counts.T)),
            "density": ((up, across), np.ascontiguousarray(density(strip.counts, strip.exposure, cell).T)),
            **{name: (across, getattr(strip, name)) for name in PER_COLUMN},
        },
        coords={up: view.up.centres(rows), across: view.across.centres(columns)},
        attrs={**attributes, "cell_size": cell},
    )
    for axis in (view.across, view.up):
        label, unit = label_and_unit(axis.name)
        made[axis.name].attrs = {
            "long_name": axis.label or label or axis.name,
            "units": unit,
            "scale": axis.scale,
            "low": str(axis.low),
            "high": str(axis.high),
        }
    return made
