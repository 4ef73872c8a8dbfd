"""The index of a tile set: one SQLite file of counts, exposures, fits and the certificate (see INDEX.md)."""

from __future__ import annotations

import hashlib
import json
import zlib
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles.codec import Encoded, decode, encode
from tiles.errors import IndexRefused
from tiles.grid import TILE, Address, Pair, key_of, middle_pair, number_of
from tiles.pyramid import Counts
from tiles.shading import Fit, line_density
from tiles.shading import fit as fit_densities
from tiles.store import Store
from tiles.strip import PER_COLUMN
from tiles.tally import Tally
from tiles.window import View

_AT = "across_level = ? AND up_level = ? AND tile_column = ? AND tile_row = ?"
_IN_ORDER = "FROM tiles WHERE across_level = ? AND up_level = ? ORDER BY tile_column, tile_row"

Runs = list[tuple[int, int]]


class Index(Store):
    """An open index of a tile set; see :class:`tiles.store.Store` for making, opening and finishing one."""

    @property
    def header(self) -> dict[str, Any]:
        """What the index was created with."""
        return dict(self.record("header"))

    @property
    def view(self) -> View:
        """The whole window."""
        axes = self.header["view"]
        return View(across=axes["across"], up=axes["up"])

    @property
    def pairs(self) -> tuple[Pair, ...]:
        """The built level pairs, the deepest last."""
        return tuple((a, u) for a, u in self.header["pairs"])

    @property
    def certificate(self) -> dict[str, Any] | None:
        """How the counts were made, if it was stored."""
        found: dict[str, Any] | None = self.record("certificate")
        return found

    def put_certificate(self, certificate: Mapping[str, Any]) -> None:
        """Store how the counts were made."""
        self.put_record("certificate", certificate)

    # Tiles

    def put_encoded(self, tiles: Iterable[tuple[Address, Encoded]]) -> None:
        """Store encoded tiles, replacing those at the same addresses."""
        self._db.executemany(
            "INSERT OR REPLACE INTO tiles VALUES (?, ?, ?, ?, ?, ?)",
            ((*_place(address), tile.digest, tile.blob) for address, tile in tiles),
        )

    def put(self, address: Address, counts: Counts) -> None:
        """Store a tile of counts, shape (256, 256), one column of cells a row; an empty one is removed."""
        tile = encode(counts)
        if tile is None:
            self._db.execute(f"DELETE FROM tiles WHERE {_AT}", _place(address))
        else:
            self.put_encoded([(address, tile)])

    def add(self, address: Address, counts: Counts) -> None:
        """Add counts to a tile, which need not be there."""
        present = self.get(address)
        if present is not None:
            counts = present.astype(np.uint64) + counts
        self.put(address, counts)

    def get(self, address: Address) -> Counts | None:
        """Return the counts of a tile, None where it is empty or not built.

        Returns
        -------
        ndarray of uint32, shape (256 columns, 256 rows), or None
            Row index 0 is the lowest. The type is uint64 where a count exceeds uint32.
        """
        counts = self.get_narrow(address)
        return None if counts is None else counts.astype(np.result_type(counts, np.uint32), copy=False)

    def get_narrow(self, address: Address) -> Counts | None:
        """Return what :meth:`get` returns, in the smallest unsigned type that holds it, read only."""
        row = self._db.execute(f"SELECT counts FROM tiles WHERE {_AT}", _place(address)).fetchone()
        return None if row is None else self._decode(row[0], address)

    def tiles_of_column(self, pair: Pair, column: int) -> Iterator[tuple[int, Counts]]:
        """Yield row and counts, as :meth:`get_narrow` returns them, of a tile column, upwards."""
        query = (
            "SELECT tile_row, counts FROM tiles "
            "WHERE across_level = ? AND up_level = ? AND tile_column = ? ORDER BY tile_row"
        )
        for blob, counts in self._db.execute(query, (*pair, key_of(column))):
            row = number_of(blob)
            yield row, self._decode(counts, Address(*pair, column, row))

    def has(self, address: Address) -> bool:
        """Return whether a tile is stored."""
        return self._db.execute(f"SELECT 1 FROM tiles WHERE {_AT}", _place(address)).fetchone() is not None

    def addresses(self, pair: Pair) -> Iterator[Address]:
        """Yield the addresses of the stored tiles of a level pair, in order."""
        for column, row in self._db.execute(f"SELECT tile_column, tile_row {_IN_ORDER}", pair):
            yield Address(*pair, number_of(column), number_of(row))

    def present(self, pair: Pair) -> dict[int, Runs]:
        """Return for each tile column of a level pair the runs (first row, last row) of stored tiles."""
        found: dict[int, Runs] = {}
        for _, _, column, row in self.addresses(pair):
            runs = found.setdefault(column, [])
            if runs and runs[-1][1] == row - 1:
                runs[-1] = (runs[-1][0], row)
            else:
                runs.append((row, row))
        return found

    def counts_digest(self) -> str:
        """Return a digest of all counts of the deepest level pair, 64 hexadecimal digits.

        It depends on the counts and their addresses only: SHA-256 over the tiles' keys and digests in order.
        """
        digest = hashlib.sha256()
        for blobs in self._db.execute(f"SELECT tile_column, tile_row, digest {_IN_ORDER}", self.pairs[-1]):
            digest.update(b"".join(blobs))
        return digest.hexdigest()

    def _decode(self, blob: bytes, address: Address) -> Counts:
        try:
            return decode(blob)
        except (ValueError, zlib.error):
            raise IndexRefused(
                f"{self.path}: the tile at {tuple(address)} is damaged; build it again"
            ) from None

    # Columns

    def put_columns(self, across_level: int, tile_column: int, numbers: NDArray[np.uint64]) -> None:
        """Store the per-column numbers of a tile column.

        Parameters
        ----------
        across_level, tile_column : int
        numbers : ndarray of uint64, shape (6, 256)
            One row for each name in ``tiles.strip.PER_COLUMN``.
        """
        blob = zlib.compress(numbers.astype("<u8").tobytes(), 1)
        self._db.execute(
            "INSERT OR REPLACE INTO columns VALUES (?, ?, ?)", (across_level, key_of(tile_column), blob)
        )

    def column_numbers(self, across_level: int, tile_column: int) -> NDArray[np.uint64] | None:
        """Return what :meth:`put_columns` stored, None where a tile column was not built."""
        query = "SELECT numbers FROM columns WHERE across_level = ? AND tile_column = ?"
        row = self._db.execute(query, (across_level, key_of(tile_column))).fetchone()
        return None if row is None else _numbers(row[0])

    def built_columns(self, across_level: int) -> Iterator[tuple[int, NDArray[np.uint64]]]:
        """Yield number and per-column numbers of the built tile columns of a level, in order."""
        query = "SELECT tile_column, numbers FROM columns WHERE across_level = ? ORDER BY 1"
        for column, blob in self._db.execute(query, (across_level,)):
            yield number_of(column), _numbers(blob)

    def columns(self, across_level: int) -> dict[str, NDArray[np.uint64]]:
        """Return the per-column numbers of a whole across level.

        Returns
        -------
        dict of str to ndarray of uint64, shape (256 * 2**across_level,)
            ``exposure``, ``below``, ``above``, ``escaped``, ``unsettled`` and ``collapsed``; 0 where a tile
            column was not built.
        """
        whole = np.zeros((len(PER_COLUMN), TILE << across_level), np.uint64)
        for column, numbers in self.built_columns(across_level):
            whole[:, column * TILE : (column + 1) * TILE] = numbers
        return dict(zip(PER_COLUMN, whole, strict=True))

    def totals(self) -> dict[str, int]:
        """Return the per-column numbers summed over the whole view."""
        sums = dict.fromkeys(PER_COLUMN, 0)
        for _, numbers in self.built_columns(self.pairs[-1][0]):
            for name, row in zip(PER_COLUMN, numbers, strict=True):
                sums[name] += int(row.sum())
        return sums

    # Fits

    def put_fit(self, fit: Fit) -> None:
        """Store a fit under the name of its shading."""
        self.put_record(f"fit {fit.shading}", json.loads(fit.to_json()))

    def fit(self, shading: str) -> Fit | None:
        """Return the stored fit of a shading, None where there is none."""
        found = self.record(f"fit {shading}")
        return None if found is None else Fit.from_json(json.dumps(found))

    def fit_from(self, pair: Pair | None = None, shading: str = "equalised") -> Fit:
        """Fit a shading to all tiles of a level pair, by default :func:`tiles.grid.middle_pair`.

        Where ``lines`` of the header is true, branches of cycles get the highest shade, see
        :func:`tiles.shading.line_density`.

        Returns
        -------
        Fit
            The same as ``tiles.shading.fit`` makes of the densities of the whole mosaic.
        """
        pair = middle_pair(self.pairs) if pair is None else pair
        height = self.view.up.cell_size(TILE << pair[1])
        tally = Tally()
        for address in list(self.addresses(pair)):
            counts, numbers = self.get(address), self.column_numbers(pair[0], address.column)
            if counts is not None and numbers is not None:
                tally.add(counts, numbers[0], height)
        values, often = tally.distinct()
        return fit_densities(
            values, shading, often, line=line_density(height) if self.header.get("lines") else None
        )


def _place(address: Address) -> tuple[int, int, bytes, bytes]:
    return address[0], address[1], key_of(address[2]), key_of(address[3])


def _numbers(blob: bytes) -> NDArray[np.uint64]:
    return np.frombuffer(zlib.decompress(blob), "<u8").astype(np.uint64).reshape(len(PER_COLUMN), TILE)
