"""The certificate of what was made of points, and what a sentence says of points that are not drawn."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from atlas.errors import shown
from atlas.output.certificate import certificate
from atlas.points.counting import Reading
from atlas.points.jobs import view_of_record

KIND = "points"


@dataclass(frozen=True)
class Binned:
    """What became of points.

    Attributes
    ----------
    record : dict
        The certificate.
    left_out : str
        One sentence about the points that no cell holds; empty when every point is drawn.
    """

    record: dict[str, Any]
    left_out: str


def binned(name: str, settings: Mapping[str, Any], reading: Reading, counts_digest: str) -> Binned:
    """Return what became of the points of a finished reading.

    Parameters
    ----------
    name : str
        Of the output.
    settings : mapping
        Its settings as JSON holds them.
    reading : Reading
    counts_digest : str
    """
    made = certificate(
        KIND, name, points_config(name, settings, reading), counts_digest, shares(reading), samples(reading)
    )
    return Binned(made, left_out(reading))


def points_config(name: str, settings: Mapping[str, Any], reading: Reading) -> dict[str, Any]:
    """Return what decides an output of points: the view, the columns, the resolution, the points' digest."""
    grid, table = reading.grid, reading.table
    return {
        "kind": KIND,
        "name": name,
        "settings": view_of_record(grid.view) | dict(settings),
        "resolution": [grid.across.count, grid.up.count],
        "points": {
            "file": table.file,
            "digest": reading.digest,
            "columns": {"across": grid.view.across.name, "up": grid.view.up.name},
        },
    }


def shares(reading: Reading) -> dict[str, float]:
    """Return which shares of all points lie in no cell, and why."""
    account = reading.account
    return {
        name: number / account.points
        for name, number in {
            "missing": account.missing,
            "across_below": account.before,
            "across_above": account.beyond,
            "below": account.below,
            "above": account.above,
        }.items()
    }


def samples(reading: Reading) -> dict[str, int]:
    """Return how many points there are, and into how many cells they were counted."""
    account, grid = reading.account, reading.grid
    return {
        "columns": grid.across.count,
        "rows": grid.up.count,
        "points": account.points,
        "within_across": account.within,
        "inside": account.within - account.below - account.above,
    }


def left_out(reading: Reading) -> str:
    """Return one sentence about the points that no cell holds; empty when there are none."""
    account, view = reading.account, reading.grid.view
    parts = []
    if account.missing:
        parts.append(f"{account.missing} lack a number in {shown(view.across.name)} or {shown(view.up.name)}")
    for axis, outside in (
        (view.across, account.before + account.beyond),
        (view.up, account.below + account.above),
    ):
        if outside:
            parts.append(f"{outside} lie outside {shown(axis.name)} from {axis.low} to {axis.high}")
    if not parts:
        return ""
    text = parts[0] if len(parts) == 1 else f"{', '.join(parts[:-1])} and {parts[-1]}"
    return f"{reading.table.where}: of {account.points} points {text}; these are counted, not drawn"
