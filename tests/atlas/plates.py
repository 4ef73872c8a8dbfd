"""Small rasters and pages that the tests of plates draw."""

from __future__ import annotations

import io
import re
import zlib
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.figure.boxes import Layout
from atlas.figure.layout import FigureRequest, PlateRequest, layout
from atlas.figure.lettering import axis_text
from atlas.figure.panels import legend_width
from atlas.figure.plate import LegendEntry, PanelText, Raster, files
from tiles.shading import LEVELS, colour_table
from tiles.window import View

VIEW = View(across=("r", "2.8", 4), up=("x", 0, 1))
RECORD = {"record": 1, "name": "plate", "title": "Größe (π ≤ ∞) \\ 日本", "shares": {"unsettled": 0.25}}
KEY_LABELS = ((0.1, "0.02"), (0.5, "1"), (0.9, "2×10⁻⁵"))
LEGEND = (
    LegendEntry("fixed point", (126, 202, 255)),
    *(LegendEntry(f"period {period}", (period, 90, 120)) for period in range(2, 65)),
    LegendEntry("quasi-periodic", (116, 134, 160), kept=True),
    LegendEntry("chaotic", (24, 24, 24), kept=True),
    LegendEntry("escapes", (255, 255, 255), kept=True),
)
LEGEND_WIDTH = legend_width(entry.label for entry in LEGEND)


def raster(width: int, height: int, view: View = VIEW, palette: str = "blue", seed: int = 0) -> Raster:
    """Return noise of every palette index, in runs of eight columns."""
    noise = np.random.default_rng(seed).integers(0, LEVELS + 2, (height, width // 8 + 1), np.uint8)
    return Raster(np.repeat(noise, 8, axis=1)[:, :width].copy(), colour_table(palette), view)


def mixed_raster(width: int, height: int, view: View = VIEW, seed: int = 0) -> Raster:
    """Return noise of every colour, in runs of eight columns, as pixels without a palette."""
    noise = np.random.default_rng(seed).integers(0, 256, (height, width // 8 + 1, 3), np.uint8)
    return Raster(None, None, view, None, np.repeat(noise, 8, axis=1)[:, :width].copy())


def request(width: int = 1063, height: int = 709, dpi: float = 300, **more: Any) -> PlateRequest:
    """Return a plate of the logistic map's view."""
    return PlateRequest(
        "plate", more.pop("view", VIEW), width, height, dpi, more.pop("font_size", 7.0), **more
    )


def filled(
    asked: PlateRequest | FigureRequest, *palettes: str
) -> tuple[Layout, dict[str, Raster], dict[str, PanelText]]:
    """Return a layout with a raster and texts for every panel and inset."""
    page = layout(asked)
    rasters, texts = {}, {}
    for number, panel in enumerate(page.panels):
        palette = palettes[number % len(palettes)] if palettes else "blue"
        rasters[panel.name] = raster(panel.width, panel.height, panel.view, palette, number)
        if panel.inset:
            box = panel.inset.raster
            rasters[f"{panel.name}/inset"] = raster(box.width, box.height, panel.inset.view, palette, 99)
        texts[panel.name] = PanelText(
            axis_text("r", "intrinsic growth rate"),
            axis_text("x", "stock", "kt"),
            KEY_LABELS,
            "density",
            LEGEND,
        )
    return page, rasters, texts


def made(
    asked: PlateRequest | FigureRequest, *formats: str, palettes: tuple[str, ...] = ()
) -> dict[str, bytes]:
    """Return the files of a page by format."""
    return dict(files(*filled(asked, *palettes), formats, RECORD))


def opened(data: bytes) -> NDArray[np.uint8]:
    """Return the colours of a PNG or TIFF file."""
    from PIL import Image

    with Image.open(io.BytesIO(data)) as image:
        return np.asarray(image.convert("RGB"))


def pdf_objects(pdf: bytes) -> dict[int, bytes]:
    """Return a PDF file's objects by number, found through its cross-reference table."""
    start = int(re.findall(rb"startxref\s+(\d+)\s+%%EOF\s*$", pdf)[-1])
    lines = pdf[start:].split(b"\n")
    assert lines[0] == b"xref"
    count = int(lines[1].split()[1])
    objects = {}
    for number, line in enumerate(lines[2 : 2 + count]):
        place, _, kind = line.split()
        if kind == b"n":
            assert re.match(rb"%d 0 obj\b" % number, pdf[int(place) :]), number
            objects[number] = pdf[int(place) : pdf.index(b"endobj", int(place))]
    return objects


def pdf_images(pdf: bytes) -> list[NDArray[np.uint8]]:
    """Return the colours of a PDF file's images, undoing PNG's filters by hand."""
    found = []
    for text in pdf_objects(pdf).values():
        if b"/Subtype /Image" not in text:
            continue
        head, _, rest = text.partition(b"stream\n")
        width, height = (int(re.search(rb"/%s (\d+)" % key, head)[1]) for key in (b"Width", b"Height"))  # type: ignore[index]
        length = int(re.search(rb"/Length (\d+)", head)[1])  # type: ignore[index]
        data = zlib.decompress(rest[:length])
        if b"/Indexed" not in head:
            assert b"/ColorSpace /DeviceRGB " in head
            assert b"/Colors 3 " in head
            found.append(unfiltered(data, height, 3 * width, 3).reshape(height, width, 3))
            continue
        palette = bytes.fromhex(re.search(rb"<([0-9a-f]+)>", head)[1].decode())  # type: ignore[index]
        lines = unfiltered(data, height, width, 1)
        found.append(np.frombuffer(palette, np.uint8).reshape(-1, 3)[lines])
    return found


def unfiltered(data: bytes, height: int, length: int, step: int) -> NDArray[np.uint8]:
    """Undo PNG's five filters line by line (ISO/IEC 15948, 9.2); a pixel is ``step`` bytes."""
    above, out = bytearray(length), []
    for number in range(height):
        kind, *line = data[number * (length + 1) : (number + 1) * (length + 1)]
        for at in range(length if kind else 0):
            left = line[at - step] if at >= step else 0
            corner = above[at - step] if at >= step else 0
            guess = left + above[at] - corner
            nearest = min((left, above[at], corner), key=lambda each: abs(guess - each))
            line[at] = (line[at] + (0, left, above[at], (left + above[at]) // 2, nearest)[kind]) % 256
        above = bytearray(line)
        out.append(above)
    return np.frombuffer(b"".join(out), np.uint8).reshape(height, length)
