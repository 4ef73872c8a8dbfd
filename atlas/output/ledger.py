"""What an output folder already holds, finished: the fingerprints that let a batch skip it."""

from __future__ import annotations

import json
import os
from collections.abc import Iterable, Mapping
from hashlib import blake2b
from pathlib import Path
from typing import Any

from atlas.output.whole_file import write_whole

NAME = "finished.json"


class Ledger:
    """The finished outputs of a folder, kept in ``.parts/finished.json``.

    An output is unchanged when it was made from a request with the same digest and each of its files still
    has the digest that it had then.
    """

    def __init__(self, out: Path) -> None:
        self.out = out
        self._entries: dict[str, Any] = {}
        try:
            read = json.loads((out / ".parts" / NAME).read_text("utf-8"))
        except (OSError, ValueError):
            read = None
        if isinstance(read, dict):
            self._entries = read

    def unchanged(self, name: str, request: str, files: Iterable[Path]) -> bool:
        """Return whether an output stands as it was made from the same request."""
        entry = self._entries.get(name)
        if not isinstance(entry, dict) or entry.get("request") != request:
            return False
        found = self._digests(files)
        return None not in found.values() and bool(entry.get("files") == found)

    def note(self, name: str, request: str, files: Iterable[Path]) -> None:
        """Enter a finished output."""
        self._entries[name] = {"request": request, "files": self._digests(files)}
        self._write(self._entries)

    def _write(self, entries: Mapping[str, Any]) -> None:
        text = json.dumps(entries, sort_keys=True, indent=1)
        write_whole(self.out / ".parts" / NAME, text.encode("ascii"))

    def _digests(self, files: Iterable[Path]) -> dict[str, str | None]:
        return {str(path.relative_to(self.out)): fingerprint(path) for path in sorted(files)}


def fingerprint(path: Path) -> str | None:
    """Return a digest of a file's bytes, or of a folder's names and files; None where there is nothing."""
    state = blake2b(digest_size=16)
    try:
        if path.is_dir():
            _add_folder(state, path)
        else:
            _add_file(state, path)
    except OSError:
        return None
    return state.hexdigest()


def _add_folder(state: blake2b, path: Path) -> None:
    for folder, inner, names in os.walk(path, onerror=_refuse):
        inner.sort()
        state.update(_framed(os.path.relpath(folder, path)))
        for name in sorted(names):
            state.update(_framed(name))
            _add_file(state, Path(folder, name))


def _add_file(state: blake2b, path: Path) -> None:
    with path.open("rb") as file:
        state.update(os.fstat(file.fileno()).st_size.to_bytes(8, "little"))
        while block := file.read(1 << 20):
            state.update(block)


def _framed(name: str) -> bytes:
    encoded = os.fsencode(name)
    return len(encoded).to_bytes(8, "little") + encoded


def _refuse(problem: OSError) -> None:
    raise problem
