"""Making tile sets: the index from strips of counted columns, then the static folder."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Callable, Mapping
from functools import partial
from pathlib import Path
from typing import Any, Protocol, TypeVar

import numpy as np
from numpy.typing import NDArray

from atlas.config.digests import counting_digest, normalised
from atlas.config.jobs import TileSet
from atlas.config.keys import JOB_KEYS
from atlas.orbits.counting import Sampled, counter_of, resolved
from atlas.orbits.histogram import block_width
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.schedule import Schedule, schedule
from atlas.output.certificate import certificate
from atlas.output.colouring import Colours, key_caption
from atlas.output.folders import check_folder, check_site
from atlas.output.printing import Made
from atlas.output.remarks import remarks_on
from atlas.output.reporter import PREPARING, Reporter, Silence
from atlas.output.tiled import Places, colours_of, header_of, make_site, tile_columns
from atlas.output.whole_file import PARTS
from atlas.reading.place import REQUEST, Place, path_of
from atlas.reading.view_kinds import Levels, Pairs
from tiles.build import build
from tiles.column import Source
from tiles.index import Index
from tiles.store import intact, written
from tiles.strip import PER_COLUMN, Strip
from tiles.window import View

T = TypeVar("T")
CELLS_PER_STRIP = 1 << 22


class StripSource:
    """Counts the columns of a tile set's deepest level pair when the index asks for them."""

    def __init__(self, counter: OrbitCounter, schedule: Schedule, reporter: Reporter) -> None:
        self.counter, self.schedule, self.reporter = counter, schedule, reporter
        self.width = block_width(counter)

    def __call__(self, first: int, last: int) -> Strip:
        """Return the strip of columns ``first … last - 1``; called in worker threads."""
        counts = np.empty((last - first, self.counter.rows), np.uint32)
        numbers: dict[str, NDArray[np.uint64]] = {
            name: np.empty(last - first, np.uint64) for name in PER_COLUMN
        }
        for begin in range(first, last, self.width):
            end = min(begin + self.width, last)
            at = slice(begin - first, end - first)
            counted = self.counter.count(begin, end, out=counts[at], stop=self.schedule.stop)
            for name, array in numbers.items():
                array[at] = getattr(counted.strip, name)
            self.reporter.advance((end - begin) * self.counter.exposure)
        return Strip(first, counts, **numbers)


def tile_counter(job: TileSet) -> OrbitCounter:
    """Return the counter of a tile set's deepest level pair."""
    return counter_of(job, *job.cells)


def make_tile_set(
    job: TileSet, places: Places, opened: Schedule, reporter: Reporter, at_once: int | None = None
) -> Made:
    """Count a tile set, build its index and its static folder; an interrupted run is continued.

    Parameters
    ----------
    job : TileSet
    places : Places
    opened : Schedule
    reporter : Reporter
    at_once : int, optional
        Most tile columns that may be built side by side, where memory is short.

    Raises
    ------
    OutputFailed
        When the disk is full or the folder is closed.
    """
    reporter.begin(job.name, PREPARING, 0)
    counter = resolved(job, tile_counter(job), opened)
    counter.warm()
    source = StripSource(counter, opened, reporter)
    header = {
        **header_of(job),
        "caption": key_caption(job.up, job.family.label_and_unit(job.up.name)[1]),
        "lines": True,
        "counting": counting_digest(job, counter.columns, counter.rows, samples=counter.rules.samples),
    }
    made: list[Made] = []

    def certified(index: Index) -> Mapping[str, Any]:
        made.append(_made(job, counter, index))
        return made[0].record

    reporter.begin(job.name, "counting", counter.columns * counter.exposure)
    build_tile_set(job, places, source, header, certified, opened, reporter, at_once)
    return made[0]


class Tiled(Colours, Protocol):
    """What the building of a tile set asks of a job."""

    @property
    def view(self) -> View:
        """The whole window."""

    @property
    def levels(self) -> Levels:
        """The deepest levels."""

    @property
    def pairs(self) -> str | Pairs:
        """Which level pairs are built."""


