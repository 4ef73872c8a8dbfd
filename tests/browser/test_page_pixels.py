"""Screenshots against the mosaic of the tiles, pixel for pixel."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from tests.browser.conftest import Open
from tests.browser.opened import Opened
from tests.browser.synthetic_site import BACKGROUND, OUTSIDE, Pair, SyntheticSite

pytestmark = pytest.mark.browser
Site = tuple[SyntheticSite, Path]
POINT = (0x6A09E667F3, 0xBB67AE8584)  # a tile of level 40 on each axis


def expected(site: SyntheticSite, opened: Opened, pair: Pair) -> np.ndarray:
    """Return the mosaic of the window that an exact view states."""
    plot = opened.call("plot")
    first = []
    for level, name in zip(pair, ("across", "up"), strict=True):
        axis = opened.axis(name)
        assert axis["pixel"] * 256 * 2**level == 1
        start = axis["start"] / axis["pixel"]
        assert start.denominator == 1
        first.append(int(start))
    return site.mosaic(pair, first[0], first[1], plot["width"], plot["height"])


@pytest.mark.parametrize("ratio", [1, 1.25, 2])
def test_a_screenshot_is_the_mosaic(full_site: Site, open_page: Open, ratio: float) -> None:
    site, folder = full_site
    opened = open_page(folder, ratio=ratio)
    for pair in [(2, 2), (3, 1), (1, 3), (3, 3)]:
        opened.go(f"{pair[0]},0.8123", f"{pair[1]},0.7f1")
        assert opened.call("shown") == {"asked": list(pair), "pair": list(pair), "kind": "exact"}
        np.testing.assert_array_equal(opened.plot(), expected(site, opened, pair))
        assert "one tile pixel is one screen pixel" in opened.status()


@pytest.mark.parametrize("size", [(901, 603), (777, 641)])
def test_odd_windows_are_exact_too(full_site: Site, open_page: Open, size: tuple[int, int]) -> None:
    site, folder = full_site
    opened = open_page(folder, ratio=1.25, size=size, hash="#across=2,0.8&up=3,0.4").settle()
    np.testing.assert_array_equal(opened.plot(), expected(site, opened, (2, 3)))


def test_beyond_the_ends_and_empty_tiles(full_site: Site, open_page: Open) -> None:
    site, folder = full_site
    opened = open_page(folder, hash="#across=2,0.01&up=2,0").settle()
    picture = opened.plot()
    np.testing.assert_array_equal(picture, expected(site, opened, (2, 2)))
    assert (picture == BACKGROUND).all(axis=2).sum() > 10_000
    assert (picture == OUTSIDE).all(axis=2).sum() > 10_000


@pytest.mark.parametrize(("ratio", "pair"), [(1, (40, 40)), (1.25, (40, 24)), (2, (40, 40))])
def test_deep_levels_are_exact(tmp_path: Path, open_page: Open, ratio: float, pair: Pair) -> None:
    row = POINT[1] >> (40 - pair[1])
    around = {(POINT[0] + dx, row + dy) for dx in range(-4, 5) for dy in range(-3, 4)}
    site = SyntheticSite({(0, 0): {(0, 0)}, pair: around})
    centre = [f"0.{POINT[0]:010x}8", f"0.{POINT[1]:010x}8"]
    opened = open_page(
        site.write(tmp_path / "site"),
        ratio=ratio,
        hash=f"#across={pair[0]},{centre[0]}&up={pair[1]},{centre[1]}",
    ).settle()
    np.testing.assert_array_equal(opened.plot(), expected(site, opened, pair))
    before = opened.addresses()
    opened.press("ArrowLeft", "ArrowUp", "Shift+ArrowUp", "+", "+")
    assert opened.addresses() != before
    opened.press("-", "-", "Shift+ArrowDown", "ArrowDown", "ArrowRight")
    assert opened.addresses() == before
    np.testing.assert_array_equal(opened.plot(), expected(site, opened, pair))


def test_a_missing_pair_is_stretched_unsmoothed(diagonal_site: Site, open_page: Open) -> None:
    site, folder = diagonal_site
    opened = open_page(folder, size=(700, 500))
    for asked, coarse in [((2, 1), (1, 1)), ((3, 2), (2, 2)), ((6, 2), (2, 2)), ((8, 2), (2, 2))]:
        opened.go(f"{asked[0]},0.5", f"{asked[1]},0.8")
        assert opened.call("shown") == {"asked": list(asked), "pair": list(coarse), "kind": "stretched"}
        assert opened.status() == (
            f"No tiles of level across {asked[0]}, up {asked[1]} were built: "
            f"across {coarse[0]}, up {coarse[1]} is shown, stretched."
        )
        plot = opened.call("plot")
        left, bottom = (
            int(opened.axis(name)["start"] / opened.axis(name)["pixel"]) for name in ("across", "up")
        )
        columns = np.arange(left, left + plot["width"]) // 2 ** (asked[0] - coarse[0])
        first, last = int(columns[0]), int(columns[-1])
        narrow = site.mosaic(coarse, first, bottom, last - first + 1, plot["height"])
        np.testing.assert_array_equal(opened.plot(), narrow[:, columns - first])


@pytest.mark.parametrize("ratio", [1, 1.25, 2])
def test_no_seams_between_whole_levels(tmp_path: Path, open_page: Open, ratio: float) -> None:
    site = SyntheticSite.whole([(0, 0), (1, 1), (2, 2)], plain=(0, 0, 0), more={"background": "#ff0000"})
    opened = open_page(site.write(tmp_path / "site"), size=(480, 480), ratio=ratio)
    kinds = set()
    for across, up in [("1.75", "1.5"), ("1.703125", "1.703125"), ("2.34375", "2.953125"), ("6.515625", "2")]:
        opened.go(f"{across},0.8123", f"{up},0.7fed")
        kinds.add(opened.call("shown")["kind"])
        assert not opened.plot().any(axis=2)[2:-2, 2:-2].any(), (across, up)
    assert kinds == {"shrunk", "stretched"}


def test_shrinking_leaves_no_gaps_in_a_thin_branch(tmp_path: Path, open_page: Open) -> None:
    folder = SyntheticSite.whole([(0, 0), (2, 2)], plain=(0, 0, 0)).write(tmp_path / "site")
    line = np.zeros((256, 256), np.uint8)
    np.fill_diagonal(line, 255)
    for file in folder.glob("tiles/density/2/*/*/*.png"):
        Image.fromarray(line).convert("RGB").save(file)
    opened = open_page(folder)
    for across, up in [("1.5", "1.703125"), ("1.546875", "0.3125"), ("0.3125", "0.296875")]:
        opened.go(f"{across},0.8", f"{up},0.8")
        assert opened.call("shown")["pair"] == [2, 2]
        picture = opened.plot()[..., 0].astype(int)
        inside = np.flatnonzero((opened.plot() != OUTSIDE).any(axis=2).any(axis=0))[3:-3]
        rows = np.flatnonzero((opened.plot() != OUTSIDE).any(axis=2).any(axis=1))
        assert inside.size > 250
        assert picture[rows[0] : rows[-1] + 1, inside].max(axis=0).min() > 15


def test_columns_with_an_unsettled_share_are_marked(diagonal_site: Site, open_page: Open) -> None:
    _, folder = diagonal_site
    opened = open_page(folder, size=(1200, 640), hash="#across=2,0.8&up=1,0.8").settle()
    left, top = opened.plot_corner()
    plot = opened.call("plot")
    first = int(opened.axis("across")["start"] * 1024)
    for line in (top - 4, top + plot["height"] + 4):
        marked = (opened.screenshot()[line, left : left + plot["width"]] == (0xB3, 0x46, 0x1E)).all(axis=1)
        assert set(np.flatnonzero(marked) + first) == {*range(100, 150), 600}
