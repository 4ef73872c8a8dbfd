"""Side-car scripts of a tile of planes: its classes and values for the words under the pointer.

A script, since a page opened from the disk may load scripts and pictures only. It calls
``atlasValues("A/U/C/R", TEXT)``; the text is base64 of a zlib stream of

- the number n of classes that occur, four bytes, and the n classes, two bytes each, little-endian;
- of every cell, column after column from the left, each from the lowest cell, the place of its class among
  them, one byte, or two bytes little-endian where n exceeds 256;
- of every layer of values three planes: the lowest, the middle and the highest byte of the upper 24 bits of
  each value as a 32-bit IEEE 754 number, rounded to nearest (to five digits), or not a number. What is larger
  than any of them becomes the largest.
"""

from __future__ import annotations

import base64
import zlib
from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from tiles.grid import Address

_LARGEST = float(np.uint32(0x7F7FFF00).view(np.float32))


def side_car(address: Address, classes: NDArray[np.uint16], values: Iterable[NDArray[np.float64]]) -> bytes:
    """Return the script of a tile.

    Parameters
    ----------
    address : Address
    classes : ndarray of uint16, shape (256, 256)
        One column of cells is one row of the array.
    values : iterable of ndarray of float64, shape (256, 256)
        One a layer of values, in the order of the layers.

    Returns
    -------
    bytes
        ASCII.
    """
    present = np.flatnonzero(np.bincount(classes.reshape(-1)))
    places = np.zeros(1 << 16, np.uint8 if present.size <= 256 else np.dtype("<u2"))
    places[present] = np.arange(present.size)
    packer = zlib.compressobj(1, zlib.DEFLATED, zlib.MAX_WBITS, 9, zlib.Z_RLE)
    head = present.size.to_bytes(4, "little") + present.astype("<u2").tobytes()
    parts = [packer.compress(head), packer.compress(places[classes].tobytes())]
    parts += [packer.compress(_upper_bytes(each)) for each in values]
    text = base64.b64encode(b"".join((*parts, packer.flush())))
    return b'atlasValues("%s","%s");\n' % ("/".join(map(str, address)).encode(), text)


def _upper_bytes(values: NDArray[np.float64]) -> bytes:
    """Return the upper 24 bits of values in single precision, as three planes, the lowest byte first."""
    single = np.clip(values, -_LARGEST, _LARGEST).astype("<f4")
    bits = single.view("<u4").reshape(-1)
    rounded = np.where(np.isfinite(single).reshape(-1), bits + np.uint32(0x80), np.uint32(0x7FC00000))
    return np.ascontiguousarray(rounded.astype("<u4").view(np.uint8).reshape(-1, 4)[:, 1:].T).tobytes()
