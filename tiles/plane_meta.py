"""What the page of a tile set of planes needs to know: the dictionary that ``meta.js`` assigns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles.classes import class_colours
from tiles.grid import Pair
from tiles.meta import Runs, common, hexadecimal
from tiles.shading import LEVELS
from tiles.values import ValueFit, value_key_labels
from tiles.window import View


@dataclass(frozen=True)
class ValueLayer:
    """A layer of values and how it is shown.

    Attributes
    ----------
    name, label, unit : str
    fit : ValueFit
    palette : str
        Name of the palette.
    table : ndarray of uint8, shape (LEVELS + 2, 3)
        Its colours; that of index 0 is for cells without a value.
    """

    name: str
    label: str
    unit: str
    fit: ValueFit
    palette: str
    table: NDArray[np.uint8]


def plane_meta(
    header: Mapping[str, Any],
    view: View,
    present: Mapping[Pair, Mapping[int, Runs]],
    totals: Mapping[int, int],
    layers: Sequence[ValueLayer],
    *,
    background: str,
    certificate: Mapping[str, Any] | None = None,
) -> dict[str, Any]:
    """Return the description of a tile set of planes that its page reads.

    Parameters
    ----------
    header : mapping
        Of the index, as for :func:`tiles.meta.meta`, and ``class_layer``, ``class_label``, ``class_names``.
    view : View
    present : mapping
        As for :func:`tiles.meta.meta`.
    totals : mapping of int to int
        How many pixels have each class that occurs.
    layers : sequence of ValueLayer
    background : str
        Colour of what has no picture, ``#rrggbb``.
    certificate : mapping, optional

    Returns
    -------
    dict
        JSON-able.
    """
    return {
        **common(header, view, present, certificate),
        "kind": "plane",
        "layers": [_class_layer(header, totals), *map(_value_layer, layers)],
        "background": background,
    }


def class_name(names: Mapping[str, str], number: int) -> str:
    """Return what a class is called: by its own name, or by that of numbered classes.

    Examples
    --------
    >>> class_name({"60002": "chaotic", "period": "period {}"}, 3)
    'period 3'
    """
    return names.get(str(number)) or names.get("period", "{}").replace("{}", str(number))


def _class_layer(header: Mapping[str, Any], totals: Mapping[int, int]) -> dict[str, Any]:
    """Return the layer of classes; in its legend those with names of their own come first, then by number."""
    names = header.get("class_names") or {}
    classes = sorted(totals, key=lambda number: (str(number) not in names, number))
    pixels = sum(totals.values())
    legend = [
        {
            "class": number,
            "label": class_name(names, number),
            "colour": hexadecimal(colour),
            "share": totals[number] / pixels,
        }
        for number, colour in zip(classes, class_colours(classes), strict=True)
    ]
    name = str(header["class_layer"])
    return {"name": name, "label": header.get("class_label") or name, "kind": "classes", "legend": legend}


def _value_layer(layer: ValueLayer) -> dict[str, Any]:
    colours = [hexadecimal(colour) for colour in layer.table.tolist()]
    return {
        "name": layer.name,
        "label": layer.label,
        "unit": layer.unit,
        "kind": "values",
        "palette": layer.palette,
        "key": {
            "colours": colours[1 : LEVELS + 1],
            "labels": [list(label) for label in value_key_labels(layer.fit)],
            "caption": f"{layer.label} ({layer.unit})" if layer.unit else layer.label,
        },
        "none": colours[0],
    }
