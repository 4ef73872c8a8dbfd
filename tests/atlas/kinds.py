"""The small config of planes, portraits, basins and followed attractors, and the Datasets behind it."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

import atlas
from atlas.config.jobs import Figure, Job, Plate
from atlas.figure.boxes import Box
from atlas.output.printing import sheet_of
from atlas.planes.fates import CLASS_NONE, CLASS_OF_FATE
from tiles.window import View

KINDS = Path(__file__).with_name("kinds.yaml")


@lru_cache(maxsize=1)
def config() -> Any:
    """Return the small config."""
    return atlas.load(KINDS)


def boxes(record: Plate | Figure) -> dict[str, Box]:
    """Return where each raster stands on its page, insets as well."""
    found = {}
    for panel in sheet_of(record).page.panels:
        found[panel.name] = panel.raster
        if panel.inset:
            found[f"{panel.name}/inset"] = panel.inset.raster
    return found


def cut(pixels: NDArray[np.uint8], box: Box) -> NDArray[np.uint8]:
    """Return a part of a page."""
    return pixels[box.top : box.bottom, box.left : box.right]


def plane(job: Job, columns: int, rows: int, *layers: str, view: View | None = None) -> Any:
    """Return layers of a job as `atlas.parameter_plane` gives them."""
    return atlas.parameter_plane(
        job.family, view or job.view, size=(columns, rows), layers=layers, **_orbits(job), steps=job.steps
    )


def classes_of(job: Job, columns: int, rows: int) -> NDArray[np.uint16]:
    """Return the classes of a job's fate, period or attractors, shape (rows, columns), lowest row first."""
    if job.draw == "fate":
        found = plane(job, columns, rows, "fate", "period")
        fate, period = found.fate.values, found.period.values
        return np.where(period > 0, period, np.array(CLASS_OF_FATE, np.uint16)[fate])
    numbers = plane(job, columns, rows, job.draw)[job.draw].values
    return np.where(numbers == 0, CLASS_NONE, numbers).astype(np.uint16)


def basins(job: Job, columns: int, rows: int) -> Any:
    """Return the basins of a job as `atlas.basins` gives them."""
    return atlas.basins(
        job.family, job.view, size=(columns, rows), **_orbits(job), steps=job.steps, extinct=job.extinct
    )


def portrait(job: Job, columns: int, rows: int) -> Any:
    """Return the counts of a job as `atlas.phase_portrait` gives them."""
    return atlas.phase_portrait(
        job.family, job.view, size=(columns, rows), samples=job.samples, **_orbits(job)
    )


def followed(job: Job, columns: int, rows: int) -> Any:
    """Return the counts of a job as `atlas.orbit_counts` gives them."""
    return atlas.orbit_counts(
        job.family,
        job.view,
        size=(columns, rows),
        samples=job.samples,
        values_per_column=job.values_per_column,
        follow=job.follow,
        **_orbits(job),
    )


def _orbits(job: Job) -> dict[str, Any]:
    names = ("set", "starts", "transient", "transient_limit", "longest_period")
    return {name: getattr(job, name) for name in names}
