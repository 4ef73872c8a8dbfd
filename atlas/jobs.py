"""What is to be made: plates, tile sets and figures as records, and the digests that tell them apart."""

from __future__ import annotations

import json
from dataclasses import dataclass, field, replace
from hashlib import blake2b
from typing import Any

from atlas.families import Family
from atlas.keys import FIGURE_KEYS, JOB_KEYS, PLATE_KEYS, TILE_SET_KEYS
from atlas.section import Key
from atlas.sheet import Inset, Size
from atlas.sheet_kinds import Panels
from atlas.view_kinds import Levels, Pairs
from tiles.grid import TILE
from tiles.number import Exact
from tiles.window import Axis, View

COUNTING_VERSION = 1
_PRINTED_ONLY = {"name", "title", "source", "note", "across", "up"}
_GIVEN_ELSEWHERE = {"label", "unit", "domain", "start", "default"}


@dataclass(frozen=True, kw_only=True)
class Job:
    """One view of one family, how its orbits are run and how their density is shaded.

    Attributes
    ----------
    name : str
        Name of the output.
    family : Family
        The map.
    view : View
        A parameter across and a state variable up.
    set : dict of str to Exact
        Parameters given a value, sorted by name.
    starts : tuple of dict of str to Exact
        States that the orbits start from, each complete.
    transient, transient_limit : int
        Steps left out before sampling, and the number to which they are extended at most.
    samples : int or "auto"
        Samples of each orbit.
    values_per_column : int
        Parameter values in each column.
    longest_period : int
        Longest cycle looked for.
    shading, palette : str
        Names out of `tiles.shading.SHADINGS` and `tiles.palette.PALETTES`.
    background, missing : str or None
        Colours ``#rrggbb``; None is the palette's own.
    title : str or None
        Title of the picture or page.
    """

    name: str
    family: Family
    view: View
    set: dict[str, Exact] = field(default_factory=dict)
    starts: tuple[dict[str, Exact], ...]
    transient: int
    transient_limit: int
    samples: int | str
    values_per_column: int
    longest_period: int
    shading: str
    palette: str
    background: str | None
    missing: str | None
    title: str | None

    @property
    def across(self) -> Axis:
        """The horizontal axis."""
        return self.view.across

    @property
    def up(self) -> Axis:
        """The vertical axis."""
        return self.view.up

    def parameters(self) -> dict[str, Exact]:
        """Return the value of every parameter that runs along no axis, given or the family's default."""
        axes = (self.across.name, self.up.name)
        return {
            parameter.name: self.set.get(parameter.name, parameter.default)
            for parameter in self.family.parameters
            if parameter.name not in axes
        }


@dataclass(frozen=True, kw_only=True)
class Plate(Job):
    """A figure at a print size.

    Attributes
    ----------
    size : Size
        Of the whole sheet.
    dpi : int
        Pixels per inch.
    formats : tuple of str
        Out of `atlas.keys.FORMATS`.
    font_size : float
        In points.
    key : bool
        Whether a colour key is drawn.
    letter : str or None
        Panel letter.
    inset : Inset or None
        A magnified part of the window.
    """

    size: Size
    dpi: int
    formats: tuple[str, ...]
    font_size: float
    key: bool
    letter: str | None
    inset: Inset | None

    @property
    def pixels(self) -> tuple[int, int]:
        """Width and height of the sheet in pixels."""
        return self.size.pixels(self.dpi)

    def inset_plate(self) -> Plate | None:
        """Return the plate whose window is the inset of this one, to be counted by itself."""
        if self.inset is None:
            return None
        return replace(self, name=f"{self.name}/inset", view=self.inset.view, inset=None)


@dataclass(frozen=True, kw_only=True)
class TileSet(Job):
    """One view as a pyramid of tiles with its index and page.

    Attributes
    ----------
    levels : Levels
        Deepest level across and up.
    pairs : "diagonal", "all" or tuple of (int, int)
        Which level pairs are built.
    """

    levels: Levels
    pairs: str | Pairs

    @property
    def cells(self) -> tuple[int, int]:
        """Columns and rows at the deepest levels."""
        return TILE << self.levels.across, TILE << self.levels.up


