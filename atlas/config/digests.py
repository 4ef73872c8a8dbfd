"""The normalised form of what is to be made, and the digests that tell outputs and counts apart."""

from __future__ import annotations

import json
from hashlib import blake2b
from typing import Any

from atlas.config.draws import PLANES
from atlas.config.jobs import COUNTING_VERSION, Figure, Job, Plate, TileSet
from atlas.config.keys import FIGURE_KEYS, JOB_KEYS, PLATE_KEYS, TILE_SET_KEYS
from atlas.reading.section import Key
from tiles.window import Axis

_PRINTED_ONLY = {"name", "title", "source", "note", "across", "up", "extinct"}
"""Of a family: what is printed alone, and what the settings of a job repeat."""
_GIVEN_ELSEWHERE = {"label", "unit", "domain", "start", "default"}


def normalised(record: Plate | TileSet | Figure) -> dict[str, Any]:
    """Return everything that an output depends on, as JSON holds it, numbers as text.

    Equal records give equal results however their config was written. For a plate or a tile set the keys
    are ``kind``, ``name``, ``settings`` (the keys of a config, all present) and ``family`` (its config and
    its ``name``); for a figure ``kind``, ``name``, ``settings`` and ``plates``.
    `atlas.config.remake.from_normalised` makes the record again.
    """
    if isinstance(record, Figure):
        return {
            "kind": "figure",
            "name": record.name,
            "plates": {name: normalised(plate) for name, plate in record.plates.items()},
            "settings": _written(FIGURE_KEYS, record),
        }
    keys, kind = (PLATE_KEYS, "plate") if isinstance(record, Plate) else (TILE_SET_KEYS, "tile set")
    return {
        "family": {**record.family.as_config(), "name": record.family.name},
        "kind": kind,
        "name": record.name,
        "settings": _written(keys, record),
    }


def digest(record: Plate | TileSet | Figure) -> str:
    """Return a digest of everything that an output depends on, as 32 hexadecimal digits."""
    return _hashed({"counting": COUNTING_VERSION, "output": normalised(record)})


def decisive(job: Job) -> dict[str, Any]:
    """Return what of a job decides its counts, as `normalised` writes it: ``family`` and ``settings``."""
    return {
        "family": {**job.family.as_config(), "name": job.family.name},
        "settings": {key.name: _value(key, job) for key in JOB_KEYS if key.counts},
    }


def counting_digest(job: Job, columns: int, rows: int, *, samples: int | None = None) -> str:
    """Return a digest of what decides the counts of a job, as 32 hexadecimal digits.

    Names, titles, labels, sizes and colours do not enter; neither does how a value was given (by ``set`` or
    by the family's default).

    Parameters
    ----------
    job : Job
        A plate or a tile set.
    columns, rows : int
        The resolution at which it is counted.
    samples : int, optional
        What ``samples: auto`` comes to at this resolution.
    """
    decisive = {key.name: _value(key, job) for key in JOB_KEYS if key.counts and _belongs(key, job)}
    decisive |= {
        "across": _interval(job.across),
        "up": _interval(job.up),
        "family": _mathematics(job),
        "set": {name: str(value) for name, value in job.parameters().items()},
        "resolution": [columns, rows],
        "counting": COUNTING_VERSION,
    }
    if samples is not None:
        decisive["samples"] = samples
    return _hashed(decisive)


def _written(keys: tuple[Key[Any], ...], record: Plate | TileSet | Figure) -> dict[str, Any]:
    return {key.name: _value(key, record) for key in sorted(keys, key=lambda key: key.name)}


def _value(key: Key[Any], record: Job | Figure) -> Any:
    if key.name == "family" and isinstance(record, Job):
        return record.family.name
    return key.write(getattr(record, key.name))


def _belongs(key: Key[Any], job: Job) -> bool:
    """Return whether a key says anything of a job; so that new keys leave the digests of old jobs alone."""
    if key.name in ("follow", "record", "by_attractor"):
        return bool(getattr(job, key.name))
    if key.name == "draw":
        return job.kind in PLANES
    return not key.only_for or job.kind in key.only_for


def _interval(axis: Axis) -> list[str]:
    return [axis.name, str(axis.low), str(axis.high), axis.scale]


def _mathematics(job: Job) -> dict[str, Any]:
    config = {key: value for key, value in job.family.as_config().items() if key not in _PRINTED_ONLY}
    for section in ("state", "parameters"):
        config[section] = {
            name: {key: value for key, value in entry.items() if key not in _GIVEN_ELSEWHERE}
            for name, entry in config.get(section, {}).items()
        }
    axes = (job.across.name, job.up.name)
    observables = config.pop("observables", {})
    drawn = {name: entry for name, entry in observables.items() if name in axes}
    if drawn:
        config["observables"] = {
            name: entry["formula"] if isinstance(entry, dict) else entry for name, entry in drawn.items()
        }
    return config


def _hashed(content: Any) -> str:
    text = json.dumps(content, sort_keys=True, ensure_ascii=True, separators=(",", ":"))
    return blake2b(text.encode("ascii"), digest_size=16).hexdigest()
