"""What the page of a tile set needs to know: the dictionary that ``meta.js`` assigns."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles.grid import TILE, Pair
from tiles.number import Exact
from tiles.shading import LEVELS, MISSING, Fit, key_labels
from tiles.window import Axis, View

VERSION = 1
LAYER = "density"

Runs = Iterable[tuple[int, int]]


def meta(
    header: Mapping[str, Any],
    view: View,
    present: Mapping[Pair, Mapping[int, Runs]],
    fit: Fit,
    table: NDArray[np.uint8],
    *,
    marks: tuple[int, Runs] | None = None,
    certificate: Mapping[str, Any] | None = None,
) -> dict[str, Any]:
    """Return the description of a tile set that its page reads.

    Parameters
    ----------
    header : mapping
        Of the index: ``title``, ``family``, ``formula`` (lines), ``note``, ``labels`` and ``units`` (by axis
        name), ``caption`` of the colour key, ``plate`` (what a config needs beside the axes to draw the
        view, or with the key ``points`` a file of points) and ``families`` (by name, those that the plate
        needs and no catalogue has, as a config holds them), each optional.
    view : View
    present : mapping
        For each built level pair and tile column the runs (first row, last row) of tiles that are not empty.
    fit : Fit
    table : ndarray of uint8, shape (LEVELS + 2, 3)
        Colours of the palette indices.
    marks : (int, runs), optional
        Across level, and runs (first, last) of its pixel columns that hold unsettled samples.
    certificate : mapping, optional

    Returns
    -------
    dict
        JSON-able.
    """
    colours = [hexadecimal(colour) for colour in table.tolist()]
    units = header.get("units") or {}
    found = {
        **common(header, view, present, certificate),
        "layers": [{"name": LAYER, "label": "density", "kind": "density"}],
        "key": {
            "colours": colours[1 : LEVELS + 1],
            "labels": [list(label) for label in key_labels(fit)],
            "caption": header.get("caption") or _caption(view.up, units.get(view.up.name)),
            "shading": fit.shading,
        },
        "background": colours[0],
        "missing": colours[MISSING],
    }
    if marks is not None and (text := runs_text(marks[1])):
        found["marks"] = {str(marks[0]): text}
    return found


def common(
    header: Mapping[str, Any],
    view: View,
    present: Mapping[Pair, Mapping[int, Runs]],
    certificate: Mapping[str, Any] | None,
) -> dict[str, Any]:
    """Return what the description of every kind of tile set holds; parameters as for :func:`meta`."""
    labels, units = header.get("labels") or {}, header.get("units") or {}
    return {
        "version": VERSION,
        "tile": TILE,
        "title": header.get("title") or "",
        "family": header.get("family") or "",
        "formula": list(header.get("formula") or ()),
        "note": header.get("note") or "",
        "axes": {
            "across": _axis(view.across, labels.get(view.across.name), units.get(view.across.name)),
            "up": _axis(view.up, labels.get(view.up.name), units.get(view.up.name)),
        },
        "pairs": [list(pair) for pair in sorted(present)],
        "present": {
            f"{a}/{u}": {str(column): runs_text(runs) for column, runs in columns.items()}
            for (a, u), columns in present.items()
        },
        "plate": {**_labels(view), **(header.get("plate") or {})},
        "families": dict(header.get("families") or {}),
        "certificate": dict(certificate or {}),
    }


def hexadecimal(colour: Iterable[int]) -> str:
    """Return red, green and blue as ``#rrggbb``."""
    return "#" + "".join(f"{part:02x}" for part in colour)


def script(found: Mapping[str, Any]) -> str:
    """Return a classic script that hands a description to the page; plain ASCII, keys sorted."""
    text = json.dumps(found, sort_keys=True, separators=(",", ":")).replace("<", "\\u003c")
    return f"window.ATLAS_META = {text};\n"


def runs_text(runs: Runs) -> str:
    """Write runs as ``0-3,7``."""
    return ",".join(str(first) if first == last else f"{first}-{last}" for first, last in runs)


def runs_where(flags: Iterable[tuple[int, NDArray[np.bool_]]]) -> Iterator[tuple[int, int]]:
    """Yield the runs (first, last) of true flags.

    Parameters
    ----------
    flags : iterable of (int, ndarray of bool)
        Pieces in order, each with the number of its first flag.
    """
    begun: int | None = None
    end = -1
    for first, piece in flags:
        if begun is not None and first != end + 1:
            yield begun, end
            begun = None
        edges = np.flatnonzero(np.diff(piece, prepend=False, append=False)).reshape(-1, 2)
        for start, stop in edges.tolist():
            if begun is not None and first + start != end + 1:
                yield begun, end
                begun = None
            begun = first + start if begun is None else begun
            end = first + stop - 1
    if begun is not None:
        yield begun, end


def _axis(axis: Axis, label: str | None, unit: str | None) -> dict[str, Any]:
    return {
        "name": axis.name,
        "label": axis.label or label or axis.name,
        "unit": unit or "",
        "low": _ratio(axis.low),
        "high": _ratio(axis.high),
        "of_pi": axis.of_pi,
        "scale": axis.scale,
    }


def _labels(view: View) -> dict[str, dict[str, str]]:
    """Return the labels that the view gives its axes itself, as a plate holds them."""
    axes = {"across": view.across, "up": view.up}
    return {key: {"label": axis.label} for key, axis in axes.items() if axis.label}


def _ratio(end: Exact) -> dict[str, str]:
    return {"num": str(end.value.numerator), "den": str(end.value.denominator)}


def _caption(up: Axis, unit: str | None) -> str:
    if up.scale == "log":
        return f"density (share of samples per unit of ln {up.name})"
    return f"density (share of samples per {unit or f'unit of {up.name}'})"
