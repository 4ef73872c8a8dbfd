"""Renders of a small config that the tests of batches and commands compare."""

from __future__ import annotations

import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path
from typing import Any

import atlas
from atlas.output.batch import Outcome

SMALL = Path(__file__).with_name("small.yaml")


def config(**changed: Any) -> Any:
    """Return the small config; with sections replaced by others."""
    from atlas.config.load import parse_config
    from atlas.reading.yaml_text import read_yaml

    tree = read_yaml(SMALL.read_bytes(), "small.yaml")
    assert isinstance(tree, dict)
    return parse_config({**tree, **changed}, "small.yaml")


def render(out: Path, given: Any = None, **options: Any) -> dict[str, Outcome]:
    """Render the small config, or another one; return the outcomes by name."""
    outcomes = atlas.render(config() if given is None else given, out, **options)
    return {outcome.name: outcome for outcome in outcomes}


def command(*words: object, **options: Any) -> subprocess.CompletedProcess[str]:
    """Run the command line in a process of its own."""
    start = [sys.executable, "-c", "from atlas.cli import main; main()", *map(str, words)]
    return subprocess.run(start, capture_output=True, text=True, check=False, **options)


def statuses(outcomes: dict[str, Outcome]) -> dict[str, str]:
    """Return the status of each output."""
    return {name: outcome.status for name, outcome in outcomes.items()}


def files(folder: Path) -> dict[str, bytes]:
    """Return every finished file below a folder by its path; the content of an index instead of its bytes.

    Tiles stand in an index in the order in which threads finished them, so that only its rows are compared.
    """
    found = {}
    for path in sorted(folder.rglob("*")):
        name = path.relative_to(folder)
        if path.is_file() and name.parts[0] != ".parts":
            found[str(name)] = _rows(path) if path.suffix == ".sqlite" else path.read_bytes()
    return found


def _rows(path: Path) -> bytes:
    with closing(sqlite3.connect(path)) as index:
        tables = [name for (name,) in index.execute("SELECT name FROM sqlite_master WHERE type = 'table'")]
        rows = [repr(row) for table in sorted(tables) for row in index.execute(f"SELECT * FROM {table}")]
    return "\n".join(sorted(rows)).encode()
