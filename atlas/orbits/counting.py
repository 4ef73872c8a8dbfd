"""From a job of a config to the counter of its orbits."""

from __future__ import annotations

from dataclasses import dataclass

from atlas.config.draws import KINDS
from atlas.config.jobs import Job, TileSet
from atlas.errors import PlanRefused
from atlas.orbits.orbit import OrbitCounter, Rules
from atlas.orbits.sampling import IN_TILES, ON_PLATES, automatic, whole_height
from atlas.orbits.schedule import Schedule
from atlas.plan import check_counter


def counter_of(job: Job, columns: int, rows: int) -> OrbitCounter:
    """Return the counter of a job's orbits at a resolution, refused where float64 or a count cannot hold it.

    With ``samples: auto`` it has the samples that suffice where the attractor lies inside the view;
    :func:`resolved` looks closer.

    Raises
    ------
    PlanRefused
    """
    _refuse_what_is_not_drawn_yet(job)
    samples = job.samples
    if not isinstance(samples, int):
        samples = whole_height(rows, job.values_per_column * len(job.starts), counts_per_cell(job))
    rules = Rules(job.transient, job.transient_limit, samples, job.values_per_column, job.longest_period)
    counter = OrbitCounter(job.family, job.view, columns, rows, rules, set=job.set, starts=job.starts)
    check_counter(counter, job.name)
    return counter


# To be deleted as the kinds of view come to be drawn.
def _refuse_what_is_not_drawn_yet(job: Job) -> None:
    """Refuse what configs can ask for and this version does not draw."""
    what = ""
    if job.kind != "histogram":
        what = KINDS[job.kind]
    elif job.record:
        what = "a density of recorded states"
    elif job.by_attractor:
        what = "a density by attractor"
    elif job.up.name not in job.family.state_names:
        what = "a density of an observable"
    elif job.family.patterns:
        what = "a map with a pattern"
    elif any(state.wrap for state in job.family.states):
        what = "a map with a wrapped state variable"
    if what:
        raise PlanRefused(
            f"{job.name}: {what} is not drawn by this version; draw the density of a state variable"
        )


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
