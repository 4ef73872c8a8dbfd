"""What stands around the tiles: ticks, words, controls, small windows, and pages without their data."""

from __future__ import annotations

import json
from fractions import Fraction
from itertools import pairwise, product
from pathlib import Path
from typing import Any

import pytest

from tests.browser.conftest import Open
from tests.browser.synthetic_site import SyntheticSite

pytestmark = pytest.mark.browser
Site = tuple[SyntheticSite, Path]
TICKS = """([name, deepest, pixels, address, count]) => {
  const axis = new Axis(ATLAS_META.axes[name], deepest);
  axis.resize(pixels);
  axis.follow(address);
  const found = ticks.of(axis, count);
  return {...found, start: `${axis.start()}/${axis.full}`, pixel: `${axis.unit()}/${axis.full}`};
}"""
RAISED = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻−", "0123456789--")


def tick_values(found: dict[str, Any]) -> list[Fraction]:
    """Read tick labels back as exact numbers."""
    texts = [major["text"].translate(RAISED) for major in found["major"]]
    if not found["offset"]:
        return [Fraction(text) for text in texts]
    base, _, power = found["offset"].translate(RAISED).rpartition("tick × 10")
    shared = Fraction(base.removesuffix(" + ") or 0)
    return [shared + int(text) * Fraction(10) ** int(power) for text in texts]


def test_ticks_stand_where_their_labels_say(full_site: Site, open_page: Open) -> None:
    site, folder = full_site
    opened = open_page(folder)
    low = site.end("across", "low")
    width = site.end("across", "high") - low
    centres = ("0.6a09e667f3bcc908", "0.aaaaaaaaaaaaaaaa", "0.fffffffffffff")
    for level, centre in product(("1", "5.5", "12", "33.25", "60"), centres):
        found = opened.page.evaluate(TICKS, ["across", 44, 900, f"{level},{centre}", 9])
        values = tick_values(found)
        assert len(values) >= 2
        assert len({after - before for before, after in pairwise(values)}) == 1
        for major, value in zip(found["major"], values, strict=True):
            pixel = ((value - low) / width - Fraction(found["start"])) / Fraction(found["pixel"])
            assert abs(major["pixel"] - pixel) <= Fraction(1, 2)
            assert len(major["text"]) <= 7


def test_ticks_of_log_axes_and_of_pi(curved_site: Site, open_page: Open) -> None:
    opened = open_page(curved_site[1])
    found = opened.page.evaluate(TICKS, ["across", 4, 900, "1.8125,0.8", 9])
    assert [each["text"] for each in found["major"]] == ["0.001", "0.01", "0.1", "1", "10", "100"]
    narrow = opened.page.evaluate(TICKS, ["across", 44, 900, "40,0.8", 9])
    assert "tick × 10⁻" in narrow["offset"]
    for each, value in zip(narrow["major"], tick_values(narrow), strict=True):
        share = Fraction(narrow["start"]) + each["pixel"] * Fraction(narrow["pixel"])
        assert float(value) == pytest.approx(1e-3 * 500_000 ** float(share), rel=1e-12)
    up = opened.page.evaluate(TICKS, ["up", 4, 600, "1.25,0.8", 9])
    texts = [each["text"] for each in up["major"]]
    assert texts == ["−0.4π", "−0.2π", "0", "0.2π", "0.4π", "0.6π", "0.8π"]


def test_logarithms_and_decimals(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1])
    bits = 220
    ln2, back, rounded = opened.page.evaluate(
        """bits => {
          const work = BigInt(bits);
          const ln = exact.ln(exact.rational(7n, 3n), work);
          return [String(exact.ln(exact.rational(2n), work)), exact.decimal(exact.exp(ln, work), 50),
                  ["-7/4", "1/8", "-1/1000"].map(text => exact.decimal(
                    exact.rational(BigInt(text.split("/")[0]), BigInt(text.split("/")[1])), 1))];
        }""",
        bits,
    )
    # ln 2 to 50 digits: common tables of mathematical constants
    ln_of_two = Fraction("0.69314718055994530941723212145817656807550013436025")
    assert abs(Fraction(int(ln2), 2**bits) - ln_of_two) < Fraction(1, 10**49)
    assert abs(Fraction(back) - Fraction(7, 3)) <= Fraction(1, 10**50)
    assert rounded == ["-1.7", "0.1", "0.0"]


