"""Output folders, tried before any work."""

from __future__ import annotations

import tempfile
from pathlib import Path

from atlas.errors import ConfigRefused


def check_folder(out: Path) -> None:
    """Refuse an output folder that cannot be written to, before any work.

    Raises
    ------
    ConfigRefused
    """
    try:
        out.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=out):
            pass
    except OSError as problem:
        reason = problem.strerror or str(problem)
        raise ConfigRefused(
            f"--out: the folder '{out}' cannot be written to ({reason}); choose another one"
        ) from problem
