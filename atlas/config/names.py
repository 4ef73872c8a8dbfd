"""Names of outputs: they become names of files and folders on every system."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from atlas.config.keys import FORMATS
from atlas.reading.place import Place, shown

NAME_PATTERN = r"[A-Za-z0-9_][A-Za-z0-9_.-]{0,99}"
# Device names that Windows keeps for itself, whatever stands after the first dot.
_RESERVED = frozenset(
    [
        "con",
        "prn",
        "aux",
        "nul",
        *(f"{device}{number}" for device in ("com", "lpt") for number in range(1, 10)),
    ]
)


def checked_name(name: str, place: Place) -> str:
    """Return the name of an output, or refuse one that could not be a file or folder everywhere."""
    if not re.fullmatch(NAME_PATTERN, name):
        raise place.refusal(
            f"{shown(name)} cannot name an output; use letters a to z, digits, '_', '-' and '.', "
            "neither '-' nor '.' first, at most 100 in all"
        )
    lowered = name.lower()
    if lowered.split(".")[0] in _RESERVED:
        raise place.refusal(f"{shown(name)} is a name that Windows reserves; choose another")
    if lowered.endswith((".", *FORMATS.values())):
        raise place.refusal(f"{shown(name)} ends like a file of its own; leave the ending away")
    return name


def check_distinct(sections: Mapping[str, Sequence[str]], place: Place) -> None:
    """Refuse outputs whose files would overwrite each other where upper and lower case are the same."""
    seen: dict[str, str] = {}
    for section, names in sections.items():
        for name in names:
            path = f"{section}.{name}"
            other = seen.setdefault(name.lower(), path)
            if other != path:
                raise (
                    place.at(section)
                    .at(name)
                    .refusal(f"{other} has this name already; outputs share a folder, so each needs its own")
                )