@pytest.mark.parametrize("size", [(360, 640), (390, 844), (1280, 800)])
def test_controls_fit_the_window(diagonal_site: Site, open_page: Open, size: tuple[int, int]) -> None:
    opened = open_page(diagonal_site[1], size=size, ratio=2, hash="#across=2,0.8&up=2,0.8").settle()
    page = opened.page
    assert page.evaluate(
        "[document.documentElement.scrollWidth, document.documentElement.scrollHeight]"
    ) == list(size)
    canvas = page.locator("canvas").bounding_box()
    controls = page.locator("button:visible, .choice label, #readout, #status, #key, h1").all()
    assert len(controls) == 14
    boxes = [control.bounding_box() for control in controls]
    for box in boxes:
        assert box["x"] >= 0
        assert box["x"] + box["width"] <= size[0]
        assert box["y"] + box["height"] <= canvas["y"] + 1 or box["y"] >= canvas["y"] + canvas["height"] - 1
        assert box["y"] + box["height"] <= size[1]
    plot = opened.call("plot")
    assert plot["width"] >= 2 * 280
    assert plot["height"] >= 2 * 300


def test_controls_have_names_and_the_canvas_takes_the_focus(diagonal_site: Site, open_page: Open) -> None:
    page = open_page(diagonal_site[1]).settle().page
    names = ["Zoom out", "Zoom in", "Whole view", "Tile pixels", "Copy link", "Copy YAML", "About"]
    for name in names:
        assert page.get_by_role("button", name=name, exact=True).is_visible()
    assert page.get_by_role("group", name="Zoom").is_visible()
    page.locator("canvas").focus()
    assert page.evaluate("document.activeElement.id") == "canvas"
    assert "arrows move" in page.get_attribute("canvas", "aria-label")
    page.get_by_role("button", name="About").click()
    assert page.get_by_role("dialog", name="Pattern of addresses").is_visible()
    assert "r*x*(1 - x)" in page.text_content("#record")
    page.keyboard.press("Escape")
    assert not page.get_by_role("dialog").is_visible()


def test_a_page_without_its_data_says_so(tmp_path: Path, open_page: Open) -> None:
    folder = SyntheticSite.whole([(0, 0)]).write(tmp_path / "site")
    (folder / "meta.js").unlink()
    opened = open_page(folder)
    assert opened.page.get_by_role("alert").text_content() == (
        "The file meta.js is missing beside this page: "
        "copy the whole site folder, or build it again with 'atlas site'."
    )
    assert not opened.page.locator("button").count()
    opened.problems.clear()  # the browser reports the missing file too


def test_data_of_another_version(tmp_path: Path, open_page: Open) -> None:
    folder = SyntheticSite.whole([(0, 0)]).write(tmp_path / "site")
    (folder / "meta.js").write_text(f"window.ATLAS_META = {json.dumps({'version': 7})};")
    assert "found version 7" in open_page(folder).page.get_by_role("alert").text_content()


def test_a_tile_that_cannot_be_read(tmp_path: Path, open_page: Open) -> None:
    folder = SyntheticSite.whole([(0, 0)]).write(tmp_path / "site")
    (folder / "tiles/density/0/0/0/0.png").unlink()
    opened = open_page(folder, hash="#across=0,0.8&up=0,0.8").settle()
    assert opened.status().endswith("1 tile could not be read.")
    opened.problems.clear()


def test_levels_too_coarse_for_what_was_built(tmp_path: Path, open_page: Open) -> None:
    site = SyntheticSite({(40, 40): {(2**39, 2**39)}})
    opened = open_page(site.write(tmp_path / "site")).settle()
    assert opened.status() == "No tiles of levels as coarse as these were built: zoom in."
    opened.press("p")
    assert opened.call("shown")["kind"] == "exact"
