"""Palette images as PNG files, written byte by byte: one image is one table look-up away from its counts."""

from __future__ import annotations

import struct
import zlib
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

_SIGNATURE = b"\x89PNG\r\n\x1a\n"
_PALETTE_COLOUR = 3


def encode(indices: NDArray[np.uint8], table: NDArray[np.uint8]) -> bytes:
    """Return a PNG file of 8-bit palette indices (ISO/IEC 15948, colour type 3, no filter).

    Runs of equal bytes alone are compressed, beside the entropy coding: on shaded densities that is smaller
    and faster than any of zlib's levels (13 % and 40 % against level 1 on the logistic map).

    Parameters
    ----------
    indices : ndarray of uint8, shape (lines, pixels)
        Line 0 is the top; every index below ``len(table)``.
    table : ndarray of uint8, shape (colours, 3)
        Red, green and blue of at most 256 colours.

    Returns
    -------
    bytes
    """
    lines, pixels = indices.shape
    scan = np.empty((lines, pixels + 1), np.uint8)
    scan[:, 0] = 0
    scan[:, 1:] = indices
    packer = zlib.compressobj(1, zlib.DEFLATED, zlib.MAX_WBITS, 9, zlib.Z_RLE)
    data = packer.compress(scan.data) + packer.flush()
    return b"".join((_head(lines, pixels, table.tobytes()), _chunk(b"IDAT", data), _chunk(b"IEND", b"")))


@lru_cache(maxsize=8)
def _head(lines: int, pixels: int, table: bytes) -> bytes:
    size = struct.pack(">IIBBBBB", pixels, lines, 8, _PALETTE_COLOUR, 0, 0, 0)
    return _SIGNATURE + _chunk(b"IHDR", size) + _chunk(b"PLTE", table)


def _chunk(kind: bytes, data: bytes) -> bytes:
    return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(data, zlib.crc32(kind)))
