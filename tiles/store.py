"""The SQLite file behind an index: opening, versions, transactions and JSON records."""

from __future__ import annotations

import json
import sqlite3
import threading
import zlib
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from functools import partial
from pathlib import Path
from types import TracebackType
from typing import Any, Generic, Self, TypeVar
from urllib.parse import quote

from tiles.errors import IndexRefused, OutputFailed

S = TypeVar("S", bound="Store")
VERSION = 2
_READ = (1, 2)
PATIENCE = 5.0
"""Seconds that a writer waits for another one."""
_APPLICATION = 0x74696C65
_PAGES_BEFORE_CHECKPOINT = 4096
_SCHEMA = """
CREATE TABLE tiles (across_level INTEGER NOT NULL, up_level INTEGER NOT NULL, tile_column BLOB NOT NULL,
    tile_row BLOB NOT NULL, digest BLOB NOT NULL, counts BLOB NOT NULL,
    PRIMARY KEY (across_level, up_level, tile_column, tile_row));
CREATE TABLE columns (across_level INTEGER NOT NULL, tile_column BLOB NOT NULL, numbers BLOB NOT NULL,
    PRIMARY KEY (across_level, tile_column)) WITHOUT ROWID;
CREATE TABLE classes (across_level INTEGER NOT NULL, up_level INTEGER NOT NULL, tile_column BLOB NOT NULL,
    tile_row BLOB NOT NULL, class INTEGER NOT NULL, digest BLOB NOT NULL, counts BLOB NOT NULL,
    PRIMARY KEY (across_level, up_level, tile_column, tile_row, class));
CREATE TABLE sums (across_level INTEGER NOT NULL, up_level INTEGER NOT NULL, tile_column BLOB NOT NULL,
    tile_row BLOB NOT NULL, layer TEXT NOT NULL, digest BLOB NOT NULL, sums BLOB NOT NULL,
    numbers BLOB NOT NULL, PRIMARY KEY (across_level, up_level, tile_column, tile_row, layer));
CREATE TABLE records (name TEXT PRIMARY KEY, json TEXT NOT NULL) WITHOUT ROWID;
"""


class Store:
    """An open file. Make one with :meth:`create` or :meth:`open`; it is a context manager.

    One connection serves one thread at a time; transactions of several threads wait for one another.
    """

    def __init__(self, path: Path, connection: sqlite3.Connection) -> None:
        self.path = path
        self._db = connection
        self._turn = threading.RLock()

    @classmethod
    def create(cls, path: Path, header: Mapping[str, Any]) -> Self:
        """Start an unfinished index.

        Parameters
        ----------
        path : Path
            Must not exist.
        header : mapping
            JSON-able: ``view``, ``levels`` and ``pairs`` as INDEX.md describes them, and what the caller
            adds.

        Raises
        ------
        OutputFailed
            When the file cannot be written.
        """
        with written(path):
            connection = _connected(str(path))
            connection.execute("PRAGMA page_size = 8192")
            connection.execute(f"PRAGMA application_id = {_APPLICATION}")
            connection.execute(f"PRAGMA user_version = {VERSION}")
            store = cls(path, connection)
            store._start_writing()
            with store.transaction():
                for statement in filter(str.strip, _SCHEMA.split(";")):
                    connection.execute(statement)
                store.put_record("header", header)
        return store

    @classmethod
    def open(cls, path: Path, *, write: bool = False, finished: bool = True) -> Self:
        """Open an index.

        Parameters
        ----------
        path : Path
        write : bool
            Whether tiles and records are going to be changed.
        finished : bool
            Whether an index that is still being built is refused.

        Raises
        ------
        IndexRefused
            When there is no such file, or it is none of a version that this program reads.
        OutputFailed
            When another run holds the file.
        """
        if not path.is_file():
            raise IndexRefused(f"{path}: there is no such index")
        address = f"file:{quote(str(path.absolute()))}?mode={'rw' if write else 'ro'}"
        connection = _connected(address, uri=True)
        store = cls(path, connection)
        try:
            with shared(path):
                store._check(finished)
                if write:
                    store._start_writing()
        except BaseException:
            connection.close()
            raise
        return store

    def close(self) -> None:
        """Close the file, once a transaction that is under way has ended."""
        with self._turn:
            self._db.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    @contextmanager
    def transaction(self) -> Iterator[None]:
        """Make what is written inside appear whole or not at all."""
        with self._turn:
            self._db.execute("BEGIN IMMEDIATE")
            try:
                yield
            except BaseException:
                self._db.rollback()
                raise
            self._db.execute("COMMIT")

    @contextmanager
    def reading(self) -> Iterator[None]:
        """Read inside as the file was at the first query."""
        self._db.execute("BEGIN")
        try:
            yield
        finally:
            self._db.rollback()

    def finish(self) -> None:
        """Mark the index as complete and leave one file without side files."""
        self.put_record("finished", True)
        self._db.execute("PRAGMA journal_mode = DELETE").fetchone()

    def put_record(self, name: str, value: Any) -> None:
        """Store a JSON-able value under a name."""
        text = json.dumps(value, sort_keys=True, separators=(",", ":"))
        self._db.execute("INSERT OR REPLACE INTO records VALUES (?, ?)", (name, text))

    def record(self, name: str) -> Any:
        """Return the value stored under a name, None where there is none."""
        row = self._db.execute("SELECT json FROM records WHERE name = ?", (name,)).fetchone()
        return None if row is None else json.loads(row[0])

    def _start_writing(self) -> None:
        self._db.execute("PRAGMA journal_mode = WAL").fetchone()
        self._db.execute("PRAGMA synchronous = NORMAL")
        self._db.execute(f"PRAGMA wal_autocheckpoint = {_PAGES_BEFORE_CHECKPOINT}")

    def _check(self, finished: bool) -> None:
        try:
            application = self._db.execute("PRAGMA application_id").fetchone()[0]
            version = self._db.execute("PRAGMA user_version").fetchone()[0]
        except sqlite3.DatabaseError as problem:
            if _is_locked(problem):
                raise
            application = version = 0
        if application != _APPLICATION:
            raise IndexRefused(f"{self.path} is not a tile index")
        if version not in _READ:
            raise IndexRefused(
                f"{self.path} is a tile index of version {version}; "
                f"this program reads versions {' and '.join(map(str, _READ))}"
            )
        if finished and self.record("finished") is not True:
            raise IndexRefused(
                f"{self.path} is an unfinished tile index; run the same job again to finish it"
            )


