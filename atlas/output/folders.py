"""Output folders, tried before any work."""

from __future__ import annotations

import tempfile
from collections.abc import Iterable
from pathlib import Path

from atlas.errors import ConfigRefused, shown

OF_A_SITE = ("meta.js", "page.js")
LONGEST_PATH = 4096


def check_folder(out: Path) -> None:
    """Make an output folder, or refuse one that cannot be written to, before any work.

    Raises
    ------
    ConfigRefused
    """
    try:
        out.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=out):
            pass
    except (OSError, ValueError) as problem:
        reason = "it is a file" if out.is_file() else getattr(problem, "strerror", None) or str(problem)
        raise ConfigRefused(
            f"--out: the folder {_named(out)} cannot be written to ({reason}); choose another one"
        ) from problem


def check_files(files: Iterable[Path]) -> None:
    """Refuse files that cannot be replaced because folders have their names.

    Raises
    ------
    ConfigRefused
    """
    for path in files:
        if path.is_dir():
            raise ConfigRefused(f"--out: {_named(path)} is a folder; choose another name for the file")


def check_site(site: Path) -> None:
    """Refuse a folder for a static site that holds anything else, which would be lost.

    Raises
    ------
    ConfigRefused
    """
    if not site.exists():
        return
    try:
        foreign = any(site.iterdir()) and not any((site / name).is_file() for name in OF_A_SITE)
    except OSError as problem:
        raise ConfigRefused(
            f"--out: {_named(site)} cannot be used ({problem.strerror}); choose another folder"
        ) from problem
    if foreign:
        raise ConfigRefused(
            f"--out: the folder {_named(site)} holds other files, which a site would replace; "
            "name a new folder"
        )


def _named(path: Path) -> str:
    return shown(str(path), LONGEST_PATH)
