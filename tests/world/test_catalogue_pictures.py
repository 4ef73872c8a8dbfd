"""Every row of the catalogue renders a picture of its default view that shows something."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from PIL import Image

import atlas
from atlas.families.catalogue import family
from atlas.output.printing import sheet_of
from atlas.reading.sheet import Size
from tests.reference.rows import drawn_rows

each_family = pytest.mark.parametrize("name", drawn_rows())


def default_plate(name: str) -> Any:
    """Return a small plate of a family's own view."""
    own = family(name)
    assert own.across is not None
    assert own.up is not None
    return atlas.plate(
        name, own.across, own.up, name=name, size="480x320px", dpi=110, samples=2000, background="#ffffff"
    )


@each_family
def test_the_default_view_is_rendered_and_not_empty(name: str, tmp_path: Path) -> None:
    """Between 3 % and 70 % of the raster is occupied, all columns are; the certificate says what was lost."""
    plate = default_plate(name)
    path = tmp_path / f"{name}.png"
    atlas.draw_plate(plate, [path])
    box = sheet_of(plate).page.panels[0]
    with Image.open(path) as image:
        pixels = np.asarray(image.convert("RGB"))
    assert pixels.shape == (320, 480, 3)
    raster = pixels[box.top : box.top + box.height, box.left : box.left + box.width].astype(int)
    occupied = (raster != 255).any(axis=2)
    assert 0.03 < occupied.mean() < 0.7
    assert occupied.any(axis=0).mean() > 0.98
    shares = atlas.read_certificate(path)["shares"][name]
    assert {"below", "above", "escaped", "unsettled", "collapsed_orbits"} <= set(shares)
    assert shares["escaped"] == shares["below"] == shares["above"] == 0
    assert shares["unsettled"] < 0.01


@each_family
def test_the_default_view_shows_order_and_chaos(name: str) -> None:
    """Every picture has columns of few cells and columns of many."""
    view = default_plate(name).view
    made = atlas.orbit_counts(family(name), view, size=(120, 200), values_per_column=1)
    occupied = (made.counts.values > 0).sum(axis=0)
    assert occupied.min() <= 4
    assert occupied.max() >= 80


def test_how_many_points_a_square_of_ten_inches_can_show() -> None:
    """Common practice, no source: at 300 dpi it has 9 million pixels, and can show no more points."""
    assert Size.parse("254x254").pixels(300) == (3000, 3000)
    plate = atlas.plate("logistic", ("r", "2.8", 4), ("x", 0, 1), size="254x254", dpi=300)
    (view,) = sheet_of(plate).views
    assert 7_000_000 < view.columns * view.rows < 9_000_000


def test_the_escaped_share_is_in_the_certificate(tmp_path: Path) -> None:
    """Half of a view from 3.9 to 4.1 escapes; source: exact algebra."""
    path = tmp_path / "beyond.png"
    starts = [{"x": f"{k}/11"} for k in range(1, 11)]
    plate = atlas.plate(
        "logistic",
        ("r", "3.9", "4.1"),
        ("x", 0, 1),
        name="beyond",
        size="420x300px",
        samples=500,
        starts=starts,
        transient=5000,
    )
    atlas.draw_plate(plate, [path])
    assert atlas.read_certificate(path)["shares"]["beyond"]["escaped"] == pytest.approx(0.5, abs=0.01)
