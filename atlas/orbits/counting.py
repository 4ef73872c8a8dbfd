"""From a job of a config to the counter of its orbits."""

from __future__ import annotations

from dataclasses import dataclass

from atlas.config.draws import KINDS
from atlas.config.jobs import Job, TileSet
from atlas.errors import PlanRefused
from atlas.orbits.orbit import OrbitCounter, Rules
from atlas.orbits.portrait import PortraitCounter, most_samples
from atlas.orbits.portrait_counts import automatic_samples
from atlas.orbits.sampling import IN_TILES, LEAST, ON_PLATES, automatic, whole_height
from atlas.orbits.schedule import Schedule
from atlas.plan import check_counter, check_portrait
from tiles.errors import TooLarge


def counter_of(job: Job, columns: int, rows: int) -> OrbitCounter:
    """Return the counter of a job's orbits at a resolution, refused where float64 or a count cannot hold it.

    With ``samples: auto`` it has the samples that suffice where the attractor lies inside the view;
    :func:`resolved` looks closer.

    Raises
    ------
    PlanRefused
    """
    if job.kind not in ("histogram", "follow"):
        raise PlanRefused(f"{job.name}: {KINDS[job.kind]} has no columns of samples")
    samples = job.samples
    if not isinstance(samples, int):
        samples = whole_height(rows, job.values_per_column * len(job.starts), counts_per_cell(job))
    rules = rules_of(job, samples)
    counter = OrbitCounter(job.family, job.view, columns, rows, rules, set=job.set, starts=job.starts)
    check_counter(counter, job.name)
    return counter


def rules_of(job: Job, samples: int) -> Rules:
    """Return how the orbits of a job are sampled."""
    every, phase = job.record or (1, 0)
    return Rules(
        job.transient,
        job.transient_limit,
        samples,
        job.values_per_column,
        job.longest_period,
        every=every,
        phase=phase,
    )


def portrait_of(job: Job, columns: int, rows: int) -> PortraitCounter:
    """Return the counter of the orbits of a phase portrait, refused where it cannot be counted.

    With ``samples: auto`` it has those of an attractor that fills the view; :func:`resolved_portrait` looks
    closer.

    Raises
    ------
    PlanRefused, TooLarge
    """
    starts = len(job.starts)
    samples = job.samples
    if not isinstance(samples, int):
        samples = min(max(LEAST, counts_per_cell(job) * columns * rows // starts), most_samples(starts))
    rules = rules_of(job, samples)
    try:
        counter = PortraitCounter(job.family, job.view, columns, rows, rules, set=job.set, starts=job.starts)
    except TooLarge as problem:
        raise TooLarge(f"{job.name}: {problem}") from None
    exposure = counter.exposure if isinstance(job.samples, int) else 0
    check_portrait(
        job.view,
        columns,
        rows,
        samples=samples,
        exposure=exposure,
        most=most_samples(starts),
        where=job.name,
    )
    return counter


def resolved_portrait(job: Job, counter: PortraitCounter, schedule: Schedule) -> PortraitCounter:
    """Return the counter with the samples that a pilot found for ``samples: auto``."""
    if isinstance(job.samples, int):
        return counter
    counter.warm()
    found: list[int] = []
    schedule.run([lambda: automatic_samples(counter, counts_per_cell(job), schedule.stop)], found.append)
    return counter.with_samples(found[0])


def resolved(job: Job, counter: OrbitCounter, schedule: Schedule) -> OrbitCounter:
    """Return the counter with the samples that a pilot found for ``samples: auto``."""
    if isinstance(job.samples, int):
        return counter
    return counter.with_samples(piloted(counter, schedule, counts_per_cell(job)))


def piloted(counter: OrbitCounter, schedule: Schedule, counts_per_cell: int = ON_PLATES) -> int:
    """Return the samples of each orbit that a pilot finds; it runs on a worker, so that it can be stopped."""
    counter.warm()
    found: list[int] = []
    schedule.run([lambda: automatic(counter, counts_per_cell, schedule.stop)], found.append)
    return found[0]


def counts_per_cell(job: Job) -> int:
    """Return the mean counts that ``samples: auto`` aims at: fewer in tiles, whose cells are so many more."""
    return IN_TILES if isinstance(job, TileSet) else ON_PLATES


@dataclass(frozen=True)
class Sampled:
    """What the certificate says of the samples of one view."""

    columns: int
    rows: int
    samples_of_each_orbit: int
    exposure: int
    filled_by_repeats: int | None = None

    @property
    def total(self) -> int:
        """Samples of all columns."""
        return self.columns * self.exposure

    def record(self) -> dict[str, int]:
        """Return the numbers by name; those that are not known are left out."""
        numbers = {
            "columns": self.columns,
            "rows": self.rows,
            "of_each_orbit": self.samples_of_each_orbit,
            "of_each_column": self.exposure,
        }
        if self.filled_by_repeats is not None:
            numbers["filled_by_repeats"] = self.filled_by_repeats
        return numbers
