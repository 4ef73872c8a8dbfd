"""The catalogue: families of iterated maps from the literature, one row of data each."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from typing import Any

from atlas.errors import FamilyRefused, shown
from atlas.families.map_family import Family
from atlas.families.reader import family_from_config
from atlas.families.rows_one_variable import ONE_VARIABLE
from atlas.families.rows_several_variables import SEVERAL_VARIABLES
from tiles.errors import nearest

ROWS: Mapping[str, Mapping[str, Any]] = {**ONE_VARIABLE, **SEVERAL_VARIABLES}
NAMES: tuple[str, ...] = tuple(ROWS)


@cache
def family(name: str) -> Family:
    """Return a family of the catalogue.

    Parameters
    ----------
    name : str
        One of :data:`NAMES`.

    Returns
    -------
    Family

    Raises
    ------
    FamilyRefused
        When there is no such family.

    Examples
    --------
    >>> family("ricker").parameter_names
    ('r',)
    """
    if name not in ROWS:
        raise FamilyRefused(f"there is no family {shown(name)} in the catalogue{nearest(str(name), NAMES)}")
    return family_from_config(name, ROWS[name], where=f"catalogue: {name}")