@dataclass(frozen=True, kw_only=True)
class Figure:
    """Several plates as panels of one sheet.

    Attributes
    ----------
    name : str
        Name of the output.
    panels : tuple of tuple of str
        Names of plates, row by row from the top.
    plates : dict of str to Plate
        The plates by name, in the order of the panels.
    share : tuple of str
        ``across``: panels above each other have equal across axes, labelled once; ``up``: panels side by
        side have equal up axes, labelled once.
    letters : bool
        Whether panels carry letters.
    size, dpi, formats, font_size, title
        As for a plate; they hold for the whole sheet instead of what the plates say.
    """

    name: str
    panels: Panels
    plates: dict[str, Plate]
    share: tuple[str, ...]
    letters: bool
    size: Size
    dpi: int
    formats: tuple[str, ...]
    font_size: float
    title: str | None

    @property
    def pixels(self) -> tuple[int, int]:
        """Width and height of the sheet in pixels."""
        return self.size.pixels(self.dpi)


def normalised(record: Plate | TileSet | Figure) -> dict[str, Any]:
    """Return everything that an output depends on, as JSON holds it, numbers as text.

    Equal records give equal results however their config was written. For a plate or a tile set the keys
    are ``kind``, ``name``, ``settings`` (the keys of a config, all present) and ``family`` (its config and
    its ``name``); for a figure ``kind``, ``name``, ``settings`` and ``plates``.
    `atlas.config.from_normalised` makes the record again.
    """
    if isinstance(record, Figure):
        return {
            "kind": "figure",
            "name": record.name,
            "plates": {name: normalised(plate) for name, plate in record.plates.items()},
            "settings": _written(FIGURE_KEYS, record),
        }
    keys, kind = (PLATE_KEYS, "plate") if isinstance(record, Plate) else (TILE_SET_KEYS, "tile set")
    return {
        "family": {**record.family.as_config(), "name": record.family.name},
        "kind": kind,
        "name": record.name,
        "settings": _written(keys, record),
    }


def digest(record: Plate | TileSet | Figure) -> str:
    """Return a digest of everything that an output depends on, as 32 hexadecimal digits."""
    return _hashed({"counting": COUNTING_VERSION, "output": normalised(record)})


def counting_digest(job: Job, columns: int, rows: int, *, samples: int | None = None) -> str:
    """Return a digest of what decides the counts of a job, as 32 hexadecimal digits.

    Names, titles, labels, sizes and colours do not enter; neither does how a value was given (by ``set`` or
    by the family's default).

    Parameters
    ----------
    job : Job
        A plate or a tile set.
    columns, rows : int
        The resolution at which it is counted.
    samples : int, optional
        What ``samples: auto`` comes to at this resolution.
    """
    decisive = {key.name: _value(key, job) for key in JOB_KEYS if key.counts}
    decisive |= {
        "across": _interval(job.across),
        "up": _interval(job.up),
        "family": _mathematics(job.family),
        "set": {name: str(value) for name, value in job.parameters().items()},
        "resolution": [columns, rows],
        "counting": COUNTING_VERSION,
    }
    if samples is not None:
        decisive["samples"] = samples
    return _hashed(decisive)


def _written(keys: tuple[Key[Any], ...], record: Plate | TileSet | Figure) -> dict[str, Any]:
    return {key.name: _value(key, record) for key in sorted(keys, key=lambda key: key.name)}


def _value(key: Key[Any], record: Job | Figure) -> Any:
    if key.name == "family" and isinstance(record, Job):
        return record.family.name
    return key.write(getattr(record, key.name))


def _interval(axis: Axis) -> list[str]:
    return [axis.name, str(axis.low), str(axis.high), axis.scale]


def _mathematics(family: Family) -> dict[str, Any]:
    config = {key: value for key, value in family.as_config().items() if key not in _PRINTED_ONLY}
    for section in ("state", "parameters"):
        config[section] = {
            name: {key: value for key, value in entry.items() if key not in _GIVEN_ELSEWHERE}
            for name, entry in config.get(section, {}).items()
        }
    return config


def _hashed(content: Any) -> str:
    text = json.dumps(content, sort_keys=True, ensure_ascii=True, separators=(",", ":"))
    return blake2b(text.encode("ascii"), digest_size=16).hexdigest()
