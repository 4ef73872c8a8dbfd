"""Setting type with matplotlib: small grey pictures of words for pixels, whole pages for PDF and SVG.

The one home of matplotlib in `atlas`. It is imported when the first word is set, never by `import atlas`.
"""

from __future__ import annotations

import io
import logging
import math
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.errors import shown
from atlas.figure.painting import Stamp
from atlas.figure.pieces import Block, Picture, Piece, Words
from tiles.errors import Refusal

FONT = "DejaVu Sans"
_RIM = 2
_TRIES = 5  # widths of hinted type are not quite proportional to its size
_SETTINGS = {
    "font.family": [FONT],
    "mathtext.fontset": "dejavusans",
    "text.usetex": False,
    "pdf.fonttype": 42,
    "pdf.compression": 6,
    "svg.fonttype": "path",
    "svg.hashsalt": "iterated-map-atlas",
}


class LetteringRefused(Refusal):
    """A text with characters that the font does not hold."""


@contextmanager
def settings() -> Iterator[None]:
    """Set type by our own rules, whatever the user's matplotlib is told; restored at the end."""
    log = logging.getLogger("matplotlib")
    before = log.level
    log.setLevel(logging.ERROR)  # notes on font caches and folders are no business of a plate's maker
    try:
        import matplotlib
        import matplotlib.font_manager

        with matplotlib.rc_context():
            matplotlib.rcdefaults()
            matplotlib.rcParams.update(_SETTINGS)
            yield
    finally:
        log.setLevel(before)


def check_characters(texts: Sequence[str]) -> None:
    """Check that the font holds every character of some texts.

    Raises
    ------
    LetteringRefused
        Naming the first character that it does not hold.
    """
    for text in texts:
        for character in text:
            if not (character.isascii() or character.isspace() or ord(character) in _characters()):
                raise LetteringRefused(
                    f"the text {shown(text)} holds the character U+{ord(character):04X}, which the "
                    f"font {FONT} lacks; write it in Latin, Greek or Cyrillic letters"
                )


@lru_cache(maxsize=1)
def _characters() -> frozenset[int]:
    with settings():
        from matplotlib.font_manager import findfont, get_font

        return frozenset(get_font(findfont(FONT)).get_charmap())


class Typesetter:
    """Sets words at one resolution; to be used inside :func:`settings`.

    Parameters
    ----------
    dpi : float
        Pixels an inch.
    """

    def __init__(self, dpi: float) -> None:
        from matplotlib.figure import Figure

        self.dpi = dpi
        self._figure = Figure(figsize=(1, 1), dpi=dpi)
        self._ruler = _renderer(1, 1, dpi)

    def stamp(self, words: Words) -> Stamp:
        """Return a grey picture of words and where its upper left corner stands on the page."""
        text = self._alone(words)
        text.set_fontsize(self.points(words))
        box = text.get_window_extent(self._ruler)
        left, bottom = math.floor(box.x0) - _RIM, math.floor(box.y0) - _RIM
        width, height = math.ceil(box.x1) + _RIM - left, math.ceil(box.y1) + _RIM - bottom
        text.set_position((-left, -bottom))
        renderer = _renderer(width, height, self.dpi)
        text.draw(renderer)
        ink = np.asarray(renderer.buffer_rgba())[..., 3]
        return round(words.x) + left, round(words.y) - bottom - height, 255 - ink

    def points(self, words: Words) -> float:
        """Return the font size at which words fit into their room."""
        text, points = self._alone(words), words.points
        for _ in range(_TRIES):
            text.set_fontsize(points)
            box = text.get_window_extent(self._ruler)
            length = box.height if words.turned else box.width
            if length <= words.room:
                break
            points *= words.room / length
        return points

    def vector_page(
        self, width: int, height: int, page: Sequence[Piece], form: str, metadata: Mapping[str, Any]
    ) -> bytes:
        """Return a page as a PDF or SVG file in which every picture is a placeholder of one pixel.

        Parameters
        ----------
        width, height : int
            Size of the page in pixels.
        page : sequence of Piece
            What is painted, in order.
        form : {"pdf", "svg"}
            Kind of file.
        metadata : mapping
            As matplotlib's ``savefig`` takes it.
        """
        from matplotlib.figure import Figure
        from matplotlib.patches import Rectangle
        from matplotlib.transforms import Affine2D

        figure = Figure(figsize=(width / self.dpi, height / self.dpi), dpi=self.dpi)
        inches = Affine2D().scale(1 / self.dpi, -1 / self.dpi).translate(0, height / self.dpi)
        place = inches + figure.dpi_scale_trans
        for order, piece in enumerate(page):
            if isinstance(piece, Words):
                artist = self._text(piece, piece.x, piece.y, self.points(piece), place)
            elif isinstance(piece, Block):
                box = piece.box
                colour = tuple(part / 255 for part in piece.colour)
                artist = Rectangle((box.left, box.top), box.width, box.height, facecolor=colour, linewidth=0)
                artist.set_transform(place)
            else:
                artist = _placeholder(piece, place)
            artist.set_zorder(order)
            figure.add_artist(artist)
        buffer = io.BytesIO()
        figure.savefig(buffer, format=form, dpi=self.dpi, metadata=dict(metadata))
        return buffer.getvalue()

    def _alone(self, words: Words) -> Any:
        """Return words as matplotlib's text, anchored at the lower left corner of nothing else."""
        from matplotlib.transforms import IdentityTransform

        text = self._text(words, 0.0, 0.0, words.points, IdentityTransform())
        text.set_figure(self._figure)
        return text

    def _text(self, words: Words, x: float, y: float, points: float, place: Any) -> Any:
        from matplotlib.text import Text

        text = Text(
            x,
            y,
            words.text,
            fontsize=points,
            fontweight="bold" if words.bold else "normal",
            ha=words.align,
            va="baseline",
            rotation=90 if words.turned else 0,
            rotation_mode="anchor",
            transform=place,
        )
        return text


def _renderer(width: int, height: int, dpi: float) -> Any:
    from matplotlib.backends.backend_agg import RendererAgg

    return RendererAgg(width, height, dpi)


def _placeholder(piece: Picture, place: Any) -> Any:
    """Return an artist that draws one pixel over a picture's box."""
    from matplotlib.artist import Artist
    from matplotlib.transforms import Affine2D

    class Placeholder(Artist):
        """One pixel in the place of a picture."""

        def draw(self, renderer: Any) -> None:
            x0, y0 = place.transform((piece.box.left, piece.box.bottom))
            x1, y1 = place.transform((piece.box.right, piece.box.top))
            pixel: NDArray[np.uint8] = np.zeros((1, 1, 4), np.uint8)
            pixel[..., 3] = 255
            context = renderer.new_gc()
            renderer.draw_image(context, x0, y0, pixel, Affine2D().scale(x1 - x0, y1 - y0))
            context.restore()

    return Placeholder()
