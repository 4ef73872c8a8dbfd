"""From a job of a config to the finder of its fates."""

from __future__ import annotations

from atlas.config.jobs import Job, Plate
from atlas.plan import check_pixels
from atlas.planes.finder import FateFinder
from atlas.planes.pixels import FateRules


def finder_of(job: Job, columns: int, rows: int) -> FateFinder:
    """Return the finder of a job's fates at a resolution, refused where float64 cannot hold it.

    Parameters
    ----------
    job : Job
        Of a plane or a basin chart; a plate's supersampling multiplies the resolution.
    columns, rows : int
        Of the picture.

    Raises
    ------
    PlanRefused
    """
    factor = job.supersampling if isinstance(job, Plate) else 1
    rules = FateRules(job.transient, job.steps, job.transient_limit, job.longest_period)
    finder = FateFinder(
        job.family,
        job.view,
        columns * factor,
        rows * factor,
        rules,
        set=job.set,
        starts=job.starts,
        extinct=job.extinct,
    )
    check_pixels(job.view, finder.columns, finder.rows, job.name)
    return finder
