"""From counts to palette indices: a curve is fitted once, then shading is a pure table look-up.

A cell of a picture is one byte: 0 is an empty cell, 1 to ``LEVELS`` are the shades from the lowest to the
highest density, ``MISSING`` is a cell without any sample. Which density gets which shade stands in a `Fit`,
``LEVELS - 1`` ascending densities, and depends on nothing else: a mosaic of shaded tiles equals the shaded
mosaic. The colours of the indices come from datashader, see `colour_table`.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from tiles.classes import COLOURS, class_table
from tiles.curve import LEVELS, SHADINGS, thresholds
from tiles.errors import Refusal, nearest
from tiles.key import ramp_labels
from tiles.palette import PALETTES, Palette, colour, palette
from tiles.tally import Floats, Tally, alike, blocks, distinct

__all__ = [
    "LEVELS",
    "MISSING",
    "SHADINGS",
    "Fit",
    "ShadingRefused",
    "colour_table",
    "fit",
    "fit_counts",
    "key_labels",
    "shade",
    "shade_counts",
    "shades_by_datashader",
]

MISSING = LEVELS + 1
LINE_SHARE = 1 / 50
_BLOCK = 1 << 17
_LONGEST_TABLE = 1 << 20


class ShadingRefused(Refusal):
    """An unknown shading, or a record of a fit that is none."""


@dataclass(frozen=True, eq=False)
class Fit:
    """The densities at which one shade ends and the next begins.

    Attributes
    ----------
    shading : str
        One of ``SHADINGS``.
    thresholds : ndarray of float64, shape (LEVELS - 1,)
        Ascending densities; a cell has shade 1 + the number of thresholds at or below its density.
    """

    shading: str
    thresholds: Floats

    def __post_init__(self) -> None:
        _known(self.shading)
        held = np.array(self.thresholds, dtype=np.float64)
        held.flags.writeable = False
        object.__setattr__(self, "thresholds", held)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Fit) and self.to_json() == other.to_json()

    def __hash__(self) -> int:
        return hash((self.shading, self.thresholds.tobytes()))

    def to_json(self) -> str:
        """Return the fit as ASCII JSON; :meth:`from_json` gives the same bits back."""
        return json.dumps({"shading": self.shading, "thresholds": self.thresholds.tolist()}, sort_keys=True)

    @classmethod
    def from_json(cls, text: str) -> Fit:
        """Read what :meth:`to_json` wrote.

        Raises
        ------
        ShadingRefused
            When the text is no such record.
        """
        try:
            record: Any = json.loads(text)
            found = cls(str(record["shading"]), np.array(record["thresholds"], dtype=np.float64))
        except (KeyError, OverflowError, RecursionError, TypeError, ValueError):
            raise ShadingRefused("the record of a fit needs a shading and a list of thresholds") from None
        kept = found.thresholds
        if kept.shape != (LEVELS - 1,) or not np.isfinite(kept).all() or (np.diff(kept) < 0).any():
            raise ShadingRefused(f"the record of a fit needs {LEVELS - 1} ascending thresholds")
        return found


def fit(
    density: NDArray[Any],
    shading: str = "equalised",
    weights: NDArray[Any] | None = None,
    *,
    line: float | None = None,
) -> Fit:
    """Fit a curve to densities.

    The curves are those of `tiles.curve`. If only one density occurs it gets the highest shade, if none
    does every density would.

    Parameters
    ----------
    density : ndarray, any shape
        Densities; those that are 0, negative or not finite are passed over.
    shading : {"equalised", "logarithmic", "linear", "ink"}
    weights : ndarray of integers, same shape, optional
        How often each density occurs; default once.
    line : float, optional
        Density from which a cell belongs to a line, see :func:`line_density`: an equalised curve has its
        highest shade there and is fitted to the other cells alone.

    Returns
    -------
    Fit

    Raises
    ------
    ShadingRefused
        When the shading is unknown.

    Examples
    --------
    >>> import numpy as np
    >>> shade(np.array([0.0, 1.0, 2.0, 3.0]), fit(np.array([1.0, 2.0, 3.0]))).tolist()
    [0, 1, 109, 216]
    """
    _known(shading)
    values = np.asarray(density, dtype=np.float64).reshape(-1)
    often = np.ones(values.size, np.uint64) if weights is None else np.asarray(weights, np.uint64).reshape(-1)
    values, often = distinct(values, often)
    if line is not None and shading == "equalised" and values.size and values[-1] >= line:
        below = int(np.searchsorted(values, line))
        values = np.append(values[:below], line)
        often = np.append(often[:below], np.uint64(1))
    return Fit(shading, thresholds(values, often, shading))


def line_density(cell_height: float) -> float:
    """Return the density from which a cell belongs to a line, such as a branch of a cycle.

    It is that of a cell which holds a fiftieth of its column's samples. A chaotic band has such cells only at
    its densest edges; a cycle has no others, and must not be drawn pale where little else is in the view.
    """
    return LINE_SHARE / cell_height


def fit_counts(
    counts: NDArray[Any],
    exposure: ArrayLike,
    cell_height: float,
    shading: str = "equalised",
    *,
    line: float | None = None,
) -> Fit:
    """Return ``fit(density(counts, exposure, cell_height), shading, line=line)`` from a histogram of counts.

    Parameters are those of :func:`density` and :func:`fit`; the result is the same to the last bit.
    """
    tally = Tally()
    tally.add(counts, exposure, cell_height)
    values, often = tally.distinct()
    return fit(values, shading, often, line=line)


def shade(density: NDArray[Any], fit: Fit) -> NDArray[np.uint8]:
    """Turn densities into palette indices; a pure function of each density and the fit.

    Parameters
    ----------
    density : ndarray, any shape
        Zero is an empty cell, NaN one without samples.
    fit : Fit

    Returns
    -------
    ndarray of uint8, same shape
        0, ``MISSING``, or 1 + the number of thresholds at or below the density.
    """
    flat = np.asarray(density, dtype=np.float64).reshape(-1)
    shades = np.empty(flat.size, np.uint8)
    for start in range(0, flat.size, _BLOCK):
        part, out = flat[start : start + _BLOCK], shades[start : start + _BLOCK]
        out[:] = np.searchsorted(fit.thresholds, part, side="right") + 1
        out[part <= 0] = 0
        out[np.isnan(part)] = MISSING
    return shades.reshape(np.shape(density))


def shade_counts(
    counts: NDArray[Any], exposure: ArrayLike, cell_height: float, fit: Fit
) -> NDArray[np.uint8]:
    """Return ``shade(density(counts, exposure, cell_height), fit)`` by table look-up, bit for bit.

    Parameters
    ----------
    counts : ndarray of integers, shape (columns, rows)
    exposure, cell_height
        As in :func:`density`. Columns of equal exposure share one table.
    fit : Fit

    Returns
    -------
    ndarray of uint8, shape (columns, rows)
    """
    shades = np.zeros(counts.shape, np.uint8)
    for scale, columns in alike(counts, exposure, cell_height):
        firsts = _first_counts(fit.thresholds, scale)
        top = max(1, min(int(firsts[-1]), max(4096, 4 * columns.size * counts.shape[1]), _LONGEST_TABLE))
        table = _table(firsts, top)
        for block in blocks(columns, counts.shape[1]):
            part = counts[block].astype(np.intp)
            found = np.take(table, part, mode="clip")
            if top < firsts[-1]:
                above = part > top
                found[above] = np.searchsorted(firsts, part[above], side="right") + 1
            shades[block] = found
    return shades


def key_labels(fit: Fit) -> list[tuple[float, str]]:
    """Return a few round densities and where they stand along the ramp of shades, see `ramp_labels`."""
    return ramp_labels(fit.thresholds)


def colour_table(
    given: Palette | str,
    *,
    background: str | None = None,
    missing: str | None = None,
    shading: str | None = None,
) -> NDArray[np.uint8]:
    """Return the colour of every palette index.

    datashader makes the shades: `shades_by_datashader` has it shade a straight ramp. Since importing it takes
    1.4 s and 200 MB, more than a whole plate, the shades of the built-in palettes are kept in
    `tiles.colour_tables`, and a test compares that file with datashader's answer byte for byte. A palette
    of the caller's own goes to datashader.

    A categorical palette gives the colours of the indices that `tiles.classes.class_shades` yields.

    Parameters
    ----------
    given : Palette or str
        A palette or the name of a built-in one.
    background, missing : str, optional
        Colours of index 0 and of index ``MISSING`` in place of the palette's own.
    shading : str, optional
        With ``"ink"`` the greys are line art: every shade is black and what was not sampled has the colour of
        empty cells, unless ``missing`` is given.

    Returns
    -------
    ndarray of uint8, shape (LEVELS + 2, 3)

    Raises
    ------
    PaletteRefused
        When the palette or a colour does not exist.
    """
    from tiles.colour_tables import SHADES

    chosen = palette(given) if isinstance(given, str) else given
    if chosen.kind == "categorical":
        shades = _shades_of_classes()
    elif shading == "ink" and chosen == PALETTES["grey"]:
        shades = np.zeros((LEVELS, 3), np.uint8)
        missing = missing or background or chosen.background
    elif PALETTES.get(chosen.name) == chosen and chosen.name in SHADES:
        shades = np.frombuffer(bytes.fromhex(SHADES[chosen.name]), np.uint8).reshape(LEVELS, 3)
    else:
        shades = shades_by_datashader(chosen)
    ends = colour(background or chosen.background), colour(missing or chosen.missing)
    return np.concatenate([np.array(ends[:1], np.uint8), shades, np.array(ends[1:], np.uint8)])


def _shades_of_classes() -> NDArray[np.uint8]:
    """Return the colours that `tiles.classes.class_shades` looks up, filled up with white."""
    shades = np.full((LEVELS, 3), 255, np.uint8)
    shades[: COLOURS - 1] = class_table()[1:]
    return shades


def shades_by_datashader(given: Palette) -> NDArray[np.uint8]:
    """Return the colours of shades 1 to ``LEVELS``, shape (LEVELS, 3), as datashader shades a linear ramp.

    The two sides of a diverging palette are ramps of their own, so that no shade mixes their colours.
    """
    stops = list(given.stops)
    if given.kind != "diverging":
        return _ramp(stops, LEVELS)
    sides = stops[: len(stops) // 2], stops[len(stops) // 2 :]
    return np.concatenate([_ramp(side, LEVELS // 2) for side in sides])


def _ramp(stops: list[str], shades: int) -> NDArray[np.uint8]:
    from datashader import transfer_functions  # here, because it takes over a second and 200 MB

    ramp = transfer_functions.Image(np.linspace(0, 1, shades)[None, :], dims=("up", "across"))
    image = transfer_functions.shade(ramp, cmap=stops, how="linear", span=(0, 1))
    return np.ascontiguousarray(image.to_numpy()).view(np.uint8).reshape(shades, 4)[:, :3].copy()


def _known(shading: str) -> None:
    if shading not in SHADINGS:
        raise ShadingRefused(f"shading '{shading}' is unknown{nearest(str(shading), SHADINGS)}")


def _first_counts(thresholds: Floats, scale: float) -> NDArray[np.int64]:
    """Return for each threshold the smallest count whose quotient by the scale reaches it in float64."""
    counts = np.ceil(np.minimum(thresholds * scale, 2.0**53))
    counts -= (counts - 1) / scale >= thresholds
    counts += counts / scale < thresholds
    return counts.astype(np.int64)


def _table(firsts: NDArray[np.int64], top: int) -> NDArray[np.uint8]:
    """Return the shades of the counts 0 … top."""
    bounds = np.concatenate([[0], np.clip(firsts, 0, top + 1), [top + 1]])
    table = np.repeat(np.arange(1, LEVELS + 1, dtype=np.uint8), np.diff(bounds))
    table[0] = 0
    return table
