"""Rendering a whole config: every output planned first, then made, skipped or failed one by one."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from atlas.config.digests import digest
from atlas.config.jobs import Figure, Plate, TileSet
from atlas.config.load import Config, load
from atlas.errors import ConfigRefused, shown
from atlas.orbits.schedule import Schedule, schedule, threads
from atlas.orbits.step import step_source
from atlas.output.folders import check_files, check_folder, check_site
from atlas.output.forecast import builders, need_of, room_of
from atlas.output.ledger import Ledger
from atlas.output.printing import Made, check_lettering, make_sheet, sheet_of
from atlas.output.reporter import Reporter, Silence
from atlas.output.tile_makers import TILE_SET_MAKERS
from atlas.output.tiled import Places
from atlas.plan import Need, check_fits, parse_memory
from atlas.reading.place import REQUEST, path_of
from atlas.reading.place import shown as named
from tiles.errors import Failure, OutputFailed, Refusal, nearest

Record = Plate | TileSet | Figure
Make = Callable[[Schedule, Reporter], Made]


@dataclass(frozen=True)
class Outcome:
    """What became of one output of a batch.

    Attributes
    ----------
    name, kind : str
    status : {"made", "skipped", "failed"}
    seconds : float
    samples : int
        Counted for it in this run.
    message : str
        Why it failed.
    remarks : tuple of str
        What its maker should be told, such as samples that are not drawn.
    """

    name: str
    kind: str
    status: str
    seconds: float = 0.0
    samples: int = 0
    message: str = ""
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True)
class _Planned:
    name: str
    kind: str
    request: str
    files: tuple[Path, ...]
    make: Make


def render(
    config: Config | Path | str,
    out: Path | str = "out",
    *,
    only: Sequence[str] = (),
    workers: int | None = None,
    memory: str | int | None = None,
    force: bool = False,
    reporter: Reporter | None = None,
) -> list[Outcome]:
    """Render the outputs of a config into a folder.

    Parameters
    ----------
    config : Config or path
        From `atlas.load`, or the file to load.
    out : path
        The folder; made if it is not there.
    only : sequence of str
        Names of outputs; all without it.
    workers : int, optional
        Threads; the results do not depend on it.
    memory : str or int, optional
        Budget of the process, ``"2GiB"`` by default.
    force : bool
        Make again what is unchanged.
    reporter : Reporter, optional
        Hears of the progress.

    Returns
    -------
    list of Outcome
        In the order of the config. An output that fails at run time does not stop the others.

    Raises
    ------
    Refusal
        When the request is wrong; then nothing was rendered.
    """
    config, out = _config_of(config), path_of(out, REQUEST.at("out"))
    reporter = reporter or Silence()
    planned = _plan(config, out, only, threads(workers), parse_memory(memory))
    ledger = Ledger(out)
    unchanged = {
        one.name for one in planned if not force and ledger.unchanged(one.name, one.request, one.files)
    }
    _check_derivatives(config, [one.name for one in planned if one.name not in unchanged])
    check_folder(out)
    outcomes = []
    with schedule(workers) as opened:
        for one in planned:
            if one.name in unchanged:
                outcomes.append(Outcome(one.name, one.kind, "skipped"))
            else:
                outcomes.append(_make(one, ledger, opened, reporter))
    return outcomes


def select(config: Config, only: Sequence[str]) -> dict[str, Record]:
    """Return the outputs of a config by name, or those that were asked for.

    Raises
    ------
    ConfigRefused
        For a name that the config does not have, and for a config without outputs.
    """
    outputs = config.outputs()
    where = config.path or "config"
    if not outputs:
        raise ConfigRefused(f"{where}: there is nothing to render; add a plate under plates:")
    for name in only:
        if name not in outputs:
            raise ConfigRefused(f"--only: {where} has no output {shown(name)}{nearest(name, outputs)}")
    return {name: record for name, record in outputs.items() if not only or name in only}


def needs(
    config: Config | Path | str, *, workers: int | None = None, memory: str | int | None = None
) -> list[tuple[Record, Need]]:
    """Return the outputs of a config and what each needs, without computing anything.

    Parameters
    ----------
    config : Config or path
    workers, memory
        As for :func:`render`.

    Raises
    ------
    Refusal
        Where :func:`render` would refuse the config.
    """
    config, budget = _config_of(config), parse_memory(memory)
    found = []
    for record in select(config, ()).values():
        with _named(config):
            found.append((record, _checked(need_of(record, threads(workers), budget), record, budget)))
    return found


def _config_of(given: Any) -> Config:
    if isinstance(given, Config):
        return given
    if isinstance(given, str | os.PathLike):
        return load(given)
    raise REQUEST.at("config").refusal(f"{named(given)} is no config; write atlas.load(path) or a path")


def _check_derivatives(config: Config, names: Sequence[str]) -> None:
    """Refuse formulas without a derivative, looked for only where something will be made."""
    outputs = config.outputs()
    for record in (outputs[name] for name in names):
        for job in record.plates.values() if isinstance(record, Figure) else (record,):
            with _named(config):
                step_source(job.family)


def _plan(config: Config, out: Path, only: Sequence[str], workers: int, budget: int) -> list[_Planned]:
    planned = []
    for record in select(config, only).values():
        with _named(config):
            _checked(room_of(record, workers, budget), record, budget)
        planned.append(_planned(record, out, workers, budget))
    return planned


@contextmanager
def _named(config: Config) -> Iterator[None]:
    """Put the file's name before a refusal that only knows the output's."""
    try:
        yield
    except Refusal as problem:
        raise type(problem)(f"{config.path}: {problem}" if config.path else str(problem)) from None


def _checked(need: Need, record: Record, budget: int) -> Need:
    check_fits(record.name, need.pixels, need.memory, budget)
    if not isinstance(record, TileSet):
        check_lettering(sheet_of(record))
    return need


def _planned(record: Record, out: Path, workers: int, budget: int) -> _Planned:
    request = digest(record)
    if isinstance(record, TileSet):
        places, tile_set, make = Places.of(out, record.name), record, TILE_SET_MAKERS[record.kind]
        at_once = builders(record, workers, budget)
        check_site(places.site)
        check_files([places.index])
        return _Planned(
            record.name,
            "tile set",
            request,
            (places.index, places.site),
            lambda opened, reporter: make(tile_set, places, opened, reporter, at_once),
        )
    sheet = sheet_of(record)
    files = sheet.files(out)
    check_files(files.values())
    return _Planned(
        record.name,
        "figure" if isinstance(record, Figure) else "plate",
        request,
        tuple(files.values()),
        lambda opened, reporter: make_sheet(sheet, files, opened, reporter),
    )


def _make(one: _Planned, ledger: Ledger, opened: Schedule, reporter: Reporter) -> Outcome:
    begin = time.monotonic()
    try:
        made = one.make(opened, reporter)
        ledger.note(one.name, one.request, one.files)
    except Failure as problem:
        message = str(problem)
    except MemoryError:
        message = f"{one.name}: memory ran out; make it smaller or close other programs"
    except OSError as problem:
        message = str(OutputFailed(f"{one.name}: {problem.strerror or problem}; free some space or memory"))
    else:
        seconds = time.monotonic() - begin
        return Outcome(one.name, one.kind, "made", seconds, made.samples, remarks=made.remarks)
    return Outcome(one.name, one.kind, "failed", time.monotonic() - begin, 0, message)
