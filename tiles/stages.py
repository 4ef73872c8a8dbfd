"""In which order the level pairs of a tile set are built, and how many across levels a task takes at once."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from tiles.grid import Pair

_LEVELS_AT_ONCE = 2
_TASKS_WANTED = 16
_ROWS_AT_ONCE = 1024


@dataclass(frozen=True)
class Stage:
    """Across levels built in one go: a task makes a tile column of the coarsest and all finer ones in it.

    Attributes
    ----------
    leaf : (int, int)
        The level pair that a task starts from.
    first : bool
        Whether the leaves come from the source, and are stored, instead of from the index.
    top : int
        The coarsest across level built.
    ups : dict of int to tuple of int
        Up levels to be stored, by across level.
    """

    leaf: Pair
    first: bool
    top: int
    ups: dict[int, tuple[int, ...]]

    def carried(self, level: int) -> int:
        """Return the up level at which tiles of an across level are handed to the next coarser one."""
        return max(up for a, ups in self.ups.items() if a < level for up in ups)


def stages(pairs: Iterable[Pair]) -> Iterator[Stage]:
    """Yield the stages that build level pairs, the deepest first."""
    ups: dict[int, tuple[int, ...]] = {}
    for a, u in sorted(pairs):
        ups[a] = (*ups.get(a, ()), u)
    levels = sorted(ups, reverse=True)
    deepest = (levels[0], ups[levels[0]][-1])
    done = 0
    while done < len(levels):
        level = levels[done]
        needed = max(ups[a][-1] for a in levels[done:])
        leaf = deepest if done == 0 else _leaf(levels[:done], ups, needed)
        depth = min(_LEVELS_AT_ONCE, max(0, leaf[0] - _TASKS_WANTED.bit_length() + 1))
        if 2**depth << leaf[1] > _ROWS_AT_ONCE:
            depth = 0
        top = min([a for a in levels[done:] if a >= leaf[0] - depth], default=level)
        inside = {a: ups[a] for a in levels[done:] if a >= top}
        yield Stage(leaf, done == 0, top, inside)
        done += len(inside)


def _leaf(levels: list[int], ups: dict[int, tuple[int, ...]], needed: int) -> Pair:
    """Return the stored pair that is cheapest to start from and fine enough in up."""
    a = min(level for level in levels if ups[level][-1] >= needed)
    return a, min(up for up in ups[a] if up >= needed)
