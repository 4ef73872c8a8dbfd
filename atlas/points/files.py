"""Files of points, CSV and Parquet, read in chunks through pyarrow."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.errors import PointsRefused, shown
from atlas.points.tables import Chunk, Table, check_column, not_numbers
from atlas.reading.place import brief
from tiles.errors import nearest

BLOCK = 1 << 19
LONGEST_PATH = 4096
_START = 1 << 16
_SEPARATORS = (",", ";", "\t")


def file_table(path: Path) -> Table:
    """Return the table in a file, by its suffix.

    Raises
    ------
    PointsRefused
        When the suffix is another one, or there is no such file.
    """
    kinds: dict[str, type[CsvTable] | type[ParquetTable]] = {".csv": CsvTable, ".parquet": ParquetTable}
    where = _named(path)
    kind = kinds.get(path.suffix.lower())
    if kind is None:
        raise PointsRefused(f"{where}: points are read from .csv and .parquet{_suffix_hint(path, kinds)}")
    with _readable(where):
        if path.is_dir():
            raise PointsRefused(f"{where}: this is a folder; name a file")
        if not path.exists():
            raise PointsRefused(f"{where}: there is no such file")
        if path.stat().st_size == 0:
            raise PointsRefused(f"{where}: the file is empty")
    return kind(path)


def _named(path: Path) -> str:
    return shown(str(path), LONGEST_PATH)[1:-1]


def _suffix_hint(path: Path, kinds: Iterable[str]) -> str:
    if not path.suffix:
        return "; this name has no suffix"
    hint = nearest(path.suffix.lower(), kinds)
    return f", not from {brief(path.suffix)}{hint if 'did you mean' in hint else ''}"


class _FileTable:
    """What both kinds of file share."""

    once = False

    def __init__(self, path: Path) -> None:
        self.path = path
        self.where = _named(path)
        self.file: str | None = path.name

    def digest(self) -> str | None:
        """Return the BLAKE2b digest of the file's bytes, 32 hexadecimal digits."""
        with _readable(self.where), self.path.open("rb") as file:
            return hashlib.file_digest(file, lambda: hashlib.blake2b(digest_size=16)).hexdigest()


class CsvTable(_FileTable):
    """A text file with a head of names, then a row a point; separated by commas, semicolons or tabs."""

    def rows(self) -> int:
        """Return 0: the number of rows is not known before reading."""
        return 0

    def check(self, columns: Iterable[str]) -> None:
        """Refuse columns that the head does not name."""
        self._heads(columns)

    def chunks(self, across: str, up: str, rows: int) -> Iterator[Chunk]:
        """Yield the values of two columns, at most ``rows`` at a time; an empty field is NaN."""
        heads = self._heads((across, up))
        with self._problems(heads):
            for batch in self._opened(heads.values()):
                values = [batch.column(head).to_numpy(zero_copy_only=False) for head in heads.values()]
                for first in range(0, batch.num_rows, rows):
                    at = slice(first, first + rows)
                    yield values[0][at], values[1][at]

    def _heads(self, columns: Iterable[str]) -> dict[int, str]:
        """Return where columns stand and how the file writes their names, which may have blanks around."""
        with self._problems({}):
            heads = self._opened(()).schema.names
        names = [head.strip() for head in heads]
        for column in columns:
            check_column(column, names, self.where)
        return {names.index(column): heads[names.index(column)] for column in columns}

    def _opened(self, heads: Iterable[str]) -> Any:
        """Open the file for some columns, all of numbers, or for a look at the head."""
        from pyarrow import csv, float64

        types = dict.fromkeys(heads, float64())
        return csv.open_csv(
            self.path,
            read_options=csv.ReadOptions(use_threads=False, block_size=BLOCK),
            parse_options=csv.ParseOptions(delimiter=self._separator()),
            convert_options=csv.ConvertOptions(include_columns=list(types), column_types=types),
        )

    def _separator(self) -> str:
        with self.path.open("rb") as file:
            start = file.read(_START)
        line = next(filter(None, start.splitlines()), b"")
        try:
            line.decode("utf-8")
        except UnicodeDecodeError:
            start = b"\0"
        if b"\0" in start:
            raise PointsRefused(
                f"{self.where}: this is no CSV text in UTF-8; save the table as such, or as Parquet"
            )
        return max(_SEPARATORS, key=lambda mark: line.count(mark.encode()))

    @contextmanager
    def _problems(self, heads: dict[int, str]) -> Iterator[None]:
        """Turn what the reader says into one sentence."""
        from pyarrow import ArrowException

        with _readable(self.where):
            try:
                yield
            except (ArrowException, UnicodeDecodeError) as problem:
                raise PointsRefused(f"{self.where}: {_said(str(problem), heads)}") from None


