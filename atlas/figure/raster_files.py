"""PNG and TIFF files with pillow, its one home in `atlas`; both are written the same way every time."""

from __future__ import annotations

import io
import zlib
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.figure.painting import Painted

PNG_KEY = "atlas-certificate"
_DESCRIPTION, _ACROSS, _UP, _UNIT = 270, 282, 283, 296
_INCH = 2


def png(painted: Painted, dpi: float | None = None, record: str | None = None) -> bytes:
    """Return a page, or a raster alone, as a PNG file.

    zlib's strategy for runs is taken: on shaded densities it is as small as level 6 and several times faster.

    Parameters
    ----------
    painted : Painted
        Pixels; with a table the file is an 8-bit palette PNG, in black and white a 1-bit PNG.
    dpi : float, optional
        Resolution; PNG holds whole pixels a metre.
    record : str, optional
        ASCII text for the iTXt chunk ``atlas-certificate``.
    """
    from PIL.PngImagePlugin import PngInfo

    info = PngInfo()
    if record is not None:
        info.add_itxt(PNG_KEY, record)
    options: dict[str, Any] = {"dpi": (dpi, dpi)} if dpi else {}
    return _saved(_image(painted), format="PNG", compress_type=zlib.Z_RLE, pnginfo=info, **options)


def tiff(painted: Painted, dpi: float, record: str) -> bytes:
    """Return a page as a TIFF file: LZW, RGB, grey or 1-bit, resolution exact.

    Parameters
    ----------
    painted : Painted
        Pixels.
    dpi : float
        Resolution in pixels an inch.
    record : str
        ASCII text for tag 270, the description.
    """
    from PIL.TiffImagePlugin import IFDRational, ImageFileDirectory_v2

    exact = Fraction(str(dpi))
    tags = ImageFileDirectory_v2()
    tags[_DESCRIPTION] = record
    tags[_ACROSS] = tags[_UP] = IFDRational(exact.numerator, exact.denominator)
    tags[_UNIT] = _INCH
    image = _image(painted)
    if not painted.bilevel:
        image = image.convert("L" if painted.grey else "RGB")
    return _saved(image, format="TIFF", compression="tiff_lzw", tiffinfo=tags)


def raster_png(pixels: NDArray[np.uint8], table: NDArray[np.uint8] | None) -> bytes:
    """Return a raster alone as a PNG: of palette indices, or of colours where there is no table."""
    return png(Painted(pixels, table))


def _image(painted: Painted) -> Any:
    from PIL import Image

    height, width = painted.pixels.shape[:2]
    if painted.bilevel:
        return Image.frombuffer("1", (width, height), np.packbits(painted.pixels, axis=1), "raw", "1", 0, 1)
    pixels = np.ascontiguousarray(painted.pixels)
    if painted.table is None:
        return Image.frombuffer("RGB", (width, height), pixels, "raw", "RGB", 0, 1)
    image = Image.frombuffer("P", (width, height), pixels, "raw", "P", 0, 1)
    image.putpalette(painted.table.tobytes())
    return image


def _saved(image: Any, **options: Any) -> bytes:
    buffer = io.BytesIO()
    image.save(buffer, **options)
    return buffer.getvalue()
