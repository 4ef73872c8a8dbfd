"""Integer addresses of tiles: two levels, one an axis, and numbers of any size."""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from tiles.errors import TooLarge, WindowRefused, nearest

TILE = 256
DEEPEST_LEVEL = 2000
PAIRS = ("diagonal", "all")

Pair = tuple[int, int]


class _Numbers(NamedTuple):
    across_level: int
    up_level: int
    column: int
    row: int


class Address(_Numbers):
    """Address of a tile of 256 x 256 cells; row 0 is the lowest, column 0 the leftmost.

    Tile (A, U, C, R) covers ``[C, C + 1) / 2**A`` of the view across and ``[R, R + 1) / 2**U`` up.
    Addresses sort by level pair, then column, then row.

    Parameters
    ----------
    across_level, up_level : int
        Along each axis the view is cut into ``2**level`` tiles.
    column, row : int
        ``0 <= column < 2**across_level`` and ``0 <= row < 2**up_level``.

    Raises
    ------
    WindowRefused
        When the address lies outside the view.
    TooLarge
        When a level exceeds 2000.

    Examples
    --------
    >>> Address(3, 2, 5, 1).parent_across()
    Address(across_level=2, up_level=2, column=2, row=1)
    """

    __slots__ = ()

    def __new__(cls, across_level: int, up_level: int, column: int, row: int) -> Address:
        """Check the numbers against the levels."""
        for axis, level, number in (("across", across_level, column), ("up", up_level, row)):
            if level > DEEPEST_LEVEL:
                raise TooLarge(f"level {level} {axis} is too deep; the deepest is {DEEPEST_LEVEL}")
            if level < 0 or number < 0 or number >> level:
                raise WindowRefused(
                    f"tile {number} at level {level} {axis} does not exist; "
                    f"levels start at 0 and level k has the tiles 0 to 2**k - 1"
                )
        return super().__new__(cls, across_level, up_level, column, row)

    @property
    def pair(self) -> Pair:
        """The two levels."""
        return self.across_level, self.up_level

    def as_key(self) -> tuple[bytes, bytes, bytes, bytes]:
        """Return the four numbers as blobs that sort as the numbers do."""
        return key_of(self.across_level), key_of(self.up_level), key_of(self.column), key_of(self.row)

    @classmethod
    def from_key(cls, blobs: Iterable[bytes]) -> Address:
        """Return the address whose :meth:`as_key` is given."""
        return cls(*(number_of(blob) for blob in blobs))

    def parent_across(self) -> Address:
        """Return the tile one level coarser across that holds this one."""
        return Address(self.across_level - 1, self.up_level, self.column >> 1, self.row)

    def parent_up(self) -> Address:
        """Return the tile one level coarser up that holds this one."""
        return Address(self.across_level, self.up_level - 1, self.column, self.row >> 1)

    def children_across(self) -> tuple[Address, Address]:
        """Return the left and the right half of this tile, one level deeper across."""
        a, u, c, r = self
        return Address(a + 1, u, 2 * c, r), Address(a + 1, u, 2 * c + 1, r)

    def children_up(self) -> tuple[Address, Address]:
        """Return the lower and the upper half of this tile, one level deeper up."""
        a, u, c, r = self
        return Address(a, u + 1, c, 2 * r), Address(a, u + 1, c, 2 * r + 1)


def key_of(number: int) -> bytes:
    """Return a number of 0 to 2**2000 - 1 as its count of bytes, then the bytes, most significant first.

    Blobs made so compare as the numbers do, whatever their size.
    """
    size = (number.bit_length() + 7) // 8
    return bytes((size,)) + number.to_bytes(size, "big")


def number_of(blob: bytes) -> int:
    """Return the number whose :func:`key_of` is given."""
    return int.from_bytes(blob[1:], "big")


def middle_pair(pairs: Iterable[Pair]) -> Pair:
    """Return the pair nearest to half the deepest levels; of equally near ones the coarsest.

    Examples
    --------
    >>> middle_pair(level_pairs(4, 2, "all"))
    (2, 1)
    """
    built = tuple(pairs)
    across, up = (max(levels) for levels in zip(*built, strict=True))
    return min(
        built, key=lambda pair: ((2 * pair[0] - across) ** 2 + (2 * pair[1] - up) ** 2, sum(pair), pair)
    )


def level_pairs(
    across_level: int, up_level: int, pairs: str | Iterable[Pair] = "diagonal"
) -> tuple[Pair, ...]:
    """Return the level pairs of a tile set.

    Parameters
    ----------
    across_level, up_level : int
        The deepest levels.
    pairs : {"diagonal", "all"} or iterable of (int, int)
        ``diagonal`` halves both axes together, stopping each at 0; ``all`` is every pair up to the deepest;
        a list names pairs one by one. The deepest pair always belongs to the set.

    Returns
    -------
    tuple of (int, int)
        Sorted, without repeats, the deepest pair last.

    Raises
    ------
    WindowRefused
        For an unknown word and for a pair beyond the deepest levels.

    Examples
    --------
    >>> level_pairs(1, 3)
    ((0, 0), (0, 1), (0, 2), (1, 3))
    """
    Address(across_level, up_level, 0, 0)
    if isinstance(pairs, str):
        if pairs == "diagonal":
            steps = range(max(across_level, up_level) + 1)
            chosen = {(max(across_level - step, 0), max(up_level - step, 0)) for step in steps}
        elif pairs == "all":
            chosen = {(a, u) for a in range(across_level + 1) for u in range(up_level + 1)}
        else:
            raise WindowRefused(f"pairs '{pairs}' is unknown{nearest(pairs, PAIRS)}")
        return tuple(sorted(chosen))
    chosen = {(across_level, up_level)}
    for a, u in pairs:
        if not (0 <= a <= across_level and 0 <= u <= up_level):
            raise WindowRefused(
                f"the level pair {a}, {u} is outside the tile set; "
                f"levels go from 0, 0 to {across_level}, {up_level}"
            )
        chosen.add((a, u))
    return tuple(sorted(chosen))
