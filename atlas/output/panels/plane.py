"""Parameter planes as panels: fates found at the raster's own pixels or finer, then coloured."""

from __future__ import annotations

from hashlib import blake2b
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.config.draws import DRAWS
from atlas.config.jobs import Plate
from atlas.figure.legends import class_legend
from atlas.figure.pieces import PanelText, Raster
from atlas.orbits.schedule import Schedule
from atlas.orbits.step import step_source
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.remarks import remarks_on_fates
from atlas.output.reporter import PREPARING, Reporter
from atlas.planes.fates import CLASS_NAMES, CLASS_NONE, class_name
from atlas.planes.finder import FateFinder, Region
from atlas.planes.layers import Values, classes_of
from atlas.planes.searching import finder_of
from atlas.planes.survey import PIXELS_AT_ONCE, Tally, layers_of, survey
from tiles.classes import class_shades, class_table
from tiles.mixing import mixed
from tiles.shading import colour_table
from tiles.values import ValueFit, fit_values, shade_values, value_key_labels

SECONDS_PER_ORBIT, SECONDS_PER_STEP, SECONDS_PER_SLOW_CALL = 1e-6, 0.7e-9, 1.2e-9
BYTES_PER_VALUE, BYTES_PER_FITTED = 4, 24
KERNELS_MEMORY, BYTES_PER_ORBIT, BYTES_PER_STATE, BYTES_OF_SORTING = 10 << 20, 320, 192, 10 << 20
"""Measured: of the kernels; what a thread holds of an orbit, with the results of regions that wait for their
turn, and of each of its states; and what it takes to tell the attractors of a pixel apart."""
FITTED_PIXELS, LINES_SHADED = 1 << 22, 64
CAPTIONS = {
    "lyapunov": "largest Lyapunov exponent (per step)",
    "lyapunov_2": "second Lyapunov exponent (per step)",
    "rotation": "rotation number (turns per step)",
    "escape": "steps to escape",
}
FAR_BELOW = -1e30
"""Stands for the exponent of a superstable cycle, minus infinity, in pictures: it has the lowest shade."""


class PlaneMaker:
    """Makes parameter planes of fates, periods, exponents, rotation numbers, escapes and attractors."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        finder = finder_of(view.plate, view.columns, view.rows)
        pixels = finder.columns * finder.rows
        smooth = view.plate.supersampling > 1
        working = KERNELS_MEMORY + (pixels if smooth else 0)
        if DRAWS[view.plate.draw].palette_kind != "categorical":
            fitted = pixels // fitting_step(finder.rows, finder.columns) ** 2
            working += BYTES_PER_VALUE * pixels + BYTES_PER_FITTED * fitted
        each_worker = worker_memory(finder) + BYTES_OF_SORTING * (view.plate.draw == "attractors")
        return Room(pixels, working, (3 if smooth else 1) * view.cells, each_worker)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        return finding_seconds(finder_of(view.plate, view.columns, view.rows))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Find the fates of a view and colour them."""
        reporter.begin(name, PREPARING, 0)
        finder = finder_of(view.plate, view.columns, view.rows)
        finder.warm()
        reporter.begin(name, "finding fates", finder.columns * finder.rows)
        categorical = DRAWS[view.plate.draw].palette_kind == "categorical"
        picture: _Classes | _Values = _Classes(view, finder) if categorical else _Values(view, finder)
        names = picture.layers

        def look(region: Region) -> tuple[Any, Tally]:
            layers, tally = layers_of(finder, region, names, schedule.stop)
            return picture.kept(layers), tally

        tally = Tally({})

        def done(region: Region, result: tuple[Any, Tally]) -> None:
            picture.put(region, result[0])
            tally.add(result[1])

        survey(finder, look, done, schedule, reporter.advance)
        raster, text = picture.finished()
        shares = tally.shares()
        return Panel(
            raster,
            text,
            shares,
            record_of(finder, view.plate.supersampling),
            finder.columns * finder.rows,
            picture.digest(),
            tuple(remarks_on_fates(view.name, shares) + _remarks_on_starts(view)),
            picture.fit,
        )


def worker_memory(finder: FateFinder) -> int:
    """Return the bytes that a thread works with, and of the regions that wait for their turn."""
    return PIXELS_AT_ONCE * orbit_memory(len(finder.family.states))


def orbit_memory(states: int) -> int:
    """Return the bytes of an orbit on its way to its fate."""
    return BYTES_PER_ORBIT + BYTES_PER_STATE * states


def finding_seconds(finder: FateFinder) -> float:
    """Return the estimated time of one core for a plane, as if every orbit had to be measured."""
    orbits = finder.columns * finder.rows * len(finder.setting.starts)
    steps = finder.rules.transient + finder.rules.steps
    return orbits * (SECONDS_PER_ORBIT + steps * step_seconds(finder))


def step_seconds(finder: FateFinder) -> float:
    """Return the estimated time of one step of an orbit and of what is measured along it."""
    slow = SECONDS_PER_SLOW_CALL * step_source(finder.family).slow_calls
    return SECONDS_PER_STEP * len(finder.family.states) + slow


def _remarks_on_starts(view: View) -> list[str]:
    others = len(view.plate.starts) - 1
    if not others or view.plate.draw == "attractors":
        return []
    return [
        f"{view.name}: a plane of {view.plate.draw} is that of the first start; the {others} other starts "
        "serve draw: attractors alone"
    ]


