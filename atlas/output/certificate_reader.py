"""Reading the certificate back out of an output: PNG, TIFF, PDF, SVG, tile index or NetCDF file."""

from __future__ import annotations

import json
import re
import sqlite3
import struct
from collections.abc import Callable
from pathlib import Path
from typing import Any, BinaryIO
from xml.etree import ElementTree

from atlas.errors import CertificateRefused, shown

KEY = "atlas-certificate"
_PNG, _HDF, _SQLITE = b"\x89PNG\r\n\x1a\n", b"\x89HDF\r\n\x1a\n", b"SQLite format 3\0"
_DESCRIPTION_TAG = 270
_DC_DESCRIPTION = "{http://purl.org/dc/elements/1.1/}description"
_NO_RECORD = "holds no record of how it was made"
_ESCAPES = {b"n": b"\n", b"r": b"\r", b"t": b"\t", b"b": b"\b", b"f": b"\f"}


def read(path: str | Path) -> dict[str, Any]:
    """Return the certificate that a file carries.

    Parameters
    ----------
    path : str or Path
        A plate or figure (PNG, TIFF, PDF, SVG), a tile index or a saved Dataset; told apart by their first
        bytes, not by their names.

    Returns
    -------
    dict
        The record as :func:`atlas.output.certificate.certificate` made it.

    Raises
    ------
    CertificateRefused
        When the file cannot be read, is of another kind, is damaged or holds no record.
    """
    path = Path(path)
    try:
        with path.open("rb") as file:
            start = file.read(1024)
            file.seek(0)
            text = _reader(start, path)(file)
    except OSError as problem:
        raise CertificateRefused(f"'{path}' cannot be read ({problem.strerror or problem})") from None
    except (struct.error, ElementTree.ParseError, sqlite3.Error, ValueError):
        raise CertificateRefused(f"'{path}' is damaged: its record cannot be read") from None
    if text is None:
        raise CertificateRefused(f"'{path}' {_NO_RECORD}")
    return _record(text, path)


def _reader(start: bytes, path: Path) -> Callable[[BinaryIO], str | None]:
    for magic, reader in (
        (_PNG, _from_png),
        (b"II*\0", _from_tiff),
        (b"MM\0*", _from_tiff),
        (b"%PDF-", _from_pdf),
        (_SQLITE, _from_index),
        (_HDF, _from_netcdf),
    ):
        if start.startswith(magic):
            return reader
    if b"<svg" in start:
        return _from_svg
    raise CertificateRefused(
        f"'{path}' is no PNG, TIFF, PDF, SVG, tile index or NetCDF file, so it {_NO_RECORD}"
    )


def _record(text: str, path: Path) -> dict[str, Any]:
    try:
        record = json.loads(text)
    except (ValueError, RecursionError):
        record = None
    if not isinstance(record, dict) or "record" not in record:
        raise CertificateRefused(f"'{path}' {_NO_RECORD}; what stands in its place is {shown(text)}")
    return record


def _from_png(file: BinaryIO) -> str | None:
    file.seek(len(_PNG))
    while head := file.read(8):
        length, kind = struct.unpack(">I4s", head)
        if kind != b"iTXt":
            file.seek(length + 4, 1)
            continue
        keyword, _, rest = file.read(length).partition(b"\0")
        file.seek(4, 1)
        if keyword.decode("latin-1") == KEY and rest[:1] == b"\0":
            return rest[2:].split(b"\0", 2)[2].decode("utf-8")
    return None


def _from_tiff(file: BinaryIO) -> str | None:
    order = "<" if file.read(4).startswith(b"II") else ">"
    (start,) = struct.unpack(f"{order}I", file.read(4))
    file.seek(start)
    (count,) = struct.unpack(f"{order}H", file.read(2))
    for _ in range(count):
        tag, _, length, place = struct.unpack(f"{order}HHII", file.read(12))
        if tag == _DESCRIPTION_TAG and length > 4:
            file.seek(place)
            return file.read(length).rstrip(b"\0").decode("ascii")
    return None


def _from_pdf(file: BinaryIO) -> str | None:
    data = file.read()
    info = re.findall(rb"/Info\s+(\d+)\s+(\d+)\s+R", data)
    if not info:
        return None
    number, generation = info[-1]
    found = re.search(rb"(?:^|\s)%s %s obj\b(.*?)\bendobj" % (number, generation), data, re.DOTALL)
    keywords = re.search(rb"/Keywords\s*([(<])", found[1]) if found else None
    if found is None or keywords is None:
        return None
    rest = found[1][keywords.end() :]
    if keywords[1] == b"<":
        return _pdf_text(bytes.fromhex(rest.partition(b">")[0].decode("ascii")))
    return _pdf_text(_literal(rest))


def _literal(text: bytes) -> bytes:
    """Return a PDF string in brackets, from after the first bracket on (ISO 32000, 7.3.4.2)."""
    out, depth = [], 1
    for token in re.finditer(rb"\\([0-7]{1,3}|\r\n|.)|[()]|[^\\()]+", text, re.DOTALL):
        piece = token[0]
        if token[1] is not None:
            out.append(_unescaped(token[1]))
            continue
        depth += {b"(": 1, b")": -1}.get(piece, 0)
        if depth == 0:
            break
        out.append(piece)
    return b"".join(out)


def _unescaped(code: bytes) -> bytes:
    if code.isdigit():
        return bytes([int(code, 8) & 255])
    if code in (b"\n", b"\r", b"\r\n"):
        return b""
    return _ESCAPES.get(code, code)


def _pdf_text(data: bytes) -> str:
    return data[2:].decode("utf-16-be") if data.startswith(b"\xfe\xff") else data.decode("latin-1")


def _from_svg(file: BinaryIO) -> str | None:
    for _, element in ElementTree.iterparse(file):
        if element.tag == _DC_DESCRIPTION:
            return element.text
    return None


def _from_index(file: BinaryIO) -> str | None:
    from tiles.index import Index

    with Index.open(Path(file.name)) as index:
        record = index.certificate
    return None if record is None else json.dumps(record)


def _from_netcdf(file: BinaryIO) -> str | None:
    import h5netcdf

    with h5netcdf.File(file.name, "r") as dataset:
        text = dataset.attrs.get(KEY)
    return None if text is None else str(text)
