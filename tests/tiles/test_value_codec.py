"""Sums come back bit for bit, and equal sums have equal digests."""

import hashlib
import zlib

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as some

from tiles.grid import TILE
from tiles.value_codec import decode_sums, encode_sums

RNG = np.random.default_rng(3)
NOISE = RNG.normal(size=(TILE, TILE))


@pytest.mark.parametrize(
    "sums",
    [
        np.zeros((TILE, TILE)),
        NOISE,
        np.where(NOISE > 0, NOISE, 0.0),
        NOISE.astype(np.float32).astype(np.float64),
        np.round(NOISE),
        np.full((TILE, TILE), 1e308),
        np.full((TILE, TILE), np.inf),
        np.linspace(-1, 1, TILE * TILE).reshape(TILE, TILE),
    ],
    ids=["zero", "noise", "half", "single", "whole", "huge", "infinite", "ramp"],
)
def test_sums_come_back(sums):
    found = encode_sums(sums, b"")
    back = decode_sums(found.blob)
    assert back.dtype == np.float64
    assert back.shape == (TILE, TILE)
    assert back.tobytes() == sums.tobytes()


@settings(max_examples=20)
@given(some.integers(0, 2**32 - 1), some.floats(0, 1), some.integers(1, 52))
def test_any_sums_come_back(seed, share, bits):
    rng = np.random.default_rng(seed)
    sums = np.where(rng.random((TILE, TILE)) < share, np.round(rng.normal(size=(TILE, TILE)) * 2**bits), 0.0)
    assert decode_sums(encode_sums(sums, b"").blob).tobytes() == sums.tobytes()


def test_what_repeats_is_short_and_noise_is_no_longer_than_it_is():
    assert len(encode_sums(np.full((TILE, TILE), 0.25), b"").blob) == 8 * 6
    assert len(encode_sums(NOISE, b"").blob) < 8 * TILE * TILE
    single = NOISE.astype(np.float32).astype(np.float64)
    assert len(encode_sums(single, b"").blob) < 4.6 * TILE * TILE


def test_the_written_description_suffices():
    """Every step is one of INDEX.md."""
    sums = np.where(NOISE > 0, NOISE, 0.0)
    found = encode_sums(sums, b"digest of numbers")
    at, planes = 0, []
    for _ in range(8):
        kind, size = found.blob[at], int.from_bytes(found.blob[at + 1 : at + 5], "little")
        part = found.blob[at + 5 : at + 5 + size]
        planes.append(part * 65536 if kind == 0 else part if kind == 1 else zlib.decompress(part))
        at += 5 + size
    assert at == len(found.blob)
    assert [len(plane) for plane in planes] == [65536] * 8
    cells = b"".join(bytes(cell) for cell in zip(*planes, strict=True))
    assert cells == sums.astype("<f8").tobytes()
    assert hashlib.sha256(b"".join(planes) + b"digest of numbers").digest() == found.digest


@pytest.mark.parametrize("blob", [b"", b"\x07" * 600_000, b"\x00\x02\x00\x00\x00ab"])
def test_damaged_bytes_are_refused(blob):
    with pytest.raises(ValueError, match=r"plane of sums|could not broadcast|smaller than"):
        decode_sums(blob)


def test_a_damaged_stream_is_refused():
    blob = encode_sums(np.round(NOISE), b"").blob
    with pytest.raises((zlib.error, ValueError)):
        decode_sums(blob[: len(blob) - 7])
