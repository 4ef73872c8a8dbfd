"""Phase portraits for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.config.digests import decisive
from atlas.config.draws import KINDS
from atlas.config.jobs import Plate
from atlas.config.load import plate_from_parts
from atlas.families.map_family import Family
from atlas.orbits.counting import portrait_of, resolved_portrait
from atlas.orbits.counts import CELLS_AT_ONCE
from atlas.orbits.portrait import TOTALS, Portrait, PortraitCounter
from atlas.orbits.portrait_counts import count_portrait, workers_that_fit
from atlas.orbits.schedule import schedule, threads
from atlas.output.certificate import as_text, certificate
from atlas.output.certificate_reader import KEY
from atlas.output.dataset_parts import KIND, Number, axis_attributes, cells_of
from atlas.plan import BASE_MEMORY, LABELS_MEMORY, check_arrays, parse_memory
from atlas.reading.place import REQUEST, shown
from tiles.window import View


def phase_portrait(
    family: Family,
    view: View,
    *,
    size: tuple[int, int],
    set: Mapping[str, Any] | None = None,
    starts: Sequence[Mapping[str, Number]] | Mapping[str, Any] | None = None,
    transient: int = 1000,
    samples: int | str = "auto",
    transient_limit: int | None = None,
    longest_period: int = 64,
    record: Mapping[str, int] | None = None,
    workers: int | None = None,
    memory: str | int | None = None,
) -> Any:
    """Count the states of orbits over two state variables or observables, at one setting of the parameters.

    Parameters
    ----------
    family : Family
        From `atlas.family` or `atlas.load(path).families`.
    view : View
        State variables or observables across and up.
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
        States counted of each start; by default a mean of at least 8 in the occupied cells. A start is run
        as several copies, which differ by 2**-40 of their size at most (`atlas.orbits.portrait`), and the
        samples are rounded up to whole numbers for each copy.
    longest_period : int
        Longest cycle looked for.
    record : mapping, optional
        ``{"every": 12, "phase": 3}`` counts only the states after n steps where n modulo 12 is 3.
    workers : int, optional
        Threads; by default one a processor. The result does not depend on it.
    memory : str or int, optional
        Budget of the whole process, such as ``"2GiB"`` or bytes; where it is short, fewer threads count.

    Returns
    -------
    xarray.Dataset
        ``counts`` (uint32) and ``density`` (float64, counts / (exposure * area of a cell), per unit of both
        axes or, on a log axis, of its natural logarithm) on both axes, up first. Without dimensions, in
        samples: ``exposure``, ``left`` and ``right`` of the view, ``below`` and ``above`` between them,
        ``escaped``, ``unsettled``, ``filled`` by exact repeats; in orbits: ``collapsed``, ``on_repelling``.
        Inside + left + right + below + above + escaped + unsettled = exposure. Coordinates are cell centres,
        ascending. The certificate is in the attribute ``atlas-certificate``.

    Raises
    ------
    Refusal
        For axes, parameters or starts that the family does not have, more samples than a count holds, a size
        beyond the memory budget, and a window finer than float64 resolves.

    Examples
    --------
    >>> import atlas
    >>> view = atlas.View(across=("x", "-1.5", "1.5"), up=("y", "-0.5", "0.5"))
    >>> ds = atlas.phase_portrait(atlas.family("henon"), view, size=(30, 20), samples=2000)
    >>> ds.counts.dims, int(ds.counts.sum())
    (('y', 'x'), 2000)
    """
    place = REQUEST
    if not isinstance(view, View):
        raise place.at("view").refusal(f"{shown(view)} is no view; write atlas.View(across=..., up=...)")
    columns, rows = cells_of(size, place.at("size"))
    budget = parse_memory(memory)
    check_arrays((columns, rows), budget)
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
        longest_period=longest_period,
        record=record,
    )
    if job.kind != "portrait":
        raise place.at("view").refusal(
            f"{view.across.name} across and {view.up.name} up make {KINDS[job.kind]}; "
            "put state variables or observables on both axes"
        )
    counter = portrait_of(job, columns, rows)
    room = budget - BASE_MEMORY - LABELS_MEMORY
    with schedule(workers) as opened:
        counter = resolved_portrait(job, counter, opened)
        at_once = workers_that_fit(columns, rows, room, threads(workers))
        portrait = count_portrait(counter, opened, at_once=at_once)
    return _dataset(job, counter, portrait)


def sampled_of(counter: PortraitCounter, portrait: Portrait) -> dict[str, int]:
    """Return what the certificate says of the samples of a phase portrait."""
    return {
        "columns": counter.columns,
        "rows": counter.rows,
        "starts": len(counter.starts),
        "copies_of_each_start": portrait.copies,
        "of_each_start": portrait.samples,
        "exposure": portrait.totals["exposure"],
        "filled_by_repeats": portrait.totals["filled"],
    }


def _dataset(job: Plate, counter: PortraitCounter, portrait: Portrait) -> Any:
    import xarray

    family, view, digest = job.family, job.view, portrait.digest()
    columns, rows = portrait.counts.shape
    config = {"kind": KIND, **decisive(job), "resolution": [columns, rows]}
    record = certificate(KIND, family.name, config, digest, portrait.shares(), sampled_of(counter, portrait))
    area = view.across.cell_size(columns) * view.up.cell_size(rows)
    dims = (view.up.name, view.across.name)
    made = xarray.Dataset(
        {
            "counts": (dims, np.ascontiguousarray(portrait.counts.T)),
            "density": (dims, _density(portrait, area)),
            **{name: ((), np.uint64(portrait.totals[name])) for name in TOTALS},
        },
        coords={dims[0]: view.up.centres(rows), dims[1]: view.across.centres(columns)},
        attrs={
            "family": family.name,
            "formula": "; ".join(family.formula_lines()),
            "samples": portrait.samples,
            "copies": portrait.copies,
            "cell_area": area,
            "counts_digest": digest,
            KEY: as_text(record),
        },
    )
    for axis in (view.across, view.up):
        made[axis.name].attrs = axis_attributes(axis, *family.label_and_unit(axis.name))
    return made


def _density(portrait: Portrait, area: float) -> NDArray[np.float64]:
    """Return the densities, shape (rows, columns), without a second array of that size."""
    columns, rows = portrait.counts.shape
    whole = np.empty((rows, columns))
    width = max(1, CELLS_AT_ONCE // rows)
    for first in range(0, columns, width):
        block = slice(first, first + width)
        whole[:, block] = (portrait.counts[block] / (portrait.totals["exposure"] * area)).T
    return whole
