"""Keys, wheel, drag, pinch, links, readouts and copying."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from fractions import Fraction
from functools import partial
from http.server import SimpleHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path
from typing import Any

import pytest

from tests.browser.conftest import Open
from tests.browser.opened import Opened
from tests.browser.synthetic_site import SyntheticSite

pytestmark = pytest.mark.browser
Site = tuple[SyntheticSite, Path]
SIDES = {"across": "width", "up": "height"}


def reach_levels(opened: Opened, across: float, up: float) -> None:
    """Wait until the page shows exactly these levels; fails by running out of time."""
    opened.page.wait_for_function(
        "([across, up]) => atlasPage.view().across.level === across && atlasPage.view().up.level === up",
        arg=[across, up],
    )
    opened.settle()


def test_starts_with_the_whole_view(full_site: Site, open_page: Open) -> None:
    site, folder = full_site
    opened = open_page(folder).settle()
    for name in ("across", "up"):
        axis = opened.axis(name)
        assert (axis["low"], axis["high"]) == (site.end(name, "low"), site.end(name, "high"))
        size = opened.call("plot")[SIDES[name]]
        assert 0.97 < 1 / (axis["pixel"] * size) <= 1
    assert "#" not in opened.page.url
    opened.page.set_viewport_size({"width": 640, "height": 500})
    opened.settle()
    assert opened.axis("across")["high"] == site.end("across", "high")


@pytest.mark.parametrize("start", ["", "#across=3.140625,0.71&up=1,0.3"])
def test_keys_away_and_back(full_site: Site, open_page: Open, start: str) -> None:
    opened = open_page(full_site[1], hash=start).settle()
    before = opened.call("view")
    opened.press("+", "+", "ArrowLeft", "ArrowUp", "Shift+ArrowRight", "a", "+", "u", "+", "Shift+ArrowUp")
    away = opened.call("view")
    assert away["across"]["level"] == away["up"]["level"] + before["across"]["level"] - before["up"]["level"]
    opened.press(
        "Shift+ArrowDown", "-", "a", "-", "b", "Shift+ArrowLeft", "ArrowDown", "ArrowRight", "-", "-"
    )
    assert opened.call("view") == before
    opened.press("Home")
    assert opened.axis("up")["high"] == 1


def test_arrows_move_by_device_pixels(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], ratio=2, hash="#across=3,0.8&up=2,0.8").settle()
    before = opened.axis("across")["start"]
    opened.press("Shift+ArrowRight")
    assert opened.axis("across")["start"] - before == opened.axis("across")["pixel"]
    opened.press("ArrowRight")
    assert opened.axis("across")["start"] - before == 129 * opened.axis("across")["pixel"]


def test_axes_zoom_apart(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], hash="#across=2,0.8&up=2,0.8").settle()

    opened.page.mouse.move(400, 300)
    opened.page.mouse.wheel(0, -200)
    reach_levels(opened, 2.5, 2.5)
    opened.page.keyboard.down("Shift")
    opened.page.mouse.wheel(0, -100)
    reach_levels(opened, 2.75, 2.5)
    opened.page.keyboard.up("Shift")
    opened.page.keyboard.down("Alt")
    opened.page.mouse.wheel(0, -100)
    reach_levels(opened, 2.75, 2.75)
    opened.page.keyboard.up("Alt")
    opened.page.get_by_label("across", exact=True).check()
    opened.page.get_by_role("button", name="Zoom in").click()
    reach_levels(opened, 3.25, 2.75)
    opened.page.get_by_label("up", exact=True).check()
    opened.page.get_by_role("button", name="Zoom out").click()
    reach_levels(opened, 3.25, 2.25)
    opened.page.get_by_role("button", name="Tile pixels").click()
    reach_levels(opened, 3, 2)


def test_wheel_keeps_what_lies_under_the_pointer(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], hash="#across=2,0.8&up=2,0.8").settle()
    before = opened.addresses()
    left, top = opened.plot_corner()
    opened.page.mouse.move(left + 123, top + 77)

    def under_pointer() -> Fraction:
        axis = opened.settle().axis("across")
        return axis["start"] + 123 * axis["pixel"]

    held = under_pointer()
    for turn in (-300, 300):
        opened.page.mouse.wheel(0, turn)
        opened.page.wait_for_function(f"atlasPage.view().up.level === {2.75 if turn < 0 else 2}")
        assert abs(under_pointer() - held) <= opened.axis("across")["pixel"] / 2
    assert opened.addresses() == before


def test_drag_moves_by_exact_pixels(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], hash="#across=3,0.8&up=3,0.8").settle()
    across, up = opened.axis("across"), opened.axis("up")
    opened.page.mouse.move(400, 300)
    opened.page.mouse.down()
    opened.page.mouse.move(420, 310)
    opened.page.mouse.move(437, 341)
    opened.page.mouse.up()
    opened.settle()
    assert opened.axis("across")["start"] == across["start"] - 37 * across["pixel"]
    assert opened.axis("up")["start"] == up["start"] + 41 * up["pixel"]


@pytest.mark.parametrize(("axes", "gained"), [("both", (1, 1)), ("across", (1, 0))])
def test_pinch(full_site: Site, open_page: Open, axes: str, gained: tuple[int, int]) -> None:
    opened = open_page(
        full_site[1], size=(360, 640), hash="#across=1.5,0.8&up=1,0.8", has_touch=True
    ).settle()
    opened.page.get_by_label("both axes" if axes == "both" else axes, exact=True).check()
    fingers = opened.page.context.new_cdp_session(opened.page)

    def touch(kind: str, *at: tuple[int, int]) -> None:
        points = [{"x": x, "y": y, "id": k} for k, (x, y) in enumerate(at)]
        fingers.send("Input.dispatchTouchEvent", {"type": kind, "touchPoints": points})

    touch("touchStart", (170, 300))
    touch("touchStart", (170, 300), (230, 300))
    for out in (10, 20, 30):
        touch("touchMove", (170 - out, 300), (230 + out, 300))
    touch("touchEnd")
    reach_levels(opened, 1.5 + gained[0], 1 + gained[1])


def test_limits(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], hash="#across=23,0.8&up=2,0.8").settle()
    opened.press("+", "+", "+")
    assert opened.axis("across")["level"] == 23
    opened.press("Home", *["-"] * 6)
    for name, side in SIDES.items():
        axis = opened.axis(name)
        assert axis["level"] <= 0 or 1 / axis["pixel"] >= opened.call("plot")[side] / 2
    opened.press(*["ArrowRight"] * 12)
    assert opened.addresses()[0].endswith(",1")


def test_link_restores_the_view(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1]).settle().press("+", "ArrowLeft", "a", "+", "Shift+ArrowUp")
    view = opened.call("view")
    opened.page.mouse.move(300, 300)
    opened.page.mouse.wheel(0, -130)
    opened.page.wait_for_function(
        "before => atlasPage.view().across.level > before", arg=view["across"]["level"]
    )
    view = opened.settle().call("view")
    link = opened.page.url
    again = open_page(full_site[1], hash="#" + link.split("#")[1]).settle()
    assert again.call("view") == view
    again.page.evaluate("location.hash = ''")
    again.page.wait_for_function("atlasPage.view().across.address.endsWith(',0.8')")
    again.page.go_back()
    again.page.wait_for_function("link => location.href === link", arg=link)
    assert again.settle().call("view") == view


def test_a_link_that_makes_no_sense(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], hash="#across=2,0.zz&up=999").settle()
    assert (
        opened.status() == "The view in this page's address could not be read, so the view was left as it is."
    )
    assert opened.axis("across")["low"] == Fraction(14, 5)


def test_readout_is_exact(full_site: Site, open_page: Open) -> None:
    site, folder = full_site
    opened = open_page(folder)
    for across, up in [("1.25", "1.5"), ("3", "2"), ("22.5", "23")]:
        opened.go(f"{across},0.812345", f"{up},0.3")
        plot = opened.call("plot")
        texts = opened.call("readout", plot["left"] + 123.5, plot["top"] + 45.5)
        for name, text, pixel in zip(("across", "up"), texts, (123, plot["height"] - 46), strict=True):
            axis = opened.axis(name)
            width = site.end(name, "high") - site.end(name, "low")
            value = site.end(name, "low") + width * (axis["start"] + (pixel + Fraction(1, 2)) * axis["pixel"])
            places = len(text.partition(".")[2])
            assert abs(Fraction(text) - value) <= Fraction(1, 2 * 10**places)
            assert Fraction(1, 10**places) <= width * axis["pixel"] / 10
    opened.page.mouse.move(plot["left"] + 123, opened.plot_corner()[1] + 45)
    opened.settle()
    assert opened.page.text_content("#readout") == f"pointerr = {texts[0]}x = {texts[1].replace('-', '−')} kt"


class Served:
    """A static web server on loopback that remembers what it was asked for."""

    def __init__(self, folder: Path) -> None:
        answers: list[tuple[str, int]] = []

        class Handler(SimpleHTTPRequestHandler):
            def log_request(self, code: Any = "-", size: Any = "-") -> None:
                answers.append((self.path, int(code)))

        self.answers = answers
        self.server = ThreadingHTTPServer(("127.0.0.1", 0), partial(Handler, directory=str(folder)))
        self.address = f"http://127.0.0.1:{self.server.server_port}"


@pytest.fixture
def served(full_site: Site) -> Iterator[Served]:
    serving = Served(full_site[1])
    thread = threading.Thread(target=serving.server.serve_forever, kwargs={"poll_interval": 0.02})
    thread.start()
    yield serving
    serving.server.shutdown()
    thread.join()
    serving.server.server_close()


def test_copying_with_either_clipboard(served: Served, open_page: Open) -> None:
    opened = open_page(served.address, permissions=["clipboard-read", "clipboard-write"]).settle()
    for secure in (True, False):
        opened.press("+", "ArrowLeft")
        opened.page.evaluate(
            f"Object.defineProperty(window, 'isSecureContext', {{value: {secure:d}, configurable: true}})"
        )
        for button, wanted in (("Copy YAML", opened.call("plateText")), ("Copy link", opened.page.url)):
            opened.page.get_by_role("button", name=button).click()
            opened.page.wait_for_function(
                "document.getElementById('status').textContent.startsWith('Copied')"
            )
            assert opened.page.evaluate("navigator.clipboard.readText()") == wanted
            opened.press("Shift+ArrowLeft", "Shift+ArrowRight")


def test_absent_tiles_are_never_asked_for(served: Served, open_page: Open) -> None:
    opened = open_page(served.address, hash="#across=3,0.8&up=3,0.8").settle()
    for across, up in [
        ("3,0.c", "3,0.c"),
        ("3,0.4", "3,0.8"),
        ("2,0.8", "2,0.8"),
        ("2,0", "2,0"),
        ("0,0.8", "0,0.8"),
    ]:
        opened.go(across, up)
    opened.press("Home")
    paths = {path for path, _ in served.answers if path.startswith("/tiles/")}
    assert len(paths) > 20
    assert "/tiles/density/2/2/0/0.png" not in paths
    assert "/tiles/density/3/3/4/4.png" not in paths
    assert {code for _, code in served.answers} <= {200, 304}


def test_only_what_is_shown_is_read(full_site: Site, open_page: Open) -> None:
    opened = open_page(full_site[1], hash="#across=3,0.8&up=3,0.8").settle()
    tiles = [url for url in opened.requests if url.endswith(".png")]
    assert all("/tiles/density/3/3/" in url for url in tiles)
    assert 0 < len(tiles) <= 20
    assert all(url.startswith(("file:", "data:")) for url in opened.requests)