class Readers(Generic[S]):
    """Read-only connections to one file, lent to threads one at a time.

    Parameters
    ----------
    kind : type
        ``Store`` or a class derived from it.
    path : Path
    finished : bool
        Whether an index that is still being built is refused.
    """

    def __init__(self, kind: type[S], path: Path, *, finished: bool = True) -> None:
        self._open = partial(kind.open, path, finished=finished)
        self._idle: list[S] = []

    @contextmanager
    def one(self) -> Iterator[S]:
        """Lend a connection that nobody else uses, and a view of the file that no writer changes."""
        try:
            store = self._idle.pop()
        except IndexError:
            store = self._open()
        try:
            with store.reading():
                yield store
        finally:
            self._idle.append(store)

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        for store in self._idle:
            store.close()


@contextmanager
def written(path: Path) -> Iterator[None]:
    """Turn a full disk, a closed folder or a lock into an :class:`OutputFailed` that names the file."""
    try:
        with shared(path):
            yield
    except (OSError, sqlite3.OperationalError) as problem:
        reason = problem.strerror if isinstance(problem, OSError) else str(problem)
        raise OutputFailed(
            f"{path}: cannot be written: {reason}; free some space or give another folder"
        ) from problem


@contextmanager
def intact(path: Path) -> Iterator[None]:
    """Turn what reading a damaged index raises into an :class:`IndexRefused` that names the file."""
    try:
        yield
    except (sqlite3.DatabaseError, KeyError, ValueError, zlib.error) as problem:
        if isinstance(problem, sqlite3.OperationalError):
            raise
        raise IndexRefused(f"{path} is damaged or no tile index; render it again") from problem


@contextmanager
def shared(path: Path) -> Iterator[None]:
    """Turn the lock of another run into an :class:`OutputFailed` that names the file."""
    try:
        yield
    except sqlite3.OperationalError as problem:
        if not _is_locked(problem):
            raise
        raise OutputFailed(
            f"{path} is being written by another run; wait for it or give another folder"
        ) from problem


def _is_locked(problem: sqlite3.DatabaseError) -> bool:
    primary = getattr(problem, "sqlite_errorcode", 0) & 0xFF  # the rest says more about the cause
    return primary in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED)


def _connected(address: str, uri: bool = False) -> sqlite3.Connection:
    return sqlite3.connect(address, timeout=PATIENCE, uri=uri, isolation_level=None, check_same_thread=False)
