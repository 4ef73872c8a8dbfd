"""Certificates: complete, free of dates and places, read back from every kind of file."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from atlas.errors import CertificateRefused
from atlas.figure.plate import FORMATS, files
from atlas.output.certificate import as_text, certificate, read, versions
from atlas.output.certificate_reader import KEY
from tests.atlas.plates import RECORD, filled, request
from tiles.index import Index

NASTY = certificate(
    "plate",
    "größe",
    {"title": "((a) \\ b)) \n\t\u2028 日本 \U0001f600 <&>\"' %>", "step": {"n": "s * exp(r * (1 - s))"}},
    "0123abcd",
    {"unsettled": 0.1 + 0.2, "escaped": 0.0},
    {"each": 1000},
)


def test_a_record_says_how_and_not_when_or_where() -> None:
    assert set(NASTY) == {
        "record",
        "kind",
        "name",
        "config",
        "counts_digest",
        "shares",
        "samples",
        "versions",
    }
    found = versions()
    assert {"counting", "python", "numpy", "matplotlib", "pillow"} <= set(found)
    assert list(found) == sorted(found)
    text = as_text(NASTY)
    assert text.isascii()
    assert json.loads(text) == NASTY
    assert as_text(dict(reversed(NASTY.items()))) == text
    assert str(Path.cwd()) not in text
    with pytest.raises(ValueError, match="not JSON compliant"):
        as_text({"share": float("nan")})


@pytest.fixture(scope="module")
def plates() -> dict[str, bytes]:
    return dict(files(*filled(request()), FORMATS, NASTY))


@pytest.mark.parametrize("form", FORMATS)
def test_each_kind_of_plate_gives_its_record_back(
    form: str, plates: dict[str, bytes], tmp_path: Path
) -> None:
    path = tmp_path / "renamed.dat"
    path.write_bytes(plates[form])
    assert read(path) == NASTY


def test_other_software_finds_the_record_where_the_formats_have_it(
    plates: dict[str, bytes], tmp_path: Path
) -> None:
    from PIL import Image

    for form, key in (("png", KEY), ("tiff", 270)):
        (tmp_path / form).write_bytes(plates[form])
        with Image.open(tmp_path / form) as image:
            text = image.text[KEY] if form == "png" else image.tag_v2[key]  # type: ignore[attr-defined]
        assert text == as_text(NASTY)


def test_an_index_and_a_saved_dataset_give_their_records_back(tmp_path: Path) -> None:
    import h5netcdf

    path = tmp_path / "index.sqlite"
    view = {"across": ["r", "2.8", "4"], "up": ["x", "0", "1"]}
    with Index.create(path, {"view": view, "levels": [0, 0], "pairs": [[0, 0]]}) as index:
        index.put_certificate(NASTY)
        index.finish()
    assert read(path) == NASTY
    path = tmp_path / "counts.nc"
    with h5netcdf.File(path, "w") as dataset:
        dataset.dimensions = {"r": 2}
        dataset.create_variable("exposure", ("r",), data=np.zeros(2))
    with pytest.raises(CertificateRefused, match="holds no record"):
        read(path)
    with h5netcdf.File(path, "a") as dataset:
        dataset.attrs[KEY] = as_text(NASTY)
    assert read(path) == NASTY


def test_pdf_strings_in_other_writings_are_read(tmp_path: Path) -> None:
    text = as_text(RECORD)
    wide = b"<" + (b"\xfe\xff" + text.encode("utf-16-be")).hex().encode() + b">"
    octal = b"(" + b"".join(b"\\%03o" % byte for byte in text.encode()) + b")"
    folded = b"(" + text.encode().replace(b"\\", b"\\\\").replace(b"(", b"\\(").replace(b":", b":\\\n") + b")"
    for number, keywords in enumerate((wide, octal, folded.replace(b")", b"\\)", 1))):
        path = tmp_path / f"{number}.pdf"
        path.write_bytes(
            b"%PDF-1.4\n7 0 obj\n<< /Keywords " + keywords + b" >>\nendobj\ntrailer << /Info 7 0 R >>\n"
        )
        assert read(path) == RECORD


@pytest.mark.parametrize(
    ("content", "reason"),
    [
        (b"", "is no PNG, TIFF"),
        (b"just text", "is no PNG, TIFF"),
        (b"%PDF-1.4\n", "holds no record"),
        (b"\x89PNG\r\n\x1a\n", "holds no record"),
        (b"\x89PNG\r\n\x1a\n\0\0", "is damaged"),
        (b"II*\0\xff\xff\xff\xff", "is damaged"),
        (b"<svg><metadata></svg>", "is damaged"),
        (b"<svg></svg>", "holds no record"),
        (b"SQLite format 3\0 and then nothing", "is not a tile index"),
        (b"%PDF-1.4\n1 0 obj <</Keywords (map, chaos)>> endobj trailer <</Info 1 0 R>>", "'map, chaos'"),
    ],
)
def test_files_without_a_record_are_refused_in_one_sentence(
    content: bytes, reason: str, tmp_path: Path
) -> None:
    path = tmp_path / "file"
    path.write_bytes(content)
    with pytest.raises(Exception, match=reason) as caught:
        read(path)
    assert getattr(caught.value, "exit_code", None) == 2
    assert "\n" not in str(caught.value)


def test_a_missing_file_is_refused(tmp_path: Path) -> None:
    with pytest.raises(CertificateRefused, match="cannot be read"):
        read(tmp_path / "absent.png")
    with pytest.raises(CertificateRefused, match="cannot be read"):
        read(tmp_path)


@settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    form=st.sampled_from(FORMATS),
    cut=st.floats(0, 1),
    flips=st.lists(st.tuples(st.floats(0, 1), st.integers(0, 255)), max_size=4),
)
def test_damaged_files_never_give_a_traceback(
    form: str, cut: float, flips: list[tuple[float, int]], plates: dict[str, bytes], tmp_path: Path
) -> None:
    data = bytearray(plates[form])
    for at, value in flips:
        data[min(int(at * 3000), len(data) - 1)] = value
    path = tmp_path / "damaged"
    path.write_bytes(data[: int(cut * len(data))])
    try:
        record = read(path)
    except CertificateRefused as refusal:
        message = str(refusal)
        assert "\n" not in message
    else:
        assert "record" in record
