"""Plates: shaded counts in a frame with ticks and words, as PNG, TIFF, PDF and SVG files from one run."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

from atlas.figure.axes_image import draw_axes
from atlas.figure.boxes import Layout
from atlas.figure.drawing import pieces
from atlas.figure.painting import paint
from atlas.figure.pieces import LegendEntry, PanelText, Picture, Piece, Raster, Words
from atlas.figure.raster_files import png, raster_png, tiff
from atlas.figure.typeset import Typesetter, check_characters, settings
from atlas.figure.vector_files import pdf_with_pictures, svg_with_pictures
from atlas.output.certificate import as_text
from atlas.output.whole_file import write_whole
from tiles.errors import Refusal, nearest

__all__ = ["FORMATS", "LegendEntry", "PanelText", "Raster", "draw", "draw_axes", "files"]

FORMATS = ("png", "tiff", "pdf", "svg")
MAKER = "iterated-map-atlas"


def draw(
    layout: Layout,
    rasters: Mapping[str, Raster],
    texts: Mapping[str, PanelText],
    out: Mapping[str, Path],
    record: Mapping[str, Any],
) -> None:
    """Draw a plate or a figure and write its files, each whole or not at all.

    Parameters
    ----------
    layout : Layout
        Where everything stands.
    rasters : mapping of str to Raster
        By panel name, and ``name/inset`` for insets; each of exactly the size of its box.
    texts : mapping of str to PanelText
        By panel name.
    out : mapping of {"png", "tiff", "pdf", "svg"} to Path
        The files to write.
    record : mapping
        The certificate that travels in every file.

    Raises
    ------
    LetteringRefused
        When a text holds a character that the font lacks.
    OutputFailed
        When a file cannot be written.
    """
    for form, data in files(layout, rasters, texts, tuple(out), record):
        write_whole(out[form], data)


def files(
    layout: Layout,
    rasters: Mapping[str, Raster],
    texts: Mapping[str, PanelText],
    formats: Sequence[str],
    record: Mapping[str, Any],
) -> Iterator[tuple[str, bytes]]:
    """Yield the files of a plate or a figure as (format, bytes), one at a time.

    Parameters
    ----------
    layout, rasters, texts, record
        As for :func:`draw`.
    formats : sequence of {"png", "tiff", "pdf", "svg"}
        Which files.
    """
    for form in formats:
        if form not in FORMATS:
            raise Refusal(f"'{form}' is no file format of plates{nearest(form, FORMATS)}")
    page = pieces(layout, rasters, texts)
    check_characters([piece.text for piece in page if isinstance(piece, Words)])
    text = as_text(record)
    with settings():
        setter = Typesetter(layout.dpi)
        if "png" in formats or "tiff" in formats:
            painted = paint(layout.width, layout.height, page, setter.stamp)
            if "png" in formats:
                yield "png", png(painted, layout.dpi, text)
            if "tiff" in formats:
                yield "tiff", tiff(painted, layout.dpi, text)
            del painted
        if "pdf" in formats or "svg" in formats:
            yield from _vector_files(layout, page, setter, formats, text)


def _vector_files(
    layout: Layout, page: list[Piece], setter: Typesetter, formats: Sequence[str], text: str
) -> Iterator[tuple[str, bytes]]:
    pictures = [
        (piece.box, raster_png(piece.pixels, piece.table)) for piece in page if isinstance(piece, Picture)
    ]
    title = layout.title or layout.panels[0].title or layout.panels[0].name
    if "pdf" in formats:
        facts = {"Title": title, "Creator": MAKER, "Keywords": text, "CreationDate": None}
        pdf = setter.vector_page(layout.width, layout.height, page, "pdf", facts)
        yield "pdf", pdf_with_pictures(pdf, [data for _, data in pictures])
    if "svg" in formats:
        facts = {"Title": title, "Creator": MAKER, "Description": text, "Date": None}
        svg = setter.vector_page(layout.width, layout.height, page, "svg", facts)
        yield "svg", svg_with_pictures(svg, pictures, layout.dpi)
