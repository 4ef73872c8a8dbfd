"""Orbit histograms for notebooks: labelled xarray Datasets."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from hashlib import blake2b
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.config.digests import decisive
from atlas.config.draws import KINDS
from atlas.config.jobs import Plate
from atlas.config.load import plate_from_parts
from atlas.families.reader import Family
from atlas.orbits.counting import Sampled, counter_of, resolved
from atlas.orbits.follow import count_followed
from atlas.orbits.histogram import Histogram, count_histogram
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.schedule import schedule
from atlas.output.certificate import as_text, certificate
from atlas.output.certificate_reader import KEY
from atlas.output.dataset_parts import KIND, Number, axis_attributes, cells_of
from atlas.plan import check_arrays, parse_memory
from atlas.reading.place import REQUEST, shown
from tiles.strip import PER_COLUMN, Strip
from tiles.tally import density
from tiles.window import View

CELLS_AT_ONCE = 1 << 20


def orbit_counts(
    family: Family,
    view: View,
    *,
    size: tuple[int, int],
    set: Mapping[str, Any] | None = None,
    starts: Sequence[Mapping[str, Number]] | Mapping[str, Any] | None = None,
    transient: int = 1000,
    samples: int | str = 1000,
    values_per_column: int = 4,
    transient_limit: int | None = None,
    longest_period: int = 64,
    record: Mapping[str, int] | None = None,
    follow: str | None = None,
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
        Parameters that differ from their defaults; ``{"r": {"pattern": ["a", "b"]}}`` gives a pattern another
        word.
    starts : sequence of mappings of str to number, or mapping, optional
        Initial conditions, or ``{"grid": [8, 8], "box": {"x": [0, 1], "y": [0, 1]}}``; by default the
        family's own.
    transient, transient_limit : int
        Steps before sampling, and at most, for orbits that settle slowly; the limit is 1 000 000 by default.
    samples : int or "auto"
        States counted of each orbit.
    values_per_column : int
        Parameter values spread over each column.
    longest_period : int
        Longest cycle looked for.
    record : mapping, optional
        ``{"every": 12, "phase": 3}`` counts only the states after n steps where n modulo 12 is 3.
    follow : "up", "down" or "both", optional
        Each column starts where its neighbour ended (`atlas.orbits.follow`); with ``both`` there are two
        sweeps.
    workers : int, optional
        Threads; by default one a processor. The result does not depend on it.
    memory : str or int, optional
        Budget of the whole process, such as ``"2GiB"`` or bytes.

    Returns
    -------
    xarray.Dataset
        ``counts`` (uint32) and ``density`` (float64, counts / (exposure * cell size), per unit of the state
        or, on a log axis, of its natural logarithm) on both axes, up first; ``exposure``, ``below``,
        ``above``, ``escaped``, ``unsettled`` (samples) and ``collapsed`` (orbits) on the across axis. With
        ``follow="both"`` everything has the dimension ``sweep`` first, ``up`` and ``down``.
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
    columns, rows = cells_of(size, place.at("size"))
    check_arrays((columns, rows if follow != "both" else 2 * rows), parse_memory(memory))
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
        record=record,
        follow=follow,
    )
    counter = counter_of(job, columns, rows)
    with schedule(workers) as opened:
        counter = resolved(job, counter, opened)
        if job.follow is None:
            return dataset(job, counter, count_histogram(counter, opened))
        sweeps = count_followed(counter, job.follow, opened)
    made = {direction: dataset(job, counter, histogram) for direction, histogram in sweeps.items()}
    return _side_by_side(made) if len(made) > 1 else made[job.follow]


def _side_by_side(sweeps: Mapping[str, Any]) -> Any:
    """Return the Datasets of several sweeps as one, with what tells them apart on a dimension of its own."""
    import xarray

    both = xarray.concat(list(sweeps.values()), xarray.Variable("sweep", list(sweeps)), combine_attrs="drop")
    first, *_ = sweeps.values()
    records = [json.loads(one.attrs[KEY]) for one in sweeps.values()]
    digest = blake2b("".join(one["counts_digest"] for one in records).encode(), digest_size=16).hexdigest()
    told = {
        key: {name: one[key] for name, one in zip(sweeps, records, strict=True)}
        for key in ("shares", "samples")
    }
    for name in ("samples_filled_by_repeats", "orbits_on_repelling_start"):
        both[name] = ("sweep", np.array([one.attrs[name] for one in sweeps.values()], np.uint64))
    kept = {name: first.attrs[name] for name in ("family", "formula", "samples", "cell_size")}
    record = records[0] | told | {"counts_digest": digest}
    both.attrs = {**kept, "counts_digest": digest, KEY: as_text(record)}
    return both


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
        made[axis.name].attrs = axis_attributes(axis, *label_and_unit(axis.name))
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
