"""From the words of ``atlas bin`` to a plate or a tile set of points."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from atlas.errors import ConfigRefused, shown
from atlas.output.reporter import Reporter
from atlas.points.plates import draw_points
from atlas.points.tile_sets import tile_points
from atlas.reading.kinds import Text, Word
from atlas.reading.place import COMMAND_LINE

PICTURE_ONLY = ("size", "dpi", "key")
Done = tuple[Sequence[Path], str]


def picture_of_points(points: Path, out: tuple[Path, ...], reporter: Reporter, **given: Any) -> Done:
    """Draw a plate; return its files and a sentence about points that are not drawn."""
    _refuse(given, ("pairs",), "belongs to a tile set; add --levels")
    del given["levels"], given["pairs"], given["workers"]
    across, up = _axes(given)
    made = draw_points(points, across, up, out, reporter=reporter, place=COMMAND_LINE, **given)
    return out, made.left_out


def tile_set_of_points(points: Path, out: tuple[Path, ...], reporter: Reporter, **given: Any) -> Done:
    """Make a tile set; return its page and a sentence about points that are not drawn."""
    _refuse(given, PICTURE_ONLY, "belongs to a picture and --levels makes a tile set; leave one away")
    if len(out) > 1:
        raise ConfigRefused("--out: a tile set goes into one folder; give --out once")
    for key in PICTURE_ONLY:
        del given[key]
    given["levels"] = _levels(given["levels"])
    across, up = _axes(given)
    made = tile_points(points, across, up, out[0], reporter=reporter, place=COMMAND_LINE, **given)
    return [out[0] / made.record["name"] / "site" / "index.html"], made.left_out


def _axes(given: dict[str, Any]) -> list[dict[str, Any]]:
    """Take the axes with their scales and labels out of the options."""
    axes = []
    for axis in ("across", "up"):
        found = given.pop(axis)
        for key, kind in (("scale", Word(("linear", "log"))), ("label", Text())):
            option = f"{key}_{axis}"
            value = given.pop(option)
            if value is not None:
                found = {**found, key: kind.read(value, COMMAND_LINE.at(option))}
        axes.append(found)
    return axes


def _levels(text: str) -> Any:
    """Return ``N`` as it is and ``N,N`` as a mapping."""
    across, comma, up = text.partition(",")
    if comma and not (across.strip() and up.strip()):
        raise ConfigRefused(f"--levels: {shown(text)} is no pair of levels; write for instance 6,10")
    return {"across": across.strip(), "up": up.strip()} if comma else text


def _refuse(given: dict[str, Any], options: tuple[str, ...], reason: str) -> None:
    for option in options:
        if given[option] is not None:
            raise ConfigRefused(f"--{option}: this {reason}")
