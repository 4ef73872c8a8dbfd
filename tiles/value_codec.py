"""How the sums of a tile become bytes and come back: eight byte planes, each as short as is cheap."""

from __future__ import annotations

import hashlib
import zlib

import numpy as np
from numpy.typing import NDArray

from tiles.codec import Encoded
from tiles.grid import TILE

_CELLS = TILE * TILE
_EVEN, _WHOLE, _PACKED = range(3)
_REPEATED = _CELLS // 8
_SCATTERED = 2.0 / 256


def encode_sums(sums: NDArray[np.float64], counted: bytes) -> Encoded:
    """Return the sums of a tile as the index stores them, see INDEX.md.

    The low bytes of measured numbers are noise that no compression shortens: such planes are stored as they
    are, which keeps the time to a few milliseconds a tile.

    Parameters
    ----------
    sums : ndarray of float64, shape (256, 256)
    counted : bytes
        Digest of the numbers of finite values; it goes into the digest of the whole.
    """
    planes = np.ascontiguousarray(sums.astype("<f8", copy=False).view(np.uint8).reshape(_CELLS, 8).T)
    parts: list[bytes | memoryview] = []
    for plane in planes:
        parts += _plane(plane)
    digest = hashlib.sha256(planes.data)
    digest.update(counted)
    return Encoded(digest.digest(), b"".join(parts))


def decode_sums(blob: bytes) -> NDArray[np.float64]:
    """Return the sums of an encoded tile, shape (256, 256).

    Raises
    ------
    zlib.error
        When a stream is damaged.
    ValueError
        When the bytes hold no tile.
    """
    planes = np.empty((8, _CELLS), np.uint8)
    at = 0
    for plane in planes:
        kind, size = blob[at : at + 1], int.from_bytes(blob[at + 1 : at + 5], "little")
        at += 5
        if kind == bytes((_PACKED,)):
            plane[:] = np.frombuffer(zlib.decompress(blob[at : at + size], bufsize=_CELLS), np.uint8)
        elif kind == bytes((_WHOLE,)) or (kind == bytes((_EVEN,)) and size == 1):
            plane[:] = np.frombuffer(blob, np.uint8, size, at)
        else:
            raise ValueError("a plane of sums starts with 0, 1 or 2 and its size")
        at += size
    return np.ascontiguousarray(planes.T).view("<f8").astype(np.float64, copy=False).reshape(TILE, TILE)


def _plane(plane: NDArray[np.uint8]) -> tuple[bytes, bytes | memoryview]:
    repeated = int(np.count_nonzero(plane[1:] == plane[:-1]))
    if repeated == _CELLS - 1:
        return _head(_EVEN, 1), plane[:1].tobytes()
    if repeated < _REPEATED:
        shares = np.bincount(plane) / _CELLS
        if float(shares @ shares) < _SCATTERED:
            return _head(_WHOLE, _CELLS), plane.data
    packer = zlib.compressobj(1, zlib.DEFLATED, zlib.MAX_WBITS, 9, zlib.Z_RLE)
    packed = packer.compress(plane.data) + packer.flush()
    return _head(_PACKED, len(packed)), packed


def _head(kind: int, size: int) -> bytes:
    return bytes((kind,)) + size.to_bytes(4, "little")
