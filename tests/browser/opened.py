"""A page opened in the browser: its state, its screenshots and what it asked for."""

from __future__ import annotations

import io
import time
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray
from PIL import Image


@dataclass
class Opened:
    """A page with the test hook that ``page.js`` describes."""

    page: Any
    ratio: float
    requests: list[str] = field(default_factory=list)
    problems: list[str] = field(default_factory=list)

    def settle(self) -> Opened:
        """Wait until the view is drawn with all its tiles."""
        self.page.wait_for_function("window.atlasPage.ready()", polling=20)
        return self

    def call(self, name: str, *arguments: Any) -> Any:
        """Return what a function of the hook gives."""
        return self.page.evaluate(
            "([name, given]) => window.atlasPage[name](...given)", [name, list(arguments)]
        )

    def axis(self, name: str) -> dict[str, Any]:
        """Return the state of an axis; shares of the axis as fractions."""
        state: dict[str, Any] = self.call("view")[name]
        return {**state, **{key: Fraction(state[key]) for key in ("low", "high", "start", "pixel")}}

    def addresses(self) -> tuple[str, str]:
        """Return the exact addresses of both axes."""
        view = self.call("view")
        return view["across"]["address"], view["up"]["address"]

    def press(self, *keys: str) -> Opened:
        """Press keys, one after the other, and wait for the picture."""
        for key in keys:
            self.page.keyboard.press(key)
        return self.settle()

    def go(self, across: str, up: str) -> Opened:
        """Follow a link to a view of this page."""
        self.page.evaluate("hash => { location.hash = hash; }", f"#across={across}&up={up}")
        deadline = time.monotonic() + 10
        while self.call("view")["across"]["address"] != across or self.call("view")["up"]["address"] != up:
            assert time.monotonic() < deadline, f"the page shows {self.addresses()}, not {across} and {up}"
        return self.settle()

    def status(self) -> str:
        """Return the sentence below the canvas."""
        return str(self.page.text_content("#status"))

    def screenshot(self) -> NDArray[np.uint8]:
        """Return the window in device pixels, shape (height, width, 3)."""
        return np.asarray(Image.open(io.BytesIO(self.page.screenshot())).convert("RGB"))

    def plot_corner(self) -> tuple[int, int]:
        """Return left and top of the plot box in device pixels of the window."""
        box = self.page.locator("canvas").bounding_box()
        plot = self.call("plot")
        corner = (box["x"] * self.ratio + plot["left"], box["y"] * self.ratio + plot["top"])
        whole = (round(corner[0]), round(corner[1]))
        assert np.allclose(corner, whole, atol=0.05), f"the canvas does not lie on device pixels: {corner}"
        return whole

    def plot(self) -> NDArray[np.uint8]:
        """Return the pixels inside the frame."""
        left, top = self.plot_corner()
        plot = self.call("plot")
        return self.screenshot()[top : top + plot["height"], left : left + plot["width"]]
