"""Lyapunov spectra for notebooks: labelled xarray Datasets."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from decimal import Decimal
from fractions import Fraction
from hashlib import blake2b
from typing import Any

import numpy as np

from atlas.config.settings import SettingsKind
from atlas.config.view_rules import checked_set, checked_starts, with_patterns
from atlas.families.map_family import Family
from atlas.output.certificate import as_text, certificate
from atlas.output.certificate_reader import KEY
from atlas.planes.exponents import Spectra
from atlas.planes.fates import ESCAPES, FATES, UNSETTLED
from atlas.planes.pixels import BATCHES, FateRules
from atlas.reading.kinds import Whole
from atlas.reading.place import REQUEST, shown
from atlas.reading.start_kinds import StartsKind
from tiles.number import Exact

Number = str | int | float | Fraction | Decimal | Exact
KIND = "dataset"
MOST_STEPS = 10**12
LIMIT = 1_000_000


def lyapunov_spectrum(
    family: Family,
    parameters: Mapping[str, Any] | None = None,
    starts: Sequence[Mapping[str, Number]] | Mapping[str, Any] | None = None,
    steps: int = 100_000,
    transient: int = 1000,
    *,
    transient_limit: int | None = None,
    longest_period: int = 64,
) -> Any:
    """Measure all Lyapunov exponents at one setting of the parameters, with standard errors.

    Parameters
    ----------
    family : Family
        From `atlas.family` or `atlas.load(path).families`.
    parameters : mapping of str to number, optional
        Parameters that differ from their defaults; ``{"r": {"pattern": ["a", "b"]}}`` gives a pattern another
        word.
    starts : sequence of mappings of str to number, or mapping, optional
        Initial conditions, or ``{"grid": [8, 8], "box": {"x": [0, 1], "y": [0, 1]}}``; by default the
        family's own. Each is measured by itself.
    steps : int
        Steps in which the exponents are measured, at least 64; of them the largest multiple of 16 (of 16
        patterns where parameters follow one) is taken.
    transient : int
        Steps before.
    transient_limit : int, optional
        Steps up to which orbits that approach a cycle are run on; 1 000 000 by default.
    longest_period : int
        Longest cycle looked for. The exponents of a cycle are those of its multipliers, without error.

    Returns
    -------
    xarray.Dataset
        On the dimensions (start, exponent), the largest exponent first: ``lyapunov`` in natural logarithms
        per step, and ``error``, its standard error by the means of 16 batches (which tells how far exponents
        scatter, not how long the orbit would need to see its whole attractor). On start: ``sum`` of the
        exponents, ``dimension`` by Kaplan and Yorke (`atlas.planes.exponents.kaplan_yorke`; exponents within
        3 errors + ln(steps) / steps of 0 are taken as 0), ``fate`` (codes; ``flag_meanings`` names them,
        `atlas.planes.fates` says how they are decided) and ``period``, 0 but on a cycle. ``initial`` on
        (start, variable) holds the starts. Exponents of orbits that escape are NaN. The certificate is in the
        attribute ``atlas-certificate``.

    Raises
    ------
    Refusal
        For parameters or starts that the family does not have, and numbers of steps out of range.

    Examples
    --------
    >>> import atlas
    >>> ds = atlas.lyapunov_spectrum(atlas.family("henon"), {"a": "1.4"}, steps=6400)
    >>> float(ds["sum"][0].round(9)), ds.lyapunov.dims
    (-1.203972804, ('start', 'exponent'))
    """
    place = REQUEST
    if not isinstance(family, Family):
        raise place.at("family").refusal(f"{shown(family)} is no family; write atlas.family(...)")
    spot = place.at("parameters")
    given = SettingsKind().read(parameters or {}, spot)
    family = with_patterns(family, given, spot)
    values = checked_set(family, given, None, spot)
    spot = place.at("starts")
    begin = checked_starts(family, None if starts is None else StartsKind().read(starts, spot), spot)
    before = Whole(0, MOST_STEPS).read(transient, place.at("transient"))
    limit = LIMIT if transient_limit is None else transient_limit
    rules = FateRules(
        transient=before,
        steps=Whole(64, MOST_STEPS).read(steps, place.at("steps")),
        transient_limit=max(before, Whole(0, MOST_STEPS).read(limit, place.at("transient_limit"))),
        longest_period=Whole(1, 4096).read(longest_period, place.at("longest_period")),
    )
    found = Spectra(family, rules, set=values, starts=begin)
    found.run()
    return _dataset(family, values, begin, rules, found)


def _dataset(
    family: Family,
    values: Mapping[str, Exact],
    starts: Sequence[Mapping[str, Exact]],
    rules: FateRules,
    found: Spectra,
) -> Any:
    import xarray

    table = {
        "lyapunov": (("start", "exponent"), found.exponents.T.copy()),
        "error": (("start", "exponent"), found.errors.T.copy()),
        "sum": ("start", found.sums),
        "dimension": ("start", found.dimensions()),
        "fate": ("start", found.fate),
        "period": ("start", found.period),
        "initial": (("start", "variable"), found.start.T.copy()),
    }
    state = blake2b(digest_size=16)
    for _, array in table.values():
        state.update(np.ascontiguousarray(array, array.dtype.newbyteorder("<")).data)
    digest = state.hexdigest()
    made = xarray.Dataset(
        table,
        coords={
            "start": np.arange(1, len(starts) + 1),
            "exponent": np.arange(1, len(family.states) + 1),
            "variable": list(family.state_names),
        },
        attrs={
            "family": family.name,
            "formula": "; ".join(family.formula_lines()),
            "steps": rules.steps,
            "batches": BATCHES,
            "counts_digest": digest,
            KEY: as_text(_certificate(family, values, starts, rules, found, digest)),
        },
    )
    made.lyapunov.attrs = {"long_name": "Lyapunov exponent", "units": "per step"}
    made.error.attrs = {"long_name": "standard error of the Lyapunov exponent", "units": "per step"}
    made["sum"].attrs = {"long_name": "sum of the Lyapunov exponents", "units": "per step"}
    made.dimension.attrs = {"long_name": "Kaplan-Yorke dimension"}
    made.fate.attrs = {
        "long_name": "fate",
        "flag_values": np.arange(len(FATES), dtype=np.uint8),
        "flag_meanings": " ".join(name.replace(" ", "_") for name in FATES),
    }
    return made


def _certificate(
    family: Family,
    values: Mapping[str, Exact],
    starts: Sequence[Mapping[str, Exact]],
    rules: FateRules,
    found: Spectra,
    digest: str,
) -> dict[str, Any]:
    settings = {
        "family": family.name,
        "set": {name: str(value) for name, value in values.items()},
        "starts": [{name: str(value) for name, value in start.items()} for start in starts],
        "steps": rules.steps,
        "transient": rules.transient,
        "transient_limit": rules.transient_limit,
        "longest_period": rules.longest_period,
    }
    config = {
        "kind": KIND,
        "family": {**family.as_config(), "name": family.name},
        "settings": settings,
    }
    shares = {
        "escaped": float((found.fate == ESCAPES).mean()),
        "unsettled": float((found.fate == UNSETTLED).mean()),
        "collapsed_orbits": int(found.collapsed.sum()),
        "orbits_on_repelling_start": int(found.repelling.sum()),
    }
    return certificate(KIND, family.name, config, digest, shares, {"starts": len(starts)})
