"""Writes the module that finds the fates of the orbits of a family."""

from __future__ import annotations

import re
from collections.abc import Sequence

from atlas.orbits.kernel_source import DISTURB, Writer
from atlas.orbits.lane_kernels import RETURNS
from atlas.orbits.orbit_kernels import FILL, LOOK, VOLUMES
from atlas.orbits.step import StepSource
from atlas.orbits.volumes import lengths
from atlas.planes.plane_kernels import (
    AGAIN,
    DEAD,
    FLEE,
    GONE,
    JUDGE,
    MEASURE,
    MET,
    NEAR,
    OPEN,
    PART_GONE,
)
from atlas.planes.turn_kernels import TURN

WINDOW = 64
"""Steps over which the gaps of an orbit that turns are at their widest once."""
BACKWARD = 2.0**-8
"""Turns about a mean by half a turn, and by so much less, count as backward: else rounding would decide of
every step of a 2-cycle, whose two points lie on opposite sides, which way round it goes."""


def plane_source(source: StepSource, *, lanes: int, mortal: Sequence[int], winding: int | None) -> str:
    """Write the module that finds the fates of the orbits of a family.

    Parameters
    ----------
    source : StepSource
        That draws its own state variables, in their order.
    lanes : int
        Orbits in a group.
    mortal : sequence of int
        State variables that have a threshold of extinction.
    winding : int or None
        The periodic state variable whose turns are counted; without one, turns of the first two about their
        mean.

    Returns
    -------
    str
    """
    writer = PlaneWriter(source, mortal, winding)
    disturbed = [
        writer.written(text.replace(f"def {name}(", f"def {name}_disturbed("), disturb=True)
        for name, text in (("flee", FLEE), ("measure", MEASURE))
    ]
    many = [writer.written(text) for text in (FLEE, MEASURE, RETURNS)]
    if winding is not None or source.states > 1:
        many.append(writer.written(TURN))
    single = [
        writer.written(text, step="one_step") for text in (VOLUMES, LOOK, *_on_cycle(), JUDGE, PART_GONE)
    ]
    text = "\n".join([source.text, writer.single_steps(), *single, *many, *disturbed])
    codes = {"OPEN": OPEN, "GONE": GONE, "DEAD": DEAD, "MET": MET, "NEAR": NEAR, "AGAIN": AGAIN}
    constants = {name: str(code) for name, code in codes.items()}
    constants |= {"LANES": str(lanes), "NV_ALL": str(sum(lengths(source.states)))}
    return writer.named(
        text, constants | {"WINDOW": str(WINDOW), "RESCALED": "32" if source.states == 1 else "16"}
    )


def _on_cycle() -> list[str]:
    """Return the part of the kernels of single orbits that counts nothing."""
    return ["@compiled" + FILL.split("@compiled")[2]]


class PlaneWriter(Writer):
    """Expands the words in capitals of the kernels of planes."""

    def __init__(self, source: StepSource, mortal: Sequence[int], winding: int | None) -> None:
        super().__init__(source, source.states)
        self.mortal, self.winding = mortal, winding

    def _blocks(self, step: str, disturb: bool) -> dict[str, list[str]]:
        blocks = super()._blocks(step, disturb)
        source = self.source
        states, vectors = source.state_names, source.vector_names
        call = ", ".join([*states, *vectors, *source.coefficient_names])
        carried = blocks["STEP"][: 0 if not self.patterned else source.coefficients]
        carried = [*carried, f"{', '.join([*states, *vectors])} = carry({call})"]
        if disturb:
            carried += [*DISTURB, *(f"{name} = {name} * factor" for name in states)]
        return blocks | {
            "CARRY": carried,
            "LOAD_VECTORS": [f"{name} = lv[{k}, l]" for k, name in enumerate(vectors)],
            "STORE_VECTORS": [f"lv[{k}, l] = {name}" for k, name in enumerate(vectors)],
            "LOAD_STATE": [f"{name} = lx[{k}, l]" for k, name in enumerate(states)],
            "DYING": [f"lf[l] = lf[l] | (abs({states[k]}) < low[{k}])" for k in self.mortal],
            "RESCALE": self._rescaled(vectors),
            "TURNED": self._turned(blocks["STEP"]),
        }

    def _words(self) -> dict[str, str]:
        words = super()._words()
        outside = words["OUTSIDE"]
        return words | {"FOUND": f"({outside} | lf[l])" if self.mortal else outside}

    def _chosen(self, text: str) -> str:
        text = super()._chosen(text)
        return re.sub(r"\bMORTAL ", "", text) if self.mortal else re.sub(r" *MORTAL .*\n", "", text)

    def _rescaled(self, vectors: Sequence[str]) -> list[str]:
        lines = []
        at = 0
        for group, side in enumerate(lengths(self.source.states)):
            own = vectors[at : at + side]
            terms = [f"abs({name})" for name in own]
            lines.append(f"most = {terms[0]}")
            for term in terms[1:]:
                lines.append(f"most = {term} if {term} > most else most")
            lines += [
                "power = exponent_of(most)",
                "power = power if power < 1000.0 else 1000.0",
                "factor = two_to(-power)",
                f"le[{group}, l] += power",
                *(f"{name} = {name} * factor" for name in own),
            ]
            at += side
        return lines

    def _turned(self, moved: list[str]) -> list[str]:
        source = self.source
        if self.winding is not None:
            loads = moved[: source.coefficients] if self.patterned else []
            lifted = ", ".join(f"y{k}" for k in range(source.states))
            turn = f"turned = (y{self.winding} - x{self.winding}) * {1.0 / source.widths[self.winding]!r}"
            return [*loads, f"{lifted} = lift{self.call}", turn, *moved]
        return [
            "old = atan2(x1 - lm[1, l], x0 - lm[0, l])",
            *moved,
            "turned = (atan2(x1 - lm[1, l], x0 - lm[0, l]) - old) * 0.15915494309189535",
            f"turned = turned - np.floor(turned + {0.5 + BACKWARD!r})",
        ]