def record_of(finder: FateFinder, supersampling: int = 1) -> dict[str, Any]:
    """Return what the certificate says of the pixels of a plane."""
    rules = finder.rules
    found: dict[str, Any] = {"columns": finder.columns, "rows": finder.rows}
    found |= {"transient": rules.transient, "steps": rules.steps, "starts": len(finder.setting.starts)}
    return found | ({"supersampling": supersampling} if supersampling > 1 else {})


class _Classes:
    """A picture of classes, kept as palette indices of the small pixels."""

    def __init__(self, view: View, finder: FateFinder) -> None:
        self.view, self.draw, self.factor = view, view.plate.draw, view.plate.supersampling
        self.fit: ValueFit | None = None
        self.lines = np.empty((finder.rows, finder.columns), np.uint8)
        self.classes: dict[int, int] = {}
        self.hash = blake2b(digest_size=16)
        self.layers = {
            "fate": ("fate", "period"),
            "period": ("period",),
            "attractors": ("attractors",),
        }[self.draw]

    def kept(self, layers: dict[str, Values]) -> NDArray[np.uint16]:
        """Return the classes of a region."""
        if self.draw == "fate":
            return classes_of(layers["fate"], layers["period"])
        numbers = layers[self.layers[0]]
        return np.where(numbers == 0, CLASS_NONE, numbers).astype(np.uint16)

    def put(self, region: Region, classes: NDArray[np.uint16]) -> None:
        """Keep a region; regions come in order."""
        rows = len(self.lines)
        shades = class_shades(classes.T[::-1])
        self.lines[rows - region.high : rows - region.low, region.left : region.right] = shades
        self.hash.update(np.ascontiguousarray(classes, "<u2").data)
        for number, often in zip(*np.unique(classes, return_counts=True), strict=True):
            self.classes[int(number)] = self.classes.get(int(number), 0) + int(often)

    def finished(self) -> tuple[Raster, PanelText]:
        """Return the raster and its lettering."""
        plate, table = self.view.plate, class_table()
        legend = class_legend(self.classes, _count_name if self.draw == "attractors" else class_name)
        text = PanelText(label_of(plate, plate.across), label_of(plate, plate.up), legend=legend)
        if self.factor == 1:
            return Raster(self.lines, table, plate.view), text
        return Raster(None, None, plate.view, pixels=mixed(self.lines, table, self.factor)), text

    def digest(self) -> str:
        """Return the digest of all classes."""
        return self.hash.hexdigest()


class _Values:
    """A picture of values of the small pixels."""

    def __init__(self, view: View, finder: FateFinder) -> None:
        self.view, self.layers, self.fit = view, (view.plate.draw,), view.fit
        self.values = np.empty((finder.rows, finder.columns), np.float32)
        self.hash = blake2b(digest_size=16)

    def kept(self, layers: dict[str, Values]) -> Values:
        """Return the values of a region."""
        values = layers[self.layers[0]]
        return np.where(values == -np.inf, FAR_BELOW, values)

    def put(self, region: Region, values: Values) -> None:
        """Keep a region; regions come in order."""
        rows = len(self.values)
        self.values[rows - region.high : rows - region.low, region.left : region.right] = values.T[::-1]
        self.hash.update(np.ascontiguousarray(values, "<f8").data)

    def finished(self) -> tuple[Raster, PanelText]:
        """Return the raster and its lettering."""
        plate = self.view.plate
        fit = self.fit or fit_values(seen_part(self.values), kind=_kind(plate), shading=plate.shading)
        self.fit = fit
        table = colour_table(plate.palette, background=plate.background, missing=plate.missing)
        shades = np.empty(self.values.shape, np.uint8)
        for first in range(0, len(shades), LINES_SHADED):
            lines = slice(first, first + LINES_SHADED)
            shades[lines] = shade_values(self.values[lines], fit)
        text = PanelText(
            label_of(plate, plate.across),
            label_of(plate, plate.up),
            value_key_labels(fit) if plate.key else (),
            CAPTIONS[plate.draw] if plate.key else "",
        )
        if plate.supersampling == 1:
            return Raster(shades, table, plate.view), text
        pixels = mixed(shades, table, plate.supersampling)
        return Raster(None, table, plate.view, pixels=pixels), text

    def digest(self) -> str:
        """Return the digest of all values."""
        return self.hash.hexdigest()


def fitting_step(lines: int, pixels: int) -> int:
    """Return which pixels a fit is made to: of more than four million every second, fourth, … both ways."""
    step = 1
    while -(-lines // step) * -(-pixels // step) > FITTED_PIXELS:
        step *= 2
    return step


def fitted_part(values: NDArray[Any]) -> NDArray[Any]:
    """Return the values that a fit is made to."""
    step = fitting_step(*values.shape)
    return values[::step, ::step]


def seen_part(values: NDArray[Any]) -> NDArray[Any]:
    """Return the values that a fit is made to, without those of superstable cycles, which span no ramp."""
    part = fitted_part(values)
    return part[part > FAR_BELOW]


def _count_name(number: int) -> str:
    if number == CLASS_NONE:
        return CLASS_NAMES[CLASS_NONE]
    return f"{number} attractor{'s' * (number > 1)}"


def _kind(plate: Plate) -> str:
    return DRAWS[plate.draw].palette_kind
