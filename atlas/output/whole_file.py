"""Files that appear whole under their final name or not at all."""

from __future__ import annotations

import contextlib
import os
from pathlib import Path

from tiles.errors import OutputFailed

PARTS = ".parts"


def write_whole(path: Path, data: bytes) -> None:
    """Write a file under ``.parts/`` beside its final place, then move it there.

    Parameters
    ----------
    path : Path
        The final name; an older file is replaced only by a complete new one.
    data : bytes
        What it holds.

    Raises
    ------
    OutputFailed
        When the disk is full or the folder is closed; nothing is left behind.
    """
    part = path.parent / PARTS / path.name
    try:
        part.parent.mkdir(parents=True, exist_ok=True)
        part.write_bytes(data)
        os.replace(part, path)
    except OSError as problem:
        with contextlib.suppress(OSError):
            part.unlink()
        reason = problem.strerror or str(problem)
        raise OutputFailed(
            f"'{path}' could not be written ({reason}); free some space or choose another output folder"
        ) from problem
    finally:
        with contextlib.suppress(OSError):
            part.parent.rmdir()  # kept as long as other unfinished parts live there
