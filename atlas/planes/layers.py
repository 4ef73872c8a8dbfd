"""What can be known of every pixel of a plane, one layer each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.planes.fates import CLASS_OF_FATE, FATES
from atlas.planes.pixels import Pixels
from atlas.planes.turns import rotation

Values = NDArray[Any]


@dataclass(frozen=True)
class Layer:
    """One layer of a plane: a row of the table :data:`LAYERS`.

    Attributes
    ----------
    name, meaning : str
    kind : type
        Of the numbers.
    take : callable of (Pixels, winding) or None
        Returns the layer of orbits whose fates are known; None where more than one orbit a pixel is needed.
    """

    name: str
    meaning: str
    kind: type[np.generic]
    take: Callable[[Pixels, int | None], Values] | None


LAYERS = {
    row.name: row
    for row in (
        Layer("fate", f"fate: {', '.join(FATES)}", np.uint8, lambda found, _: found.fate),
        Layer("period", "least period of the cycle, 0 without one", np.uint16, lambda found, _: found.period),
        Layer(
            "lyapunov",
            "largest Lyapunov exponent, natural logarithm per step",
            np.float64,
            lambda found, _: found.exponents[0],
        ),
        Layer(
            "lyapunov_2",
            "second Lyapunov exponent, natural logarithm per step",
            np.float64,
            lambda found, _: found.exponents[1],
        ),
        Layer(
            "lyapunov_error",
            "standard error of the largest Lyapunov exponent",
            np.float64,
            lambda found, _: found.error,
        ),
        Layer("rotation", "rotation number, turns per step", np.float64, rotation),
        Layer(
            "escape",
            "steps to escape, smooth between whole numbers",
            np.float64,
            lambda found, _: found.escape,
        ),
        Layer("attractors", "number of attractors that the starts reach", np.uint16, None),
    )
}


def classes_of(fate: NDArray[np.uint8], period: NDArray[np.uint16]) -> NDArray[np.uint16]:
    """Return the class of every pixel: the period of its cycle, else the class of its fate."""
    own = np.array(CLASS_OF_FATE, np.uint16)[fate]
    return np.where(period > 0, period, own)
