"""Writes the module that counts the orbits of a family: step, kernels in lanes, kernels of single orbits."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from math import gcd

from atlas.orbits.lane_kernels import ADVANCE, CHUNK, PART, RETURNS, SAMPLE
from atlas.orbits.orbit_kernels import (
    AGAIN,
    CELL_OF,
    DECIDE,
    FILL,
    FILLED,
    GONE,
    LOOK,
    READY,
    REPLAY,
    SLOW,
    VOLUMES,
)
from atlas.orbits.step import StepSource
from atlas.orbits.volumes import lengths

DISTURB = (
    "z = lk[l] + np.uint64({number}) * np.uint64(0x9E3779B97F4A7C15)",
    "z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)",
    "z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)",
    "z = z ^ (z >> np.uint64(31))",
    "factor = 1.0 - float(z >> np.uint64(11)) * 2.0 ** -93",
)
"""Multiplies a state by 1 - u * 2**-40 with u hashed from orbit and step by the finaliser of SplitMix64
(Steele, Lea & Flood 2014, OOPSLA; constants from memory)."""


def kernel_source(source: StepSource, logarithmic: Sequence[bool], *, lanes: int, every: int = 1) -> str:
    """Write the module that counts the orbits of a family.

    Parameters
    ----------
    source : StepSource
        The compiled map; what it draws runs along the counted axes, ``up`` first.
    logarithmic : sequence of bool
        Whether each counted axis is logarithmic.
    lanes : int
        Orbits in a group.
    every : int
        Steps from one recorded state to the next.

    Returns
    -------
    str
    """
    writer = Writer(source, len(logarithmic), every)
    disturbed = [
        writer.written(text.replace(f"def {name}(", f"def {name}_disturbed("), step=step, disturb=True)
        for name, text, step in (
            ("advance", ADVANCE, "step"),
            ("sample", SAMPLE, "step"),
            ("replay", REPLAY, "one_step"),
        )
    ]
    many = [writer.written(text) for text in (ADVANCE, RETURNS, SAMPLE)]
    cells = [CELL_OF.replace("AXIS", str(number)) for number in range(len(logarithmic))]
    single = [writer.written(text, step="one_step") for text in (*cells, VOLUMES, LOOK, FILL, REPLAY, DECIDE)]
    scales = {f"SCALED{number}": "log" if log else "" for number, log in enumerate(logarithmic)}
    text = "\n".join([source.text, writer.single_steps(), *single, *many, *disturbed])
    return writer.named(text, scales | {"LANES": str(lanes)})


class Writer:
    """Expands the words in capitals of kernels.

    Parameters
    ----------
    source : StepSource
    axes : int
        How many axes are counted.
    every : int
        Steps from one recorded state to the next.
    """

    def __init__(self, source: StepSource, axes: int, every: int = 1) -> None:
        self.source, self.axes, self.every = source, axes, every
        self.patterned = len(source.word) > 1
        self.unroll = 1 if source.slow_calls or self.patterned or every > 1 else 4
        self.call = f"({', '.join([*source.state_names, *source.coefficient_names])})"

    def single_steps(self) -> str:
        """Write step and derivatives as functions of their own, for code that follows one orbit."""
        return "\n".join(
            f"@compiled\ndef one_{name}{self.call}:\n    return {name}{self.call}\n"
            for name in ("step", "slope", "minors", "lift")
        )

    def named(self, text: str, more: Mapping[str, str]) -> str:
        """Put the constants of the family and of the view in the place of their names."""
        sides = lengths(self.source.states)
        constants = {
            "NX": str(self.source.states),
            "NC": str(max(self.source.coefficients, 1)),
            "NV": str(max(sides)),
            "ROWS": str(self.source.rows),
            "SIDES": _tuple(sides),
            "WIDTHS": _tuple(self.source.widths),
            "AXIS_COUNT": str(self.axes),
            "TURNS": "3" if self.source.states == 1 else "8",
            "CHUNK": str(CHUNK),
            "PART": str(PART),
            "UNROLL": str(self.unroll),
            "EVERY": str(self.every),
            "CYCLE": str(self.cycle),
            "READY": str(READY),
            "AGAIN": str(AGAIN),
            "FILLED": str(FILLED),
            "SLOW": str(SLOW),
            "GONE": str(GONE),
            **more,
        }
        return re.sub(r"\b(" + "|".join(constants) + r")\b", lambda match: constants[match[0]], text)

    @property
    def cycle(self) -> int:
        """Recorded states after which the patterns begin anew."""
        return len(self.source.word) // gcd(len(self.source.word), self.every)

    def _shown_widths(self) -> list[float]:
        names = self.source.state_names
        return [
            self.source.widths[names.index(shown)] if shown in names else 0.0 for shown in self.source.drawn
        ]

    def written(self, text: str, *, step: str = "step", disturb: bool = False) -> str:
        """Return the text of kernels with everything expanded but the constants."""
        text = self._chosen(text)
        text = re.sub(r" *REPEAT\n(.*?) *END_REPEAT\n", self._repeated, text, flags=re.DOTALL)
        blocks = self._blocks(step, disturb)
        words = self._words()
        lines = []
        for line in text.splitlines():
            word, _, rest = line.strip().partition(" ")
            word, _, number = word.partition("@")
            indent = line[: len(line) - len(line.lstrip())]
            if word in blocks:
                lines += [
                    indent + one.replace("{number}", rest).replace("{k}", number or "0")
                    for one in blocks[word]
                ]
            else:
                lines.append(line)
        pattern = re.compile(r"\b(" + "|".join(words) + r")\b")
        return pattern.sub(lambda match: words[match[0]], "\n".join(lines))

    def _chosen(self, text: str) -> str:
        """Keep the parts that this family and this view need."""
        for name, keep in {
            "REST": self.unroll > 1,
            "SECOND": self.axes > 1,
            "SINGLE": self.source.states == 1,
            "SEVERAL": self.source.states > 1,
        }.items():
            if not keep:
                text = re.sub(rf" *BEGIN_{name}\n.*? *END_{name}\n", "", text, flags=re.DOTALL)
            text = re.sub(rf" *(BEGIN|END)_{name}\n", "", text)
        return re.sub(r" *SECOND .*\n", "", text) if self.axes == 1 else re.sub(r"\bSECOND ", "", text)

    def _repeated(self, match: re.Match[str]) -> str:
        copies = []
        for k in range(self.unroll):
            copy = re.sub(r"\b(STEP|CARRY)\b", rf"\1@{k}", match[1])
            copies.append(re.sub(r"\bKTH\b", str(k), copy))
        return "".join(copies)

    def _words(self) -> dict[str, str]:
        states, widths = self.source.state_names, self.source.widths
        distance = _largest(
            [
                _gap(name, f"rx[{k}, l]", width)
                for k, (name, width) in enumerate(zip(states, widths, strict=True))
            ]
        )
        shown = self.source.drawn
        cells, seen = _cell(shown), _cell([f"seen{number}[k, l]" for number in range(self.axes)])
        return {
            "OUTSIDE": "(not (" + " and ".join(f"abs({name}) < bound" for name in states) + "))",
            "SAME": "(" + " & ".join(f"({name} == rx[{k}, l])" for k, name in enumerate(states)) + ")",
            "DISTANCE": f"({distance} + far)" if self.cycle > 1 else distance,
            "LARGEST": _largest([f"abs({name})" for name in states]),
            "STATE": f"({', '.join(states)},)",
            "GAP": _largest(
                [
                    _gap(name, f"o{k}", width)
                    for k, (name, width) in enumerate(zip(states, widths, strict=True))
                ]
            ),
            "SLOPE": f"one_slope{self.call}",
            "MINORS": f"one_minors{self.call}" if len(states) > 1 else f"(one_minors{self.call},)",
            "SHOWN": f"({', '.join(shown)},)",
            **{f"SHOWN{number}": expression for number, expression in enumerate(shown)},
            "CELL": cells,
            "CELL_SEEN": seen,
            "AXES": ", ".join(f"axis{number}, edges{number}" for number in range(self.axes)),
        }

    def _blocks(self, step: str, disturb: bool) -> dict[str, list[str]]:
        states, coefficients = self.source.state_names, self.source.coefficient_names
        scalar = step == "one_step"
        where = "w{k} + " if self.patterned else ""
        loads = [f"{name} = lc[{where}{k}, l]" for k, name in enumerate(coefficients)]
        single = [
            f"{name} = c[{'w0 + ' if self.patterned else ''}{k}, m]" for k, name in enumerate(coefficients)
        ]
        turn = "w0 = word[({number}) % word.size] * NC"
        moved = [f"{', '.join(states)} = {step}{self.call}"]
        if disturb:
            moved += [*DISTURB, *(f"{name} = {name} * factor" for name in states)]
        if self.patterned and not scalar:
            moved = loads + moved
        store = [f"lx[{k}, l] = {name}" for k, name in enumerate(states)]
        load = [f"{name} = lx[{k}, l]" for k, name in enumerate(states)]
        numbered = "float({number})"
        if self.cycle > 1:
            numbered += " if ({number}) % CYCLE == 0 else np.inf"
        return {
            "LOAD": load + ([] if self.patterned else loads),
            "LOAD_ORBIT": [f"{name} = x[{k}, m]" for k, name in enumerate(states)]
            + ([] if self.patterned else single),
            "STORE": store,
            "STEP": moved,
            "AT": [turn, *single] if self.patterned else [],
            "PHASE": [turn] if self.patterned else [],
            "SKIP": self._skipped(load, loads, moved, store) if self.every > 1 else [],
            "FAR": ["far = 0.0 if {number} % CYCLE == 0 else np.inf"] if self.cycle > 1 else [],
            "NUMBER": [f"number = {numbered}"],
            "REMEMBER": [f"o{k} = {name}" for k, name in enumerate(states)]
            + [f"q{number} = {shown}" for number, shown in enumerate(self.source.drawn)],
            "COMPARE": [
                f"work[{number}, turn] = {_gap(shown, f'q{number}', width)}"
                for number, (shown, width) in enumerate(
                    zip(self.source.drawn, self._shown_widths(), strict=True)
                )
            ],
            "NOTE": [f"{{number}}[{k}, n] = {name}" for k, name in enumerate(states)],
        }

    def _skipped(self, load: list[str], loads: list[str], moved: list[str], store: list[str]) -> list[str]:
        """Return the steps from one recorded state to before the next, numbered from the first of them."""
        inner = load + ([] if self.patterned else loads)
        inner += [line.replace("{number}", "{number} + e + 1") for line in moved] + store
        turn = ["    w0 = word[({number} + e) % word.size] * NC"] if self.patterned else []
        return [
            "for e in range(EVERY - 1):",
            *turn,
            "    for l in range(LANES):",
            *(f"        {line}" for line in inner),
        ]


def _tuple(values: Sequence[float]) -> str:
    return f"({', '.join(map(repr, values))},)"


def _gap(name: str, old: str, width: float) -> str:
    return f"around({name} - {old}, {width!r})" if width else f"abs({name} - {old})"


def _largest(terms: list[str]) -> str:
    return terms[0] if len(terms) == 1 else f"max({', '.join(terms)})"


def _cell(shown: Sequence[str]) -> str:
    if len(shown) < 2:
        return f"cell_of0({shown[0]}, axis0, edges0)" if shown else "0"
    return f"cell_of0({shown[0]}, axis0, edges0) + (edges0.size + 1) * cell_of1({shown[1]}, axis1, edges1)"
