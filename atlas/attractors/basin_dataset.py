"""Basin charts for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from atlas.attractors.basins import Basins, chart_basins
from atlas.config.digests import decisive
from atlas.config.load import plate_from_parts
from atlas.families.map_family import Family
from atlas.orbits.schedule import schedule
from atlas.output.certificate import as_text, certificate
from atlas.output.certificate_reader import KEY
from atlas.output.dataset_parts import KIND, Number, axis_attributes, cells_of
from atlas.plan import check_layers, parse_memory
from atlas.planes.fates import CLASS_NAMES, CLASS_OF_FATE, FATES
from atlas.planes.searching import finder_of
from atlas.reading.place import REQUEST, shown
from tiles.window import View

BYTES_OF_LAYERS = (2, 1, 2, 4, 2)
"""A start: attractor, fate and period, and while they are found its key and its class."""


def basins(
    family: Family,
    view: View,
    *,
    size: tuple[int, int],
    set: Mapping[str, Any] | None = None,
    starts: Sequence[Mapping[str, Number]] | None = None,
    transient: int = 1000,
    steps: int = 2000,
    transient_limit: int | None = None,
    longest_period: int = 64,
    extinct: Mapping[str, Number] | None = None,
    workers: int | None = None,
    memory: str | int | None = None,
) -> Any:
    """Find the attractor that each start of a plane of initial conditions reaches.

    Parameters
    ----------
    family : Family
        From `atlas.family` or `atlas.load(path).families`; of at least two state variables.
    view : View
        A state variable across, another one up.
    size : (int, int)
        Columns and rows. Every orbit starts at the exact centre of its cell.
    set : mapping of str to number, optional
        Parameters that differ from their defaults; ``{"r": {"pattern": ["a", "b"]}}`` gives a pattern another
        word.
    starts : sequence of one mapping of str to number, optional
        Where state variables on no axis start; by default where the family says.
    transient, steps : int
        Steps before exponents are measured, and in which they are.
    transient_limit : int, optional
        Steps up to which orbits that approach a cycle are run on; 1 000 000 by default.
    longest_period : int
        Longest cycle looked for.
    extinct : mapping of str to number, optional
        Sizes below which state variables count as extinct; by default the family's.
    workers : int, optional
        Threads; by default one a processor. The result does not depend on it.
    memory : str or int, optional
        Budget of the whole process, such as ``"2GiB"`` or bytes.

    Returns
    -------
    xarray.Dataset
        On both axes, up first: ``attractor`` (uint16), the number of the attractor that each start reaches,
        from 1 in the order of the lowest such start (lowest row first, then leftmost column), or the class of
        its fate, which the attributes ``flag_values`` and ``flag_meanings`` of the variable name; ``fate``
        (uint8) and ``period`` (uint16) of that attractor. Along ``number``, one entry an attractor: ``share``
        of the box of starts and ``share_error``, its standard error as if the starts lay at random
        (binomial); ``starts_reaching``, ``kind`` (its fate), ``period_of`` (0 without a cycle), and along
        ``state`` the box of its states ``lowest`` to ``highest`` and their ``mean``. ``points`` along
        ``number``, ``point`` and ``state`` are those of cycles, NaN beyond. How attractors are told apart
        stands in `atlas.attractors.basins`. The certificate is in the attribute ``atlas-certificate``.

    Raises
    ------
    Refusal
        For axes, parameters or starts that the family does not have, a size beyond the memory budget, and a
        window finer than float64 resolves.

    Examples
    --------
    >>> import atlas
    >>> view = atlas.View(across=("x", -2, 2), up=("y", -2, 2))
    >>> ds = atlas.basins(atlas.family("henon"), view, size=(12, 8))
    >>> ds.attractor.dims, ds.sizes["number"]
    (('y', 'x'), 1)
    """
    place = REQUEST
    if not isinstance(view, View):
        raise place.at("view").refusal(f"{shown(view)} is no view; write atlas.View(across=..., up=...)")
    columns, rows = cells_of(size, place.at("size"))
    job = plate_from_parts(
        family,
        view.across,
        view.up,
        set=set,
        starts=starts,
        name="dataset",
        place=place,
        draw="basin",
        transient=transient,
        steps=steps,
        transient_limit=transient_limit,
        longest_period=longest_period,
        extinct=extinct,
    )
    check_layers((columns, rows), BYTES_OF_LAYERS, parse_memory(memory))
    finder = finder_of(job, columns, rows)
    with schedule(workers) as opened:
        found = chart_basins(finder, opened)
    return basin_dataset(job, found)


def basin_dataset(job: Any, found: Basins) -> Any:
    """Return a basin chart as an xarray Dataset, as `basins` describes it."""
    import xarray

    family, view = job.family, job.view
    columns, rows = found.classes.shape
    dims = (view.up.name, view.across.name)
    config = {"kind": KIND, **decisive(job), "resolution": [columns, rows]}
    sampled = {"columns": columns, "rows": rows, "attractors": attractor_records(found, family.state_names)}
    record = certificate(KIND, family.name, config, found.digest(), found.shares(), sampled)
    classes = np.ascontiguousarray(found.classes.T)
    fate, period = _of_classes(found)
    flags = _flags(found)
    made = xarray.Dataset(
        {
            "attractor": (
                dims,
                classes,
                {
                    "long_name": "attractor that the start reaches",
                    "flag_values": np.array(list(flags), np.uint16),
                    "flag_meanings": " ".join(name.replace(" ", "_") for name in flags.values()),
                },
            ),
            "fate": (dims, fate[classes], {"long_name": f"fate: {', '.join(FATES)}"}),
            "period": (dims, period[classes], {"long_name": "least period of the cycle, 0 without one"}),
            **_each_attractor(found, len(family.states)),
        },
        coords={
            view.up.name: view.up.centres(rows),
            view.across.name: view.across.centres(columns),
            "number": np.arange(1, len(found.attractors) + 1, dtype=np.uint16),
            "state": list(family.state_names),
        },
        attrs={
            "family": family.name,
            "formula": "; ".join(family.formula_lines()),
            "fate_codes": list(range(len(FATES))),
            "fate_names": list(FATES),
            "further_attractors": found.further,
            "starts_reaching_further": found.further_orbits,
            "volume_preserving_orbits": found.steady,
            "counts_digest": found.digest(),
            KEY: as_text(record),
        },
    )
    for axis in (view.across, view.up):
        made[axis.name].attrs = axis_attributes(axis, *family.label_and_unit(axis.name))
    return made


def attractor_records(found: Basins, states: Sequence[str]) -> list[dict[str, Any]]:
    """Return what a certificate says of each attractor: plain numbers and texts."""
    return [
        {
            "number": one.number,
            "fate": FATES[one.fate],
            "period": one.period,
            "share": one.share,
            "standard_error": one.error,
            "mean": dict(zip(states, one.mean.tolist(), strict=True)),
        }
        for one in found.attractors
    ]


def _flags(found: Basins) -> dict[int, str]:
    flags = {one.number: f"attractor {one.number}" for one in found.attractors}
    if found.further:
        flags[len(flags) + 1] = "further attractors"
    present = [CLASS_OF_FATE[fate] for fate in found.fates]
    return flags | {number: CLASS_NAMES[number] for number in sorted(present)}


def _of_classes(found: Basins) -> tuple[Any, Any]:
    fate, period = np.zeros(1 << 16, np.uint8), np.zeros(1 << 16, np.uint16)
    for number in found.fates:
        fate[CLASS_OF_FATE[number]] = number
    for one in found.attractors:
        fate[one.number], period[one.number] = one.fate, one.period
    return fate, period


def _each_attractor(found: Basins, states: int) -> dict[str, Any]:
    them = found.attractors
    longest = max([len(one.points) for one in them], default=0)
    points = np.full((len(them), longest, states), np.nan)
    for row, one in zip(points, them, strict=True):
        row[: len(one.points)] = one.points

    def along(values: list[Any], meaning: str, kind: type) -> tuple[str, Any, dict[str, str]]:
        return "number", np.array(values, kind), {"long_name": meaning}

    boxes = {
        name: (
            ("number", "state"),
            np.array([getattr(one, field) for one in them]).reshape(len(them), states),
        )
        for name, field in (("lowest", "low"), ("highest", "high"), ("mean", "mean"))
    }
    return {
        "share": along([one.share for one in them], "share of the box of starts", float),
        "share_error": along([one.error for one in them], "standard error of the share, binomial", float),
        "starts_reaching": along([one.orbits for one in them], "starts that reach the attractor", np.int64),
        "kind": along([one.fate for one in them], "fate of the attractor", np.uint8),
        "period_of": along([one.period for one in them], "least period, 0 without a cycle", np.uint16),
        **boxes,
        "points": (("number", "point", "state"), points, {"long_name": "points of the cycle"}),
    }
