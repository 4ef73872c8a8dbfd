"""The browser of these tests: Debian's Chromium, driven by playwright."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.browser.opened import Opened
from tests.browser.synthetic_site import CURVED, SyntheticSite

CHROMIUM = Path("/usr/bin/chromium")
FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
Open = Callable[..., Opened]


def absent(what: str) -> None:
    """Skip, or fail where a browser is required."""
    sentence = f"{what} is not installed, so the page was not tried in a browser"
    if os.environ.get("ATLAS_REQUIRE_BROWSER") == "1":
        pytest.fail(f"{sentence}, although ATLAS_REQUIRE_BROWSER=1 asks for it", pytrace=False)
    pytest.skip(sentence)


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    """Start Chromium once."""
    if not CHROMIUM.exists():
        absent(f"Chromium ({CHROMIUM})")
    try:
        from playwright.sync_api import sync_playwright
    except ModuleNotFoundError:
        absent("playwright")
    with sync_playwright() as driver:
        started = driver.chromium.launch(executable_path=str(CHROMIUM), args=FLAGS)
        yield started
        started.close()


@pytest.fixture
def open_page(browser: Any) -> Iterator[Open]:
    """Return a function that opens a folder or an address; the test fails when the page reports an error."""
    contexts: list[Any] = []
    pages: list[Opened] = []

    def open_it(
        where: Path | str,
        *,
        size: tuple[int, int] = (900, 640),
        ratio: float = 1,
        hash: str = "",
        **more: Any,
    ) -> Opened:
        viewport = {"width": size[0], "height": size[1]}
        context = browser.new_context(viewport=viewport, device_scale_factor=ratio, **more)
        context.set_default_timeout(8000)
        contexts.append(context)
        opened = Opened(context.new_page(), ratio)
        pages.append(opened)
        opened.page.on("request", lambda request: opened.requests.append(request.url))
        opened.page.on("pageerror", lambda problem: opened.problems.append(str(problem)))
        opened.page.on(
            "console", lambda line: opened.problems.append(line.text) if line.type == "error" else None
        )
        base = f"file://{where}" if isinstance(where, Path) else where
        opened.page.goto(f"{base}/index.html{hash}")
        return opened

    yield open_it
    for context in contexts:
        context.close()
    assert [problem for opened in pages for problem in opened.problems] == []


@pytest.fixture(scope="session")
def full_site(tmp_path_factory: pytest.TempPathFactory) -> tuple[SyntheticSite, Path]:
    """Every pair of levels up to 3, with one empty tile."""
    pairs = [(a, u) for a in range(4) for u in range(4)]
    site = SyntheticSite.whole(pairs, absent=[((3, 3), 4, 4), ((2, 2), 0, 0)])
    return site, site.write(tmp_path_factory.mktemp("full") / "site")


@pytest.fixture(scope="session")
def diagonal_site(tmp_path_factory: pytest.TempPathFactory) -> tuple[SyntheticSite, Path]:
    """Equal levels of both axes, 0 to 2; two runs of marked columns."""
    site = SyntheticSite.whole([(k, k) for k in range(3)], more={"marks": {"2": "100-149,600"}})
    return site, site.write(tmp_path_factory.mktemp("diagonal") / "site")


@pytest.fixture(scope="session")
def curved_site(tmp_path_factory: pytest.TempPathFactory) -> tuple[SyntheticSite, Path]:
    """A logarithmic axis across and multiples of pi up."""
    site = SyntheticSite.whole([(0, 0), (1, 1)], axes=CURVED)
    return site, site.write(tmp_path_factory.mktemp("curved") / "site")
