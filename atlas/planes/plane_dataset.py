"""Parameter planes for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from hashlib import blake2b
from typing import Any

import numpy as np

from atlas.config.digests import decisive
from atlas.config.draws import PLANE_DRAWS
from atlas.config.load import plate_from_parts
from atlas.config.view_kind import checked_draw
from atlas.families.map_family import Family
from atlas.orbits.schedule import schedule
from atlas.output.certificate import as_text, certificate
from atlas.output.certificate_reader import KEY
from atlas.output.dataset_parts import KIND, Number, axis_attributes, cells_of
from atlas.plan import check_layers, parse_memory
from atlas.planes.fates import FATES
from atlas.planes.layers import LAYERS, Values
from atlas.planes.searching import finder_of
from atlas.planes.survey import Tally, whole_plane
from atlas.reading.place import REQUEST, Place, shown
from tiles.errors import nearest
from tiles.window import View


def parameter_plane(
    family: Family,
    view: View,
    *,
    size: tuple[int, int],
    layers: Sequence[str] = ("fate", "period"),
    set: Mapping[str, Any] | None = None,
    starts: Sequence[Mapping[str, Number]] | Mapping[str, Any] | None = None,
    transient: int = 1000,
    steps: int = 2000,
    transient_limit: int | None = None,
    longest_period: int = 64,
    extinct: Mapping[str, Number] | None = None,
    workers: int | None = None,
    memory: str | int | None = None,
) -> Any:
    """Find what becomes of orbits over two parameters.

    Parameters
    ----------
    family : Family
        From `atlas.family` or `atlas.load(path).families`.
    view : View
        A parameter across, another one up.
    size : (int, int)
        Columns and rows. Every pixel is looked at at its exact centre.
    layers : sequence of str
        Out of ``fate``, ``period``, ``lyapunov``, ``lyapunov_2``, ``lyapunov_error``, ``rotation``,
        ``escape`` and ``attractors``.
    set : mapping of str to number, optional
        Parameters that differ from their defaults; ``{"r": {"pattern": ["a", "b"]}}`` gives a pattern another
        word.
    starts : sequence of mappings of str to number, optional
        Initial conditions; by default the family's own. All layers but ``attractors`` are those of the first.
    transient, steps : int
        Steps before the exponents are measured, and in which they are.
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
        The layers on both axes, up first. ``fate`` (uint8) holds codes; the attributes ``flag_values`` and
        ``flag_meanings`` of the variable (CF conventions) and ``fate_names`` of the Dataset name them.
        ``period`` (uint16) is 1 for a fixed point and 0 where the fate has none. Exponents are in natural
        logarithms per step, NaN where the orbit escapes or is extinct; ``rotation`` is in turns per step, NaN
        where there is none; ``escape`` is in steps, NaN where the orbit stays. How fates are decided stands
        in `atlas.planes.fates`. The certificate is in the attribute ``atlas-certificate``.

    Raises
    ------
    Refusal
        For axes, layers, parameters or starts that the family does not have, a size beyond the memory budget,
        and a window finer than float64 resolves.

    Examples
    --------
    >>> import atlas
    >>> view = atlas.View(across=("a", "-0.2", "1.5"), up=("b", -1, 1))
    >>> ds = atlas.parameter_plane(atlas.family("henon"), view, size=(12, 8))
    >>> ds.fate.dims
    ('b', 'a')
    """
    place = REQUEST
    if not isinstance(view, View):
        raise place.at("view").refusal(f"{shown(view)} is no view; write atlas.View(across=..., up=...)")
    columns, rows = cells_of(size, place.at("size"))
    names = _named(layers, place.at("layers"))
    job = plate_from_parts(
        family,
        view.across,
        view.up,
        set=set,
        starts=starts,
        name="dataset",
        place=place,
        draw="fate",
        transient=transient,
        steps=steps,
        transient_limit=transient_limit,
        longest_period=longest_period,
        extinct=extinct,
    )
    for name in names:
        if name in PLANE_DRAWS:
            checked_draw(job.family, job.view, name, place.at("layers"))
    check_layers(
        (columns, rows), [np.dtype(LAYERS[name].kind).itemsize for name in names], parse_memory(memory)
    )
    finder = finder_of(job, columns, rows)
    with schedule(workers) as opened:
        found, tally = whole_plane(finder, names, opened)
    return _dataset(job, found, tally)


def _named(layers: Any, place: Place) -> tuple[str, ...]:
    """Return the names of layers, each once."""
    if isinstance(layers, str) or not isinstance(layers, Iterable):
        raise place.refusal(f"{shown(layers)} are no layers; name some of {', '.join(LAYERS)}")
    names = list(layers)
    for name in names:
        if not isinstance(name, str) or name not in LAYERS:
            raise place.refusal(f"{shown(name)} is no layer{nearest(str(name), LAYERS)}")
    if not names:
        raise place.refusal(f"there are no layers; name some of {', '.join(LAYERS)}")
    return tuple(dict.fromkeys(str(name) for name in names))


def _dataset(job: Any, found: Mapping[str, Values], tally: Tally) -> Any:
    import xarray

    family, view = job.family, job.view
    columns, rows = next(iter(found.values())).shape
    dims = (view.up.name, view.across.name)
    state = blake2b(digest_size=16)
    for values in found.values():
        state.update(np.ascontiguousarray(values, values.dtype.newbyteorder("<")).data)
    config = {"kind": KIND, **decisive(job), "layers": list(found), "resolution": [columns, rows]}
    sampled = {"columns": columns, "rows": rows}
    record = certificate(KIND, family.name, config, state.hexdigest(), tally.shares(), sampled)
    made = xarray.Dataset(
        {
            name: (dims, np.ascontiguousarray(values.T), {"long_name": LAYERS[name].meaning})
            for name, values in found.items()
        },
        coords={view.up.name: view.up.centres(rows), view.across.name: view.across.centres(columns)},
        attrs={
            "family": family.name,
            "formula": "; ".join(family.formula_lines()),
            "fate_codes": list(range(len(FATES))),
            "fate_names": list(FATES),
            "counts_digest": state.hexdigest(),
            KEY: as_text(record),
        },
    )
    if "fate" in made:
        made.fate.attrs |= {
            "flag_values": np.arange(len(FATES), dtype=np.uint8),
            "flag_meanings": " ".join(name.replace(" ", "_") for name in FATES),
        }
    for axis in (view.across, view.up):
        made[axis.name].attrs = axis_attributes(axis, *family.label_and_unit(axis.name))
    return made
