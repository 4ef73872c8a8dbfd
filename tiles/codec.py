"""How a tile of counts becomes bytes and comes back: byte planes, whole or listed, in a zlib stream."""

from __future__ import annotations

import hashlib
import zlib
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tiles.grid import TILE

Counts = NDArray[Any]
_CELLS = TILE * TILE
_TYPES = {1: np.uint8, 2: np.uint16, 4: np.uint32, 8: np.uint64}
_LISTED = _CELLS // 8
_USUAL = 2 * _CELLS


class Encoded(NamedTuple):
    """A tile of counts as the index stores it.

    Attributes
    ----------
    digest : bytes
        SHA-256 of the unpacked stream, 32 bytes. It depends on the counts alone, not on zlib.
    blob : bytes
        The zlib stream.
    """

    digest: bytes
    blob: bytes


def width(counts: Counts) -> int:
    """Return the bytes a count needs, 1, 2, 4 or 8, so that the largest one fits; 0 when all are 0."""
    top = int(counts.max())
    return next(size for size in (0, *_TYPES) if top < 1 << 8 * size)


def narrow(counts: Counts) -> Counts | None:
    """Return the counts in the smallest unsigned type that holds them; None when all are 0."""
    size = width(counts)
    return counts.astype(_TYPES[size]) if size else None


def encode(counts: Counts) -> Encoded | None:
    """Return a tile as the index stores it, see INDEX.md; None for an empty one.

    The lowest bytes of all counts make one plane, the next ones another. A plane is written whole, or as a
    list of the few bytes that are not 0: a tile that a few cycles cross is handled ten times as fast so. Runs
    of equal bytes alone are compressed, beside the entropy coding: on counts of orbits that is both smaller
    and faster than a search for repeated strings (12 % and 30 % on the logistic map).

    Parameters
    ----------
    counts : ndarray of an unsigned type, shape (256, 256)
        One column of cells is one row of the array.
    """
    size = width(counts)
    if size == 0:
        return None
    raw = b"".join((bytes((size,)), *_planes(counts.reshape(-1), size)))
    packer = zlib.compressobj(1, zlib.DEFLATED, zlib.MAX_WBITS, 9, zlib.Z_RLE)
    blob = packer.compress(raw) + packer.flush()
    return Encoded(hashlib.sha256(raw).digest(), blob)


def decode(blob: bytes) -> Counts:
    """Return the counts of an encoded tile in the smallest unsigned type that holds them.

    Parameters
    ----------
    blob : bytes
        What :func:`encode` made.

    Returns
    -------
    ndarray of uint8, uint16, uint32 or uint64, shape (256, 256)

    Raises
    ------
    zlib.error
        When the stream is damaged.
    ValueError
        When it holds no tile.
    """
    raw = zlib.decompress(blob, bufsize=_USUAL)
    if not raw or raw[0] not in _TYPES:
        raise ValueError("a tile starts with the number of its planes: 1, 2, 4 or 8")
    kind = _TYPES[raw[0]]
    counts = np.zeros(_CELLS, kind)
    at = 1
    for place in range(raw[0]):
        listed = int.from_bytes(raw[at : at + 4], "little")
        at += 4
        if listed == _CELLS:
            _add_whole(counts, np.frombuffer(raw, np.uint8, _CELLS, at), place)
            at += _CELLS
        elif listed:
            columns, rows, values = np.frombuffer(raw, np.uint8, 3 * listed, at).reshape(3, listed)
            counts[columns * np.uint16(TILE) + rows] |= values.astype(kind) << kind(8 * place)
            at += 3 * listed
    return counts.reshape(TILE, TILE)


def _planes(counts: Counts, size: int) -> list[bytes | memoryview]:
    cells = None
    if np.count_nonzero(counts) <= _LISTED:
        cells = np.flatnonzero(counts).astype(np.uint16)
        counts = counts[cells]
    parts: list[bytes | memoryview] = []
    for place in range(size):
        plane = (counts >> 8 * place if place else counts).astype(np.uint8)
        listed = int(np.count_nonzero(plane))
        if listed > _LISTED:
            parts += (_CELLS.to_bytes(4, "little"), plane.data)
        else:
            found = np.flatnonzero(plane)
            where = found.astype(np.uint16) if cells is None else cells[found]
            columns, rows = (where >> 8).astype(np.uint8), where.astype(np.uint8)
            parts += (listed.to_bytes(4, "little"), columns.data, rows.data, plane[found].data)
    return parts


def _add_whole(counts: Counts, plane: NDArray[np.uint8], place: int) -> None:
    if place == 0:
        counts[:] = plane
    else:
        wide = plane.astype(counts.dtype)
        wide <<= np.uint8(8 * place)
        counts |= wide
