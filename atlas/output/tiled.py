"""What every tile set needs around its numbers: places, the header of its index, its static folder."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any, TypeVar

from atlas.config.digests import normalised
from atlas.config.jobs import TileSet
from atlas.families import catalogue
from atlas.families.map_family import Family
from atlas.orbits.schedule import Schedule
from atlas.output.colouring import Colours
from atlas.output.reporter import Reporter
from tiles.index import Index
from tiles.site import build_site

T = TypeVar("T")


@dataclass(frozen=True)
class Places:
    """Where the parts of a tile set go."""

    index: Path
    site: Path
    growing_index: Path
    growing_site: Path

    @classmethod
    def of(cls, out: Path, name: str) -> Places:
        """Return the places in an output folder."""
        parts = out / ".parts"
        return cls(
            out / name / "index.sqlite", out / name / "site", parts / f"{name}.sqlite", parts / f"{name}.site"
        )


def make_site(
    index: Path,
    site: Path,
    colours: Mapping[str, str | None],
    opened: Schedule,
    reporter: Reporter,
    growing: Path | None = None,
) -> None:
    """Write the static folder of an index in given colours."""

    def run(tasks: Iterable[Callable[[], T]], done: Callable[[T], None]) -> None:
        def told(task: Callable[[], T]) -> T:
            result = task()
            reporter.advance(1)
            return result

        opened.run((partial(told, task) for task in tasks), done)

    chosen = {key: value for key, value in colours.items() if value is not None}
    build_site(index, site, run=run, unfinished=growing, **chosen)


def tile_columns(path: Path) -> int:
    """Return how many tile columns of all level pairs hold something."""
    with Index.open(path) as index:
        if index.header.get("kind") == "plane":
            return sum(1 << across for across, _ in index.pairs)
        return sum(len(index.present(pair)) for pair in index.pairs)


def header_of(job: TileSet) -> dict[str, Any]:
    """Return what an index keeps of its job beside its geometry."""
    settings = {
        key: value
        for key, value in normalised(job)["settings"].items()
        if key not in ("across", "up", "levels", "pairs", "title")
        and (value not in (None, {}, [], False) or (key == "extinct" and job.family.extinct))
    }
    names = (job.across.name, job.up.name)
    return {
        "title": job.title or f"{job.family.title}: {job.up.name} across {job.across.name}",
        "family": job.family.title,
        "formula": job.family.formula_lines(),
        "note": job.family.note,
        "labels": {name: job.family.label_and_unit(name)[0] for name in names},
        "units": {name: job.family.label_and_unit(name)[1] for name in names},
        "plate": settings,
        "families": {} if _of_catalogue(job.family) else {job.family.name: job.family.as_config()},
    }


def colours_of(job: Colours) -> dict[str, str | None]:
    """Return the colours of a job by key."""
    return {
        "shading": job.shading,
        "palette": job.palette,
        "background": job.background,
        "missing": job.missing,
    }


def _of_catalogue(family: Family) -> bool:
    return family.name in catalogue.NAMES and catalogue.family(family.name).digest() == family.digest()
