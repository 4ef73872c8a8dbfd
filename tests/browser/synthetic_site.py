"""A tile set whose every pixel says where it belongs, written next to a copy of the page.

Red and green of a pixel are its place inside its tile, blue is a number made of the tile's address: a
screenshot is compared with what :meth:`SyntheticSite.mosaic` puts together from the addresses alone.
"""

from __future__ import annotations

import json
import shutil
from collections.abc import Iterable
from dataclasses import dataclass, field
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from PIL import Image

import tiles.page

Pair = tuple[int, int]
BACKGROUND = (240, 200, 40)
OUTSIDE = (0xE7, 0xE5, 0xDE)  # what the page shows beyond the ends of the axes
LINEAR = {
    "across": {"name": "r", "label": "growth", "unit": "", "low": "14/5", "high": "4"},
    "up": {"name": "x", "label": "stock", "unit": "kt", "low": "-1/3", "high": "1"},
}
CURVED = {
    "across": {"name": "dose", "label": "dose", "unit": "mg", "low": "1/1000", "high": "500", "scale": "log"},
    "up": {"name": "theta", "label": "angle", "unit": "", "low": "-1/2", "high": "1", "of_pi": True},
}


def tile_colour(pair: Pair, column: int, row: int) -> int:
    """Return the blue of a tile."""
    return (37 * pair[0] + 101 * pair[1] + 13 * (column % 251) + 29 * (row % 241)) % 251


def tile_pixels(pair: Pair, column: int, row: int) -> NDArray[np.uint8]:
    """Return a tile as an image, shape (256, 256, 3), top line first."""
    pixels = np.empty((256, 256, 3), np.uint8)
    pixels[..., 0] = np.arange(256)
    pixels[..., 1] = np.arange(255, -1, -1)[:, None]
    pixels[..., 2] = tile_colour(pair, column, row)
    return pixels


@dataclass
class SyntheticSite:
    """Which tiles exist, and what stands in ``meta.js``."""

    present: dict[Pair, set[tuple[int, int]]]
    axes: dict[str, dict[str, Any]] = field(default_factory=lambda: LINEAR)
    more: dict[str, Any] = field(default_factory=dict)
    plain: tuple[int, int, int] | None = None  # one colour for all tiles instead of the pattern

    @classmethod
    def whole(
        cls, pairs: Iterable[Pair], absent: Iterable[tuple[Pair, int, int]] = (), **more: Any
    ) -> SyntheticSite:
        """Return a site with all tiles of the pairs, except the absent ones."""
        present = {(a, u): {(c, r) for c in range(2**a) for r in range(2**u)} for a, u in pairs}
        for pair, column, row in absent:
            present[pair].discard((column, row))
        return cls(present, **more)

    def end(self, axis: str, name: str) -> Fraction:
        """Return an end of an axis, as its ratio to pi where it is a multiple of pi."""
        return Fraction(self.axes[axis][name])

    def write(self, folder: Path) -> Path:
        """Write the page, its ``meta.js`` and the tiles; return the folder."""
        folder.mkdir(parents=True)
        for source in Path(tiles.page.__file__).parent.iterdir():
            if source.suffix in (".html", ".css", ".js"):
                shutil.copy(source, folder)
        for pair, addresses in self.present.items():
            for column, row in addresses:
                file = folder / f"tiles/density/{pair[0]}/{pair[1]}/{column}/{row}.png"
                file.parent.mkdir(parents=True, exist_ok=True)
                self._image(pair, column, row).save(file, compress_level=1)
        (folder / "meta.js").write_text(f"window.ATLAS_META = {json.dumps(self.meta(), sort_keys=True)};\n")
        return folder

    def _image(self, pair: Pair, column: int, row: int) -> Image.Image:
        if self.plain is not None:
            return Image.new("RGB", (256, 256), self.plain)
        return Image.fromarray(tile_pixels(pair, column, row))

    def meta(self) -> dict[str, Any]:
        """Return what ``meta.js`` holds."""
        rows: dict[str, dict[str, str]] = {}
        for (a, u), addresses in self.present.items():
            columns: dict[str, list[str]] = {}
            for column, row in sorted(addresses):
                columns.setdefault(str(column), []).append(str(row))
            rows[f"{a}/{u}"] = {column: ",".join(each) for column, each in columns.items()}
        return {
            "version": 1,
            "tile": 256,
            "title": "Pattern of addresses",
            "family": "pattern",
            "formula": ["x → r*x*(1 - x)"],
            "note": "Every pixel says where it belongs.",
            "axes": {name: self._axis(name) for name in ("across", "up")},
            "layers": [{"name": "density", "label": "density", "kind": "density"}],
            "pairs": [list(pair) for pair in self.present],
            "present": rows,
            "key": {
                "colours": ["#f0f0f0", "#204060"],
                "labels": [[0, "0.1"], [0.5, "1"], [1, "10"]],
                "caption": "density",
                "shading": "equalised",
            },
            "background": "#{:02x}{:02x}{:02x}".format(*BACKGROUND),
            "missing": "#888888",
            "plate": {"family": "pattern", "set": {"h": "0.1", "k": "-2/3"}, "title": "Yes: a 'title'"},
            "certificate": {"kind": "tile set"},
            **self.more,
        }

    def _axis(self, name: str) -> dict[str, Any]:
        def rational(end: str) -> dict[str, str]:
            value = self.end(name, end)
            return {"num": str(value.numerator), "den": str(value.denominator)}

        given = {"of_pi": False, "scale": "linear", **self.axes[name]}
        return {**given, "low": rational("low"), "high": rational("high")}

    def mosaic(self, pair: Pair, left: int, bottom: int, width: int, height: int) -> NDArray[np.uint8]:
        """Return the pixels of a window of the mosaic of all tiles of a pair, top line first.

        ``left`` and ``bottom`` count tile pixels from the lower ends of the axes and may be negative.
        """
        picture = np.empty((height, width, 3), np.uint8)
        picture[:] = OUTSIDE
        for column in range(left // 256, (left + width - 1) // 256 + 1):
            for row in range(bottom // 256, (bottom + height - 1) // 256 + 1):
                if not (0 <= column < 2 ** pair[0] and 0 <= row < 2 ** pair[1]):
                    continue
                pixels = tile_pixels(pair, column, row)
                if (column, row) not in self.present[pair]:
                    pixels[:] = BACKGROUND
                x, y = column * 256 - left, bottom + height - (row + 1) * 256
                into = picture[max(0, y) : max(0, y + 256), max(0, x) : max(0, x + 256)]
                into[:] = pixels[
                    max(0, -y) : max(0, -y) + into.shape[0], max(0, -x) : max(0, -x) + into.shape[1]
                ]
        return picture
