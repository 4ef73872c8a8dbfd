"""Orbit histograms for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from decimal import Decimal
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.config.digests import decisive
from atlas.config.draws import KINDS
from atlas.config.jobs import Plate
from atlas.config.load import plate_from_parts
from atlas.families.reader import Family
from atlas.orbits.counting import Sampled, counter_of, resolved
from atlas.orbits.histogram import Histogram, count_histogram
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.schedule import schedule
from atlas.output.certificate import as_text, certificate
from atlas.output.certificate_reader import KEY
from atlas.plan import check_arrays, parse_memory
from atlas.reading.kinds import Whole
from atlas.reading.place import REQUEST, Place, shown
from tiles.number import Exact
from tiles.strip import PER_COLUMN, Strip
from tiles.tally import density
from tiles.window import View

Number = str | int | float | Fraction | Decimal | Exact
KIND = "dataset"
CELLS_AT_ONCE = 1 << 20
_CELLS = Whole(1, 1 << 31)


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
    transient_limit: int | None = None,
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
        A parameter across, a state variable or observable up.
    size : (int, int)
        Columns and rows.
    set : mapping of str to number, optional
        Parameters that differ from their defaults.
    starts : sequence of mappings of str to number, optional
        Initial conditions; by default the family's own.
    transient, transient_limit : int
        Steps before sampling, and at most, for orbits that settle slowly; the limit is 1 000 000 by default.
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
        inside + below + above + escaped + unsettled = exposure. The certificate is in the attribute
        ``atlas-certificate``; a Dataset saved with ``to_netcdf(path, engine="h5netcdf")`` carries it along.

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
    place = REQUEST
    if not isinstance(view, View):
        raise place.at("view").refusal(f"{shown(view)} is no view; write atlas.View(across=..., up=...)")
    kind = plate_from_parts(family, view.across, view.up, place=place).kind
    if kind != "histogram":
        raise place.at("view").refusal(
            f"{view.across.name} across and {view.up.name} up make {KINDS[kind]}; "
            "put a parameter across and a state variable or observable up"
        )
    columns, rows = _cells(size, place.at("size"))
    check_arrays((columns, rows), parse_memory(memory))
    job = plate_from_parts(
        family,
        view.across,
        view.up,
        set=set,
        starts=starts,
        name="dataset",
        place=place,
        transient=transient,
        transient_limit=transient_limit,
        samples=samples,
        values_per_column=values_per_column,
        longest_period=longest_period,
    )
    counter = counter_of(job, columns, rows)
    with schedule(workers) as opened:
        counter = resolved(job, counter, opened)
        histogram = count_histogram(counter, opened)
    return dataset(job, counter, histogram)


def _cells(size: tuple[int, int], place: Place) -> tuple[int, int]:
    if not isinstance(size, tuple | list) or len(size) != 2:
        raise place.refusal(f"{shown(size)} is no resolution; write (columns, rows)")
    across, up = (_CELLS.read(cells, place.at(number)) for number, cells in enumerate(size, 1))
    return across, up


def dataset(job: Plate, counter: OrbitCounter, histogram: Histogram) -> Any:
    """Return a histogram as an xarray Dataset, as `orbit_counts` describes it."""
    family, digest = job.family, histogram.digest()
    sampled = Sampled(counter.columns, counter.rows, histogram.samples, counter.exposure, histogram.filled)
    config = {"kind": KIND, **decisive(job), "resolution": [counter.columns, counter.rows]}
    record = certificate(KIND, family.name, config, digest, histogram.shares(), sampled.record())
    return labelled(
        counter.view,
        histogram.strip,
        {
            "family": family.name,
            "formula": "; ".join(family.formula_lines()),
            "samples": histogram.samples,
            "samples_filled_by_repeats": histogram.filled,
            "orbits_on_repelling_start": histogram.on_repelling,
            "counts_digest": digest,
            KEY: as_text(record),
        },
        family.label_and_unit,
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
            "density": ((up, across), _densities(strip, cell)),
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


def _densities(strip: Strip, cell: float) -> NDArray[np.float64]:
    """Return the densities of a strip, shape (rows, columns), without a second array of that size."""
    columns, rows = strip.counts.shape
    whole = np.empty((rows, columns))
    width = max(1, CELLS_AT_ONCE // rows)
    for first in range(0, columns, width):
        block = slice(first, first + width)
        whole[:, block] = density(strip.counts[block], strip.exposure[block], cell).T
    return whole
