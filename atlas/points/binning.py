"""Points binned for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from typing import Any

from atlas.errors import PlanRefused
from atlas.orbits.counts import labelled
from atlas.output.certificate import as_text
from atlas.output.certificate_reader import KEY
from atlas.output.reporter import Silence
from atlas.plan import check_arrays, parse_memory
from atlas.points.cells import Grid
from atlas.points.counting import Reading, count_points
from atlas.points.intervals import AskedAxis, AxisGiven, view_of
from atlas.points.opening import table_of
from atlas.points.record import binned, samples
from atlas.points.tables import ROWS_PER_CHUNK
from atlas.reading.place import REQUEST, shown
from tiles.window import View


def bin_points(
    points: Any,
    view: View | tuple[AxisGiven, AxisGiven],
    *,
    size: tuple[int, int],
    name: str = "points",
    memory: str | int | None = None,
    rows_per_chunk: int = ROWS_PER_CHUNK,
) -> Any:
    """Count measured or simulated points in the cells of a view.

    Cells are half-open, the last one closed; the exact edges of both axes decide, whatever the rounding.

    Parameters
    ----------
    points : path, DataFrame, mapping of arrays, structured array or iterable of such chunks
        A table with a column for each axis. A path ends in .csv or .parquet and is read in chunks.
    view : View or (across, up)
        Each axis as `atlas.View` takes it, or the name of its column alone, or with None for an end, or a
        mapping without ``low`` or ``high``: open ends are those of the points, found in a first pass
        and moved outwards to readable decimals.
    size : (int, int)
        Columns and rows.
    name : str
        Of the result, in its certificate.
    memory : str or int, optional
        Budget of the whole process, such as ``"2GiB"`` or bytes.
    rows_per_chunk : int
        Points read at a time. The result does not depend on it.

    Returns
    -------
    xarray.Dataset
        As `atlas.orbit_counts` returns it. ``exposure`` is the number of points that fell into a column,
        0 in a column without any; ``escaped``, ``unsettled`` and ``collapsed`` are 0. The attributes say
        how many ``points`` were read and how many are ``missing`` a number or lie ``across_below`` or
        ``across_above`` the ends of the across axis; the certificate is in ``atlas-certificate``. In every
        column inside + below + above = exposure, and the exposures, the missing and those beyond the
        across axis make up all points.

    Raises
    ------
    Refusal
        For a file or a column that is not there, a column that holds no numbers, points without a single
        finite one, an interval that is reversed, and a size beyond the memory budget.

    Examples
    --------
    >>> import atlas
    >>> points = {"dose": [0.5, 1.5, 1.5], "response": [0.2, 0.2, 0.9]}
    >>> ds = atlas.bin_points(points, (("dose", 0, 2), ("response", 0, 1)), size=(2, 4))
    >>> ds.counts.values.tolist()
    [[1, 1], [0, 0], [0, 0], [0, 1]]
    """
    place = REQUEST
    axes = (view.across, view.up) if isinstance(view, View) else view
    if not isinstance(axes, tuple | list) or len(axes) != 2:
        raise place.at("view").refusal(f"{shown(axes)} is no view; write atlas.View(across=..., up=...)")
    across, up = (AskedAxis.read(one, place.at(key)) for one, key in zip(axes, ("across", "up"), strict=True))
    columns, rows = (int(cells) for cells in size)
    check_arrays((columns, rows), parse_memory(memory))
    if rows_per_chunk < 1:
        raise PlanRefused(f"rows_per_chunk: {rows_per_chunk} is no number of points; it must be 1 at least")
    table = table_of(points)
    grid = Grid.of(view_of(table, across, up, rows_per_chunk, place), columns, rows)
    reading = Reading(table, grid, rows_per_chunk, Silence())
    histogram = count_points(reading)
    digest = histogram.digest()
    made = binned(name, {}, reading, digest)
    attributes = {
        **({"file": table.file} if table.file else {}),
        "points": reading.account.points,
        **samples(reading),
        "missing": reading.account.missing,
        "across_below": reading.account.before,
        "across_above": reading.account.beyond,
        "counts_digest": digest,
        KEY: as_text(made.record),
    }
    return labelled(grid.view, histogram.strip, attributes, lambda _: ("", ""))