def build_tile_set(
    job: Tiled,
    places: Places,
    source: Source,
    header: Mapping[str, Any],
    certified: Callable[[Index], Mapping[str, Any]],
    opened: Schedule,
    reporter: Reporter,
    at_once: int | None = None,
) -> None:
    """Build index and static folder from a source of strips; an interrupted run is continued.

    Both get their names when both are complete, so that the counts of an interrupted run are not lost.

    Parameters
    ----------
    job : Tiled
    places : Places
    source : callable
        Returns the strip of columns ``first … last - 1`` at the deepest level pair.
    header : mapping
        Of the index; where it differs, an unfinished index is not continued.
    certified : callable
        Returns the certificate of the complete index.
    opened : Schedule
    reporter : Reporter
    at_once : int, optional
        Most tile columns that may be built side by side, where memory is short.

    Raises
    ------
    OutputFailed
        When the disk is full or the folder is closed.
    """

    def finish(index: Index) -> None:
        index.put_fit(index.fit_from(shading=job.shading))
        index.put_certificate(certified(index))

    build(
        places.growing_index,
        job.view,
        across_level=job.levels.across,
        up_level=job.levels.up,
        pairs=job.pairs,
        source=source,
        header=header,
        run=partial(opened.run, at_once=at_once),
        cells_per_strip=CELLS_PER_STRIP,
        unfinished=places.growing_index,
        finish=finish,
    )
    colours = colours_of(job)
    reporter.begin(places.index.parent.name, "tiles", tile_columns(places.growing_index))
    make_site(places.growing_index, places.site, colours, opened, reporter, places.growing_site)
    with written(places.index):
        os.replace(places.growing_index, places.index)


def _made(job: TileSet, counter: OrbitCounter, index: Index) -> Made:
    totals = index.totals()
    exposure = totals["exposure"]
    shares: dict[str, Any] = {
        name: totals[name] / exposure for name in ("below", "above", "escaped", "unsettled")
    }
    shares["collapsed_orbits"] = totals["collapsed"]
    sampled = Sampled(counter.columns, counter.rows, counter.rules.samples, counter.exposure)
    record = certificate(
        "tile set", job.name, normalised(job), index.counts_digest(), shares, sampled.record()
    )
    return Made(sampled.total, record, tuple(remarks_on(job.name, shares)))


def rebuild_site(
    index: Path | str,
    site: Path | str,
    *,
    shading: str | None = None,
    palette: str | None = None,
    background: str | None = None,
    workers: int | None = None,
    reporter: Reporter | None = None,
    place: Place = REQUEST,
) -> None:
    """Write the static folder of a finished index again, by default in the colours that it was made with.

    Parameters
    ----------
    index, site : path
        The index file, and the folder to write.
    shading, palette, background : str, optional
    workers : int, optional
        Threads.
    reporter : Reporter, optional
        Hears of the progress.
    place : Place
        How a refusal calls the colours.

    Raises
    ------
    IndexRefused
        When there is no finished index.
    ConfigRefused
        For a shading, a palette or a colour that does not exist, and for a folder that holds anything else.
    OutputFailed
        When the disk is full or the folder is closed.
    """
    index, site = path_of(index, place.at("index")), path_of(site, place.at("site"))
    given = {"shading": shading, "palette": palette, "background": background, "missing": None}
    chosen = {
        key.name: key.read(given[key.name], place.at(key.name))
        for key in JOB_KEYS
        if given.get(key.name) is not None
    }
    check_site(site)
    with intact(index):
        with Index.open(index) as opened_index:
            plate = opened_index.header.get("plate") or {}
        columns = tile_columns(index)
    check_folder(site.parent)
    colours = {name: chosen.get(name, plate.get(name)) for name in given}
    reporter = reporter or Silence()
    reporter.begin(site.name, "tiles", columns)
    with schedule(workers) as opened:
        make_site(index, site, colours, opened, reporter)
    with contextlib.suppress(OSError):
        (site.parent / PARTS).rmdir()  # kept as long as other unfinished parts live there
