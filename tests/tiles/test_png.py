"""Other readers see the same pixels in our PNG files."""

import io

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as some
from PIL import Image

from tiles import png


@settings(deadline=None)
@given(some.integers(1, 300), some.integers(1, 300), some.integers(1, 256), some.integers(0, 99))
def test_pillow_reads_the_same_palette_and_pixels(lines, pixels, colours, seed):
    rng = np.random.default_rng(seed)
    table = rng.integers(0, 256, (colours, 3)).astype(np.uint8)
    indices = rng.integers(0, colours, (lines, pixels)).astype(np.uint8)
    indices[lines // 2 :] = 0
    with Image.open(io.BytesIO(png.encode(indices, table))) as picture:
        picture.load()
        assert (picture.format, picture.mode, picture.size) == ("PNG", "P", (pixels, lines))
        assert np.array_equal(np.asarray(picture), indices)
        assert np.array_equal(np.asarray(picture.convert("RGB")), table[indices])


def test_strided_indices_encode_alike():
    indices = np.random.default_rng(3).integers(0, 5, (64, 32)).astype(np.uint8)
    table = np.arange(15, dtype=np.uint8).reshape(5, 3)
    flipped = np.ascontiguousarray(indices.T[::-1])
    assert png.encode(indices.T[::-1], table) == png.encode(flipped, table)


def test_equal_pictures_are_equal_files():
    table = np.zeros((2, 3), np.uint8)
    indices = np.eye(16, dtype=np.uint8)
    assert png.encode(indices, table) == png.encode(indices.copy(), table.copy())


@pytest.mark.parametrize("shade", [0, 1])
def test_plain_pictures_are_small(shade):
    assert len(png.encode(np.full((256, 256), shade, np.uint8), np.zeros((2, 3), np.uint8))) < 600
