"""Output folders, tried before any work."""

from __future__ import annotations

import tempfile
from collections.abc import Iterable
from pathlib import Path

from atlas.errors import ConfigRefused, shown
from tiles.page_files import page_files
from tiles.plane_site import SIDE_CARS

LONGEST_PATH = 4096
_META, _META_START = "meta.js", b"window.ATLAS_META"
_PAGE, _PICTURES = "page.js", "tiles"


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
    """Refuse a folder for a static site that is neither empty nor a site, since all in it would be lost.

    Raises
    ------
    ConfigRefused
    """
    if not site.exists():
        return
    try:
        foreign = _foreign(site)
    except OSError as problem:
        raise ConfigRefused(
            f"--out: {_named(site)} cannot be used ({problem.strerror}); choose another folder"
        ) from problem
    if foreign is not None:
        raise ConfigRefused(
            f"--out: the folder {_named(site)} holds other files, which a site would replace, such as "
            f"{_named(Path(foreign))}; name a new folder"
        )


def _foreign(site: Path) -> str | None:
    """Return the first entry of a folder that shows that it is no site; None for a site or nothing at all.

    A site that has lost its description is known by its page, which must be ours to the byte.
    """
    entries, page = sorted(path.name for path in site.iterdir()), page_files()
    for name in entries:
        if name not in {*page, _META, _PICTURES, SIDE_CARS}:
            return name
    if _META in entries:
        with (site / _META).open("rb") as file:
            return None if file.read(len(_META_START)) == _META_START else _META
    for name in entries:
        if name in page and (site / name).read_bytes() != page[name]:
            return name
    return None if _PAGE in entries or not entries else entries[0]


def _named(path: Path) -> str:
    return shown(str(path), LONGEST_PATH)