def _said(problem: str, heads: dict[int, str]) -> str:
    """Return what is wrong with a CSV file, from the words of its reader."""
    row = re.search(r"Row #(\d+)", problem)
    place = f"row {row[1]} (the head is row 1)" if row else "a row"
    wrong = re.search(r"CSV column #(\d+): .*invalid value '(.*)'", problem, re.DOTALL)
    if wrong and int(wrong[1]) in heads:
        column = shown(heads[int(wrong[1])].strip())
        value = shown(wrong[2].strip())
        return f"the column {column} holds {value} in {place}, which is no number; leave missing values empty"
    count = re.search(r"Expected (\d+) columns, got (\d+)", problem)
    if count:
        return f"this is no regular CSV table: {place} has {count[2]} fields and the head {count[1]}"
    if "Empty CSV" in problem:
        return "the file holds no table; it needs a head of names and a row a point"
    return f"the file cannot be read as a CSV table ({brief(' '.join(problem.split()))})"


class ParquetTable(_FileTable):
    """A Parquet file."""

    def rows(self) -> int:
        """Return the number of rows."""
        with self._file() as file:
            return int(file.metadata.num_rows)

    def check(self, columns: Iterable[str]) -> None:
        """Refuse columns that the file does not have, or that hold no numbers."""
        from pyarrow import types

        with self._file() as file:
            schema = file.schema_arrow
        for column in columns:
            check_column(column, schema.names, self.where)
            kind = schema.field(column).type
            if not (types.is_integer(kind) or types.is_floating(kind) or types.is_decimal(kind)):
                raise not_numbers(column, self.where, f"values of type {brief(str(kind))}")

    def chunks(self, across: str, up: str, rows: int) -> Iterator[Chunk]:
        """Yield the values of two columns, at most ``rows`` at a time; a null is NaN."""
        self.check((across, up))
        with self._file() as file:
            batches = file.iter_batches(batch_size=rows, columns=[across, up], use_threads=False)
            for batch in batches:
                yield _as_floats(batch.column(across)), _as_floats(batch.column(up))

    @contextmanager
    def _file(self) -> Iterator[Any]:
        from pyarrow import ArrowException
        from pyarrow.parquet import ParquetFile

        with _readable(self.where):
            try:
                with ParquetFile(self.path, pre_buffer=False, buffer_size=BLOCK) as file:
                    yield file
            except ArrowException as problem:
                reason = brief(" ".join(str(problem).split(".")[0].split()))
                raise PointsRefused(f"{self.where}: this is no whole Parquet file ({reason})") from None


def _as_floats(column: Any) -> NDArray[np.float64]:
    from pyarrow import float64

    floats: NDArray[np.float64] = column.cast(float64(), safe=False).to_numpy(zero_copy_only=False)
    return floats


@contextmanager
def _readable(where: str) -> Iterator[None]:
    try:
        yield
    except OSError as problem:
        raise PointsRefused(f"{where}: the file cannot be read ({problem.strerror or problem})") from None
