"""The index of a tile set of planes: class counts and sums of values instead of counts (see INDEX.md)."""

from __future__ import annotations

import hashlib
import json
import zlib
from collections.abc import Iterable, Iterator
from typing import Any, NamedTuple

import numpy as np

from tiles.codec import Encoded, decode, encode
from tiles.errors import IndexRefused
from tiles.grid import TILE, Address, Pair, key_of, middle_pair, number_of
from tiles.index import Index
from tiles.plane import Floats, PlaneSums, ValueSums
from tiles.value_codec import decode_sums, encode_sums
from tiles.values import ValueFit, fit_values

_AT = "across_level = ? AND up_level = ? AND tile_column = ? AND tile_row = ?"
_OF_PAIR = "WHERE across_level = ? AND up_level = ?"
_FITTED_CELLS = 1 << 22


class EncodedPlane(NamedTuple):
    """A tile of a plane as the index stores it.

    Attributes
    ----------
    classes : list of (int, Encoded)
        Class and its encoded counts.
    values : list of (str, Encoded, bytes)
        Layer, its encoded sums, and the blob of its numbers of finite values.
    """

    classes: list[tuple[int, Encoded]]
    values: list[tuple[str, Encoded, bytes]]


def encode_plane(plane: PlaneSums) -> EncodedPlane:
    """Return a tile of a plane as the index stores it."""
    classes = [(number, tile) for number, counts in plane.classes.items() if (tile := encode(counts))]
    values = []
    for name, found in plane.values.items():
        numbers = encode(found.numbers)
        if numbers is not None:
            values.append((name, encode_sums(found.sums, numbers.digest), numbers.blob))
    return EncodedPlane(classes, values)


class PlaneIndex(Index):
    """An open index of a tile set of planes; its tiles are never empty."""

    @property
    def class_layer(self) -> str:
        """Name of the layer of classes."""
        return str(self.header["class_layer"])

    @property
    def value_layers(self) -> tuple[dict[str, Any], ...]:
        """The layers of values as the header describes them: name, label, palette_kind and more."""
        return tuple(dict(layer) for layer in self.header.get("value_layers") or ())

    # Tiles

    def put_plane(self, address: Address, tile: EncodedPlane) -> None:
        """Store a tile, which must not be there yet."""
        at = (address[0], address[1], key_of(address[2]), key_of(address[3]))
        self._db.executemany(
            "INSERT INTO classes VALUES (?, ?, ?, ?, ?, ?, ?)",
            ((*at, number, found.digest, found.blob) for number, found in tile.classes),
        )
        self._db.executemany(
            "INSERT INTO sums VALUES (?, ?, ?, ?, ?, ?, ?, ?)",
            ((*at, name, found.digest, found.blob, numbers) for name, found, numbers in tile.values),
        )

    def plane(self, address: Address) -> PlaneSums:
        """Return a tile.

        Raises
        ------
        IndexRefused
            When it was not built or is damaged.
        """
        at = (address[0], address[1], key_of(address[2]), key_of(address[3]))
        counts = self._db.execute(f"SELECT class, counts FROM classes WHERE {_AT} ORDER BY class", at)
        sums = self._db.execute(f"SELECT layer, sums, numbers FROM sums WHERE {_AT} ORDER BY layer", at)
        try:
            classes = {number: decode(blob) for number, blob in counts}
            values = {name: ValueSums(decode_sums(blob), decode(numbers)) for name, blob, numbers in sums}
        except (ValueError, zlib.error):
            raise IndexRefused(
                f"{self.path}: the tile at {tuple(address)} is damaged; build it again"
            ) from None
        if not classes:
            raise IndexRefused(f"{self.path}: the tile at {tuple(address)} is missing; build it again")
        return PlaneSums(classes, values)

    def has(self, address: Address) -> bool:
        """Return whether a tile is stored."""
        at = (address[0], address[1], key_of(address[2]), key_of(address[3]))
        return self._db.execute(f"SELECT 1 FROM classes WHERE {_AT}", at).fetchone() is not None

    def addresses(self, pair: Pair) -> Iterator[Address]:
        """Yield the addresses of the stored tiles of a level pair, in order."""
        query = (
            f"SELECT DISTINCT tile_column, tile_row FROM classes {_OF_PAIR} ORDER BY tile_column, tile_row"
        )
        for column, row in self._db.execute(query, pair):
            yield Address(*pair, number_of(column), number_of(row))

    def class_totals(self) -> dict[int, int]:
        """Return how many pixels of the view have each class, by class, ascending.

        Every level pair holds the same pixels, so those of the pair with the fewest tiles are added.
        """
        totals: dict[int, int] = {}
        query = f"SELECT class, counts FROM classes {_OF_PAIR} ORDER BY class"
        for number, blob in self._db.execute(query, min(self.pairs, key=sum)):
            totals[number] = totals.get(number, 0) + int(decode(blob).sum(dtype=np.uint64))
        return totals

    def counts_digest(self) -> str:
        """Return a digest of all classes and values of the deepest level pair, 64 hexadecimal digits."""
        digest = hashlib.sha256()
        order = "ORDER BY tile_column, tile_row"
        query = f"SELECT tile_column, tile_row, class, digest FROM classes {_OF_PAIR} {order}, class"
        for column, row, number, found in self._db.execute(query, self.pairs[-1]):
            digest.update(b"".join((column, row, number.to_bytes(2, "big"), found)))
        query = f"SELECT tile_column, tile_row, layer, digest FROM sums {_OF_PAIR} {order}, layer"
        for column, row, name, found in self._db.execute(query, self.pairs[-1]):
            digest.update(b"".join((column, row, name.encode(), b"\0", found)))
        return digest.hexdigest()

    # Fits

    def put_value_fit(self, layer: str, fit: ValueFit) -> None:
        """Store the fit of a layer of values."""
        self.put_record(f"fit of {layer}", json.loads(fit.to_json()))

    def value_fit(self, layer: str) -> ValueFit | None:
        """Return the stored fit of a layer of values, None where there is none."""
        found = self.record(f"fit of {layer}")
        return None if found is None else ValueFit.from_json(json.dumps(found))

    def value_fit_from(
        self, layer: str, kind: str, *, shading: str = "equalised", pair: Pair | None = None
    ) -> ValueFit:
        """Fit the shades of a layer to the means of a level pair, by default the middle one.

        Of a pair with more than four million cells, every second (fourth, …) cell along both axes is taken.

        Parameters
        ----------
        layer : str
        kind : str
            Of palette: sequential, diverging or cyclic.
        shading : str
            Of sequential values.
        pair : (int, int), optional
        """
        pair = middle_pair(self.pairs) if pair is None else pair
        step = 1
        while (TILE // step) ** 2 << sum(pair) > _FITTED_CELLS and step < TILE:
            step *= 2
        found: list[Floats] = [np.zeros(0)]
        for address in list(self.addresses(pair)):
            means = self.plane(address).means(layer)[::step, ::step]
            found.append(means[np.isfinite(means)])
        return fit_values(np.concatenate(found), kind=kind, shading=shading)


def missing(index: PlaneIndex, pair: Pair) -> Iterable[Address]:
    """Return the addresses of a level pair that are not stored yet, column after column."""
    built = set(index.addresses(pair))
    every = (Address(*pair, column, row) for column in range(2 ** pair[0]) for row in range(2 ** pair[1]))
    return (address for address in every if address not in built)
