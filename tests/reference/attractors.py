"""A slow twin of basin charts: every start is run long by itself, and sets of states are compared."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

State = tuple[float, ...]
ESCAPED = -1


def states_of(step: Callable[[State], State], start: State, settle: int, kept: int) -> np.ndarray | None:
    """Return the states of an orbit after it has settled; None when it has escaped."""
    state = start
    found = []
    for number in range(settle + kept):
        state = step(state)
        if not all(abs(one) < 1e6 for one in state):
            return None
        if number >= settle:
            found.append(state)
    return np.array(found)


def sorted_starts(
    step: Callable[[State], State], starts: Sequence[State], *, settle: int, kept: int, near: float
) -> list[int]:
    """Return the number of the attractor that each start reaches, from 1 in the order of the starts.

    Two orbits are on the same attractor when some state of one lies within ``near`` of some state of the
    other. Escaped starts get -1.
    """
    known: list[np.ndarray] = []
    numbers = []
    for start in starts:
        states = states_of(step, start, settle, kept)
        if states is None:
            numbers.append(ESCAPED)
            continue
        for number, other in enumerate(known, 1):
            if np.abs(states[:, None] - other[None]).max(axis=2).min() <= near:
                numbers.append(number)
                break
        else:
            known.append(states)
            numbers.append(len(known))
    return numbers
