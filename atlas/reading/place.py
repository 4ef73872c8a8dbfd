"""Where in a request something stands, and how a value found there is shown in a sentence."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from atlas import errors
from atlas.errors import ConfigRefused

LONGEST_NUMBER = 200
_OPTIONS = {"starts": "start"}


@dataclass(frozen=True)
class Place:
    """A file and a path of keys, or an option of a command.

    Attributes
    ----------
    file : str
        The file as the user named it; empty when the request came from Python.
    path : tuple of str
        Keys from the top of the file down to the value.
    option : bool
        Whether the first key is shown as an option of a command (``--dpi``).

    Examples
    --------
    >>> str(Place("fishery.yaml").at("plates").at("growth"))
    'fishery.yaml: plates.growth'
    >>> str(COMMAND_LINE.at("values_per_column"))
    '--values-per-column'
    """

    file: str = ""
    path: tuple[str, ...] = ()
    option: bool = False

    def at(self, key: str | int) -> Place:
        """Return the place of a key, or of a numbered entry (counted from 1), below this one."""
        step = f"[{key}]" if isinstance(key, int) else brief(key)
        return replace(self, path=(*self.path, step))

    def __str__(self) -> str:
        keys = list(self.path)
        if self.option and keys:
            keys[0] = "--" + _OPTIONS.get(keys[0], keys[0]).replace("_", "-")
        path = ".".join(keys).replace(".[", "[")
        return ": ".join(part for part in (self.file, path) if part) or (
            "command line" if self.option else "request"
        )

    def refusal(self, sentence: str) -> ConfigRefused:
        """Return the refusal that says ``sentence`` about this place."""
        return ConfigRefused(f"{self}: {sentence}")


COMMAND_LINE = Place(option=True)
REQUEST = Place()
"""A call from Python, whose refusals name the keyword."""


def path_of(given: Any, place: Place) -> Path:
    """Return what was given as a path, refused when it is none."""
    if isinstance(given, str | os.PathLike):
        return Path(given)
    raise place.refusal(f"{shown(given)} is no path; write a text such as 'fishery.yaml' or a Path")


def brief(text: str) -> str:
    """Return a text on one line, printable and short enough to stand in a path of keys."""
    return errors.shown(text)[1:-1]


def shown(value: Any) -> str:
    """Return how a value of any type that was found is named in a sentence."""
    if isinstance(value, list | tuple) and not value:
        return "an empty list"
    if value is None or isinstance(value, str | dict | list | tuple):
        return errors.shown(value)
    if isinstance(value, int) and value.bit_length() > LONGEST_NUMBER:
        return f"a whole number of {value.bit_length()} bits"
    if isinstance(value, int | float):
        return f"'{value}'"
    return "a mapping" if isinstance(value, Mapping) else f"a value of type {brief(type(value).__name__)}"
