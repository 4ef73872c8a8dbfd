"""What is to be made of points: plates and tile sets as records, their options read like keys of a config."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from atlas.config.keys import PLATE_KEYS, TILE_SET_KEYS
from atlas.config.names import checked_name
from atlas.config.view_kind import checked_palette
from atlas.figure.lettering import axis_text, plain
from atlas.figure.panels import PlateRequest
from atlas.points.tables import Table
from atlas.reading.place import Place
from atlas.reading.section import Key, read_section
from atlas.reading.sheet import Size
from atlas.reading.view_kinds import AxisKind, Levels, Pairs
from tiles.grid import TILE
from tiles.window import Axis, View

_OF_ORBITS = {"family", "across", "up", "set", "starts", "transient", "transient_limit", "samples"}
_OF_ORBITS |= {"values_per_column", "longest_period", "formats", "inset", "draw", "follow", "record", "steps"}
_OF_ORBITS |= {"by_attractor", "extinct", "supersampling"}
PLATE_OPTIONS: tuple[Key[Any], ...] = tuple(key for key in PLATE_KEYS if key.name not in _OF_ORBITS)
TILE_SET_OPTIONS: tuple[Key[Any], ...] = tuple(key for key in TILE_SET_KEYS if key.name not in _OF_ORBITS)


@dataclass(frozen=True, kw_only=True)
class PointsJob:
    """One view of points and how their density is shaded; see `atlas.config.jobs.Job`."""

    name: str
    view: View
    shading: str
    palette: str
    background: str | None
    missing: str | None
    title: str | None


@dataclass(frozen=True, kw_only=True)
class PointsPlate(PointsJob):
    """A figure at a print size; see `atlas.config.jobs.Plate`."""

    size: Size
    dpi: int
    font_size: float
    key: bool
    letter: str | None

    def request(self) -> PlateRequest:
        """Return what the layout needs to know."""
        width, height = self.size.pixels(self.dpi)
        return PlateRequest(
            self.name,
            self.view,
            width,
            height,
            self.dpi,
            self.font_size,
            self.key,
            self.letter,
            self.title or "",
        )


@dataclass(frozen=True, kw_only=True)
class PointsTileSet(PointsJob):
    """One view as a pyramid of tiles; see `atlas.config.jobs.TileSet`."""

    levels: Levels
    pairs: str | Pairs

    @property
    def cells(self) -> tuple[int, int]:
        """Columns and rows at the deepest levels."""
        return TILE << self.levels.across, TILE << self.levels.up


def options_of(keys: tuple[Key[Any], ...], given: Mapping[str, Any], place: Place) -> dict[str, Any]:
    """Return the value of every option; one that is None takes its default, the palette that of densities.

    Raises
    ------
    ConfigRefused
        For an unknown option and for a wrong value.
    """
    found = read_section(keys, {name: value for name, value in given.items() if value is not None}, place)
    palette = checked_palette("density", found["palette"], True, place.at("palette"))
    return found | {"palette": palette}


def settings_of(job: PointsPlate | PointsTileSet) -> dict[str, Any]:
    """Return all settings of a job as JSON holds them, numbers as text."""
    keys = PLATE_OPTIONS if isinstance(job, PointsPlate) else TILE_SET_OPTIONS
    return view_of_record(job.view) | {key.name: key.write(getattr(job, key.name)) for key in keys}


def view_of_record(view: View) -> dict[str, Any]:
    """Return the two axes as JSON holds them."""
    return {"across": AxisKind().write(view.across), "up": AxisKind().write(view.up)}


def name_of(given: str | None, table: Table, place: Place) -> str:
    """Return the name of an output: as given, else from that of the file.

    Raises
    ------
    ConfigRefused
        When it could not be a file or folder everywhere.
    """
    stem = (table.file or "points").rpartition(".")[0] or "points"
    proposed = re.sub(r"[^A-Za-z0-9_.-]+", "_", stem).lstrip("-.")[:100]
    return checked_name(given or proposed or "points", place.at("name"))


def axis_label(axis: Axis) -> str:
    """Return an axis' label as a figure prints it: its own, else the name of the column."""
    return plain(axis.label) if axis.label else axis_text(axis.name, axis.name)


def caption(up: Axis) -> str:
    """Return what the colour key of a page shows."""
    unit = f"ln {up.name}" if up.scale == "log" else up.name
    return f"density (share of the column's points per unit of {unit})"
