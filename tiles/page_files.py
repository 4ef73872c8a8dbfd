"""The files of the page of a static tile set, as the package ``tiles.page`` holds them."""

from __future__ import annotations

from importlib import resources

_SUFFIXES = (".html", ".css", ".js")


def page_files() -> dict[str, bytes]:
    """Return the files of the page by name."""
    found = resources.files("tiles.page").iterdir()
    return {file.name: file.read_bytes() for file in found if file.name.endswith(_SUFFIXES)}
