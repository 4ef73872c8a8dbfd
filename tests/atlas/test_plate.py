"""Plates as a print shop checks them: sizes, resolution, fonts, every pixel, the same bytes every time."""

from __future__ import annotations

import base64
import io
import itertools
import os
import re
import subprocess
import sys
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from atlas.figure.boxes import Box, Spacing
from atlas.figure.drawing import GREY_MARK, MARK, pieces
from atlas.figure.layout import FigureRequest, PlateRequest
from atlas.figure.legends import class_legend, fitted, legend_pieces
from atlas.figure.pieces import BLACK, Block, Words
from atlas.figure.plate import Raster, draw, files
from atlas.figure.typeset import LetteringRefused, Typesetter, settings
from atlas.output.certificate_reader import read
from atlas.reading.sheet import Inset
from tests.atlas.plates import (
    LEGEND,
    LEGEND_WIDTH,
    RECORD,
    VIEW,
    filled,
    made,
    mixed_raster,
    opened,
    pdf_images,
    pdf_objects,
    request,
)
from tiles.classes import class_shades, class_table
from tiles.errors import OutputFailed, Refusal
from tiles.shading import LEVELS, colour_table
from tiles.values import fit_values, value_key_labels
from tiles.window import View

ALL = ("png", "tiff", "pdf", "svg")
DEEP = View(across=("r", "3.569945671", "3.569945672"), up=("x", "0.892486411", "0.892486412"))
LOG = View(
    across={"name": "r", "low": "0.01", "high": 100, "scale": "log"},
    up={"name": "x", "low": "1e-9", "high": 1, "scale": "log"},
)
PART = View(across=("r", "3.82", "3.87"), up=("x", "0.44", "0.56"))
INSET = Inset(PART.across, PART.up, "upper left", 0.4)
FOUR = tuple(tuple(PlateRequest(name, VIEW) for name in row) for row in ("ab", "cd"))


# Artwork sizes that journals ask for: columns of 90 and 190 mm at 300, 500 and 1000 dpi.
@pytest.mark.parametrize(
    ("width", "height", "dpi"),
    [
        (1063, 400, 300),
        (1772, 600, 500),
        (3543, 800, 1000),
        (2244, 400, 300),
        (3740, 600, 500),
        (7480, 800, 1000),
        (4252, 2598, 600),
        (1200, 800, 96.5),
    ],
)
def test_png_and_tiff_have_the_size_and_say_the_resolution(width: int, height: int, dpi: float) -> None:
    from PIL import Image

    data = made(request(width, height, dpi), "png", "tiff")
    with Image.open(io.BytesIO(data["png"])) as png:
        assert (png.size, png.mode) == ((width, height), "P")
        assert png.info["dpi"] == pytest.approx((dpi, dpi), abs=0.02)
    with Image.open(io.BytesIO(data["tiff"])) as tiff:
        assert (tiff.size, tiff.mode, tiff.info["compression"]) == ((width, height), "RGB", "tiff_lzw")
        assert tiff.info["dpi"] == (dpi, dpi)


@pytest.mark.parametrize(("width", "height", "dpi"), [(1063, 709, 300), (4252, 2598, 600)])
def test_every_pixel_of_the_raster_is_in_every_file(width: int, height: int, dpi: float) -> None:
    page, rasters, texts = filled(request(width, height, dpi))
    panel, raster = page.panels[0], rasters["plate"]
    colours = raster.table[raster.indices]
    data = dict(files(page, rasters, texts, ALL, RECORD))
    for form in ("png", "tiff"):
        crop = opened(data[form])[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width]
        assert np.array_equal(crop, colours)
    (image,) = pdf_images(data["pdf"])
    assert np.array_equal(image, colours)
    (inside,) = re.findall(rb'"data:image/png;base64,([^"]+)"', data["svg"])
    assert np.array_equal(opened(base64.b64decode(inside)), colours)


@pytest.mark.parametrize(("width", "height"), [(320, 230), (241, 203)])
def test_every_mixed_pixel_is_in_every_file(width: int, height: int) -> None:
    from PIL import Image

    page, _, texts = filled(request(width, height, 72, legend_width=LEGEND_WIDTH))
    panel = page.panels[0]
    raster = mixed_raster(panel.width, panel.height)
    data = dict(files(page, {"plate": raster}, texts, ALL, RECORD))
    for form in ("png", "tiff"):
        with Image.open(io.BytesIO(data[form])) as image:
            assert (image.mode, image.size) == ("RGB", (width, height))
        crop = opened(data[form])[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width]
        assert np.array_equal(crop, raster.pixels)
    (image,) = pdf_images(data["pdf"])
    assert np.array_equal(image, raster.pixels)
    (inside,) = re.findall(rb'"data:image/png;base64,([^"]+)"', data["svg"])
    assert np.array_equal(opened(base64.b64decode(inside)), raster.pixels)
    assert dict(files(page, {"plate": raster}, texts, ALL, RECORD)) == data


def test_mixed_pixels_and_palettes_share_a_figure() -> None:
    asked = FigureRequest("f", FOUR, 500, 400, 90, 7.0)
    page, rasters, texts = filled(asked, "blue", "grey")
    second = page.panels[1]
    rasters["b"] = mixed_raster(second.width, second.height)
    data = dict(files(page, rasters, texts, ALL, RECORD))
    for panel, image in zip(page.panels, pdf_images(data["pdf"]), strict=True):
        raster, box = rasters[panel.name], panel.raster
        colours = raster.pixels if raster.table is None else raster.table[raster.indices]
        assert np.array_equal(image, colours)
        for form in ("png", "tiff"):
            assert np.array_equal(opened(data[form])[box.top : box.bottom, box.left : box.right], colours)


@pytest.mark.parametrize("grey", [False, True])
def test_unsettled_columns_of_mixed_pixels_are_marked(grey: bool) -> None:
    page, _, texts = filled(request(640, 400, 96))
    box, line = page.panels[0].raster, page.spacing.line
    pixels = mixed_raster(box.width, box.height).pixels
    assert pixels is not None
    pixels = np.repeat(pixels[..., :1], 3, axis=2) if grey else pixels
    raster = Raster(None, None, VIEW, np.arange(box.width) == 40, pixels)
    found = opened(dict(files(page, {"plate": raster}, texts, ("png",), RECORD))["png"])
    assert tuple(found[box.top - line - 1, box.left + 40]) == (GREY_MARK if grey else MARK)


def test_a_key_beside_mixed_pixels_has_the_table_that_comes_with_them() -> None:
    page, _, texts = filled(request(640, 400, 96, has_key=True))
    panel = page.panels[0]
    assert panel.key is not None
    table, pixels = colour_table("balance"), mixed_raster(panel.width, panel.height).pixels
    raster = Raster(None, table, VIEW, None, pixels)
    found = opened(dict(files(page, {"plate": raster}, texts, ("png",), RECORD))["png"])
    key = found[panel.key.top : panel.key.bottom, panel.key.left]
    assert [tuple(key[-1]), tuple(key[0])] == [tuple(table[1]), tuple(table[LEVELS])]
    without = Raster(None, None, VIEW, None, pixels)
    found = opened(dict(files(page, {"plate": without}, texts, ("png",), RECORD))["png"])
    assert (found[panel.key.top : panel.key.bottom, panel.key.left] == 255).all()


def test_the_ends_of_a_key_are_labelled() -> None:
    turns = value_key_labels(fit_values(np.zeros(0), kind="cyclic"))
    page, rasters, texts = filled(request(640, 400, 96, has_key=True))
    text = {"plate": replace(texts["plate"], key_labels=turns)}
    key = page.panels[0].key
    assert key is not None
    words = [piece for piece in pieces(page, rasters, text) if isinstance(piece, Words) and not piece.turned]
    assert [each.text for each in words if each.x > key.right] == [label for _, label in turns]


def test_a_raster_is_indices_with_a_table_or_pixels() -> None:
    indices, table, pixels = np.zeros((1, 1), np.uint8), colour_table("grey"), np.zeros((1, 1, 3), np.uint8)
    for one, two, three in (
        (None, None, None),
        (indices, None, None),
        (indices, table, pixels),
        (None, table, None),
    ):
        with pytest.raises(ValueError, match="either indices and their table or pixels"):
            Raster(one, two, VIEW, None, three)


def test_a_legend_shows_its_colours_beside_the_frame() -> None:
    page, rasters, texts = filled(request(1063, 709, 300, legend_width=LEGEND_WIDTH, has_key=True))
    panel = page.panels[0]
    assert panel.key is None
    assert panel.legend is not None
    pixels = opened(dict(files(page, rasters, texts, ("png",), RECORD))["png"])
    column = pixels[panel.legend.top : panel.legend.bottom, panel.legend.left + round(page.spacing.em / 2)]
    runs = [tuple(map(int, colour)) for colour, _ in itertools.groupby(map(tuple, column))]
    seen = [colour for colour in runs if colour not in ((0, 0, 0), (255, 255, 255))]
    drawn = [entry.colour for entry in fitted(LEGEND, 99)[:3] if not isinstance(entry, int)]
    assert seen[:3] == drawn
    assert seen[-2:] == [LEGEND[-3].colour, LEGEND[-2].colour]
    words = [piece.text for piece in pieces(page, rasters, texts) if isinstance(piece, Words)]
    (more,) = (text for text in words if text.startswith("and "))
    labels = {entry.label for entry in LEGEND}
    assert more == f"and {len(labels - set(words))} more"
    assert {"quasi-periodic", "chaotic", "escapes"} <= set(words)


def test_a_picture_of_classes_with_a_legend_is_a_palette_png() -> None:
    from PIL import Image

    page, _, texts = filled(request(640, 400, 96, legend_width=LEGEND_WIDTH))
    panel = page.panels[0]
    codes = np.random.default_rng(3).integers(1, 65, (panel.height, panel.width), np.uint16)
    for table in (class_table(), colour_table("kinds")):
        raster = Raster(class_shades(codes), table, VIEW)
        text = replace(texts["plate"], legend=class_legend(np.unique(codes), str))
        data = dict(files(page, {"plate": raster}, {"plate": text}, ("png",), RECORD))["png"]
        with Image.open(io.BytesIO(data)) as image:
            assert image.mode == "P"
        crop = opened(data)[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width]
        assert np.array_equal(crop, class_table()[class_shades(codes)])


def test_the_frame_stands_outside_the_raster() -> None:
    page, rasters, texts = filled(request())
    box, line = page.panels[0].raster, page.spacing.line
    pixels = opened(dict(files(page, rasters, texts, ("png",), RECORD))["png"])
    black = (pixels == 0).all(axis=2)
    assert black[box.top - line : box.top, box.left - line : box.right + line].all()
    assert black[box.bottom : box.bottom + line, box.left - line : box.right + line].all()
    assert black[box.top : box.bottom, box.left - line : box.left].all()
    assert black[box.top : box.bottom, box.right : box.right + line].all()
    ticks = black[box.bottom + line + page.spacing.minor, box.left - line : box.right + line]
    starts = np.flatnonzero(np.diff(ticks.astype(int), prepend=0) == 1)
    centres = starts - line + line / 2
    wanted = [at * box.width for at in page.panels[0].across_ticks.positions]
    assert np.abs(centres - wanted).max() <= line / 2 + 0.5


def test_pdf_pages_and_fonts() -> None:
    pdf = made(request(1772, 1181, 500, letter="a"), "pdf")["pdf"]
    objects = pdf_objects(pdf)
    box = re.search(rb"/MediaBox \[ 0 0 ([\d.]+) ([\d.]+) \]", pdf)
    assert box is not None
    assert [float(side) for side in box.groups()] == pytest.approx(
        [1772 / 500 * 72, 1181 / 500 * 72], abs=1e-6
    )
    fonts = {name for text in objects.values() for name in re.findall(rb"/FontName /\w+\+([\w-]+)", text)}
    assert fonts == {b"DejaVuSans", b"DejaVuSans-Oblique", b"DejaVuSans-Bold"}
    assert pdf.count(b"/FontFile2") >= 3
    assert b"/Subtype /Type3" not in pdf
    assert b"Date" not in pdf


def test_svg_needs_no_font() -> None:
    svg = made(request(), "svg")["svg"]
    root = ElementTree.fromstring(svg)
    names = {element.tag.rpartition("}")[2] for element in root.iter()}
    assert "path" in names
    assert not names & {"text", "tspan", "font"}
    assert b"font-family" not in svg
    sides = [float(root.attrib[key].removesuffix("pt")) for key in ("width", "height")]
    assert sides == pytest.approx([1063 / 300 * 72, 709 / 300 * 72], abs=1e-5)
    page = filled(request())[0].panels[0]
    (image,) = (element for element in root.iter() if element.tag.endswith("}image"))
    places = [float(image.attrib[key]) * 300 / 72 for key in ("x", "y", "width", "height")]
    assert places == pytest.approx([page.left, page.top, page.width, page.height], abs=1e-4)
    assert b"image-rendering" not in svg  # shown reduced, thin branches must not become dots


def test_equal_pages_are_byte_equal_whatever_matplotlib_is_told() -> None:
    import matplotlib

    asked = request(has_key=True, title="Größe", letter="b", inset=INSET)
    first = made(asked, *ALL)
    with matplotlib.rc_context(
        {"font.size": 31, "pdf.fonttype": 3, "svg.fonttype": "none", "text.color": "red"}
    ):
        before = dict(matplotlib.rcParams)
        second = made(asked, *ALL)
        assert dict(matplotlib.rcParams) == before
    assert [form for form in ALL if first[form] != second[form]] == []


def test_a_grey_plate_is_a_grey_tiff() -> None:
    from PIL import Image

    page, rasters, texts = filled(request(), "grey")
    marked = {"plate": replace(rasters["plate"], unsettled=np.ones(page.panels[0].width, bool))}
    data = dict(files(page, marked, texts, ("tiff",), RECORD))["tiff"]
    with Image.open(io.BytesIO(data)) as image:
        assert image.mode == "L"
    panel = page.panels[0]
    crop = opened(data)[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width]
    assert np.array_equal(crop, marked["plate"].table[marked["plate"].indices])


@pytest.mark.parametrize("form", ["png", "tiff"])
@pytest.mark.parametrize(
    "asked",
    [
        request(3543, 2362, 1000, title="Größe", letter="a", inset=INSET, has_key=True),
        request(1001, 703, 300),
        FigureRequest("f", FOUR, 1800, 1300, 300, 7.0),
    ],
    ids=["plate", "odd width", "figure"],
)
def test_ink_on_grey_is_one_bit_a_pixel(
    tmp_path: Path, asked: PlateRequest | FigureRequest, form: str
) -> None:
    from PIL import Image

    page, rasters, texts = filled(asked, "grey")
    table = colour_table("grey", shading="ink")
    assert {tuple(row) for row in table.tolist()} == {(0, 0, 0), (255, 255, 255)}
    rasters = {name: replace(raster, table=table) for name, raster in rasters.items()}
    first = page.panels[0]
    rasters[first.name] = replace(rasters[first.name], unsettled=np.arange(first.width) == 9)
    file = tmp_path / "made"
    file.write_bytes(dict(files(page, rasters, texts, (form,), RECORD))[form])
    assert read(file) == RECORD
    with Image.open(file) as image:
        assert (image.mode, image.size) == ("1", (asked.width, asked.height))
        assert {colour for _, colour in image.getcolors()} == {0, 255}
        assert image.info["dpi"] == pytest.approx((asked.dpi, asked.dpi), abs=0.0 if form == "tiff" else 0.02)
        assert image.info.get("compression") == ("tiff_lzw" if form == "tiff" else None)
        pixels = np.asarray(image.convert("RGB"))
    for panel in page.panels:
        box, name = (panel.inset.raster, f"{panel.name}/inset") if panel.inset else (panel.raster, panel.name)
        crop = pixels[box.top : box.bottom, box.left : box.right]
        assert np.array_equal(crop, table[rasters[name].indices])


def test_type_in_line_art_covers_what_it_covers_in_grey() -> None:
    page, rasters, texts = filled(request(1772, 1181, 500), "grey")
    grey = opened(dict(files(page, rasters, texts, ("png",), RECORD))["png"])[..., 0]
    ink = {"plate": replace(rasters["plate"], table=colour_table("grey", shading="ink"))}
    art = opened(dict(files(page, ink, texts, ("png",), RECORD))["png"])[..., 0]
    outside = np.ones(grey.shape, bool)
    panel = page.panels[0]
    outside[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width] = False
    assert len(np.unique(grey[outside])) > 10
    clear = outside & (np.abs(grey.astype(int) - 128) > 8)  # a palette holds fewer greys than 256
    assert np.array_equal(art[clear] == 0, grey[clear] < 128)


@pytest.mark.parametrize(
    ("palette", "colours"),
    [("blue", {}), ("grey", {"missing": "#f0f0f0"}), ("grey", {"background": "#eeeeee"})],
)
def test_ink_with_other_colours_is_no_line_art(palette: str, colours: dict[str, str]) -> None:
    from PIL import Image

    page, rasters, texts = filled(request(), palette)
    table = colour_table(palette, shading="ink", **colours)
    ink = {"plate": replace(rasters["plate"], table=table)}
    data = dict(files(page, ink, texts, ("png", "tiff"), RECORD))
    with Image.open(io.BytesIO(data["png"])) as png, Image.open(io.BytesIO(data["tiff"])) as tiff:
        assert (png.mode, tiff.mode) == ("P", "L" if palette == "grey" else "RGB")
    only = replace(ink["plate"], indices=np.full_like(ink["plate"].indices, LEVELS))
    data = dict(files(page, {"plate": only}, texts, ("png",), RECORD))
    with Image.open(io.BytesIO(data["png"])) as png:
        assert png.mode == ("1" if palette == "grey" else "P")  # what is not used does not count


@pytest.mark.parametrize(("palette", "colour"), [("blue", MARK), ("grey", GREY_MARK)])
def test_unsettled_columns_are_marked_above_and_below(palette: str, colour: tuple[int, int, int]) -> None:
    page, rasters, texts = filled(request(), palette)
    box, line = page.panels[0].raster, page.spacing.line
    flags = np.zeros(box.width, bool)
    flags[[0, 300, 301, 500, box.width - 1]] = True
    flags[600:640] = True
    rasters["plate"] = replace(rasters["plate"], unsettled=flags)
    pixels = opened(dict(files(page, rasters, texts, ("png",), RECORD))["png"])
    above = (pixels[box.top - line - 2] == colour).all(axis=1)[box.left : box.right]
    assert above[flags].all()
    far = np.convolve(flags, np.ones(11), "same") == 0
    assert not above[far].any()
    below = (pixels[box.bottom + line] == colour).all(axis=1)[box.left : box.right]
    assert below.sum() > above.sum() / 2
    outside = (pixels == colour).all(axis=2)
    assert not outside[:, : box.left].any()
    assert not outside[:, box.right :].any()


def test_two_palettes_in_one_figure_stay_exact() -> None:
    asked = FigureRequest("f", FOUR, 1800, 1300, 300, 7.0, frozenset({"across", "up"}), title="Four")
    page, rasters, texts = filled(asked, "blue", "grey")
    data = dict(files(page, rasters, texts, ALL, RECORD))
    for panel, image in zip(page.panels, pdf_images(data["pdf"]), strict=True):
        colours = rasters[panel.name].table[rasters[panel.name].indices]
        assert np.array_equal(image, colours)
        for form in ("png", "tiff"):
            box = panel.raster
            assert np.array_equal(opened(data[form])[box.top : box.bottom, box.left : box.right], colours)


def test_an_inset_is_exact_and_covers_nothing_but_its_own_ground() -> None:
    page, rasters, texts = filled(request(2126, 1299, 300, font_size=8.0, inset=INSET))
    pixels = opened(dict(files(page, rasters, texts, ("png",), RECORD))["png"])
    panel, inset = page.panels[0], page.panels[0].inset
    assert inset is not None
    drawn = rasters["plate/inset"]
    box = inset.raster
    assert np.array_equal(pixels[box.top : box.bottom, box.left : box.right], drawn.table[drawn.indices])
    main = rasters["plate"].table[rasters["plate"].indices]
    changed = (
        pixels[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width] != main
    ).any(axis=2)
    for covered, rim in ((box, 3 * page.spacing.line), (inset.window, 2 * page.spacing.line)):
        left, top = covered.left - panel.left - rim, covered.top - panel.top - rim
        changed[top : top + covered.height + 2 * rim, left : left + covered.width + 2 * rim] = False
    assert not changed.any()
    window = inset.window
    inside = np.s_[window.top : window.bottom, window.left : window.right]
    shifted = np.s_[
        window.top - panel.top : window.bottom - panel.top,
        window.left - panel.left : window.right - panel.left,
    ]
    assert np.array_equal(pixels[inside], main[shifted])


PAGES = [
    request(1004, 709, 300),
    request(600, 420, 300, font_size=6.0, letter="a", title="A narrow one", has_key=True),
    request(1200, 800, 72, font_size=8.0, letter="a", title="For a screen"),
    request(1063, 827, 300, view=DEEP, letter="c", title="Deep"),
    request(700, 500, 300, view=DEEP, has_key=True),
    request(2126, 1299, 300, view=LOG, font_size=9.0, has_key=True, title="Two log axes", inset=None),
    request(11811, 8268, 300, font_size=24.4, has_key=True, title="A poster", letter="a"),
    request(2126, 1299, 300, font_size=8.0, legend_width=LEGEND_WIDTH),
    request(640, 400, 96, font_size=8.0, title="For a screen", legend_width=LEGEND_WIDTH),
    request(600, 420, 300, font_size=6.0, view=DEEP, letter="a", legend_width=LEGEND_WIDTH),
    FigureRequest("f", FOUR, 2126, 1535, 300, 8.0, frozenset({"across", "up"}), title="Four"),
    FigureRequest(
        "f",
        tuple(tuple(replace(plate, legend_width=LEGEND_WIDTH) for plate in row) for row in FOUR),
        2126,
        1436,
        300,
        7.0,
    ),
    FigureRequest("f", (FOUR[0], FOUR[1][:1]), 1800, 1300, 300, 7.0),
    FigureRequest(
        "f",
        tuple(
            (replace(row[0], has_key=True, title="One", view=DEEP), replace(row[1], title="Two"))
            for row in FOUR
        ),
        2126,
        1535,
        300,
        7.0,
    ),
]


@pytest.mark.parametrize("asked", PAGES, ids=lambda asked: f"{asked.width}x{asked.height}")
def test_no_words_touch_others_or_leave_the_page(asked: PlateRequest | FigureRequest) -> None:
    page, rasters, texts = filled_without_pixels(asked)
    with settings():
        setter = Typesetter(page.dpi)
        found = []
        for piece in pieces(page, rasters, texts):
            if isinstance(piece, Words):
                left, top, grey = setter.stamp(piece)
                lines, columns = np.nonzero(grey < 255)
                found.append(
                    (
                        piece.text,
                        left + columns.min(),
                        top + lines.min(),
                        left + columns.max(),
                        top + lines.max(),
                    )
                )
                assert setter.points(piece) > 0.75 * piece.points, piece.text
    keys = [panel.key.grown(page.spacing.line) for panel in page.panels if panel.key]
    frames = [panel.raster.grown(page.spacing.line) for panel in page.panels]
    swatches = [
        box for panel in page.panels if panel.legend for box in swatches_of(panel.legend, page.spacing)
    ]
    boxes = [(str(box), box.left, box.top, box.right, box.bottom) for box in (*keys, *frames, *swatches)]
    assert len(found) > 8 * len(page.panels)
    for text, left, top, right, bottom in found:
        assert left >= 0, text
        assert top >= 0, text
        assert right < page.width, text
        assert bottom < page.height, text
    for one, other in itertools.combinations([*found, *boxes], 2):
        apart = one[3] < other[1] or other[3] < one[1] or one[4] < other[2] or other[4] < one[2]
        assert apart, (one, other)


def swatches_of(legend: Box, spacing: Spacing) -> list[Box]:
    """Return where the swatches of a full legend stand, with their frames."""
    drawn = legend_pieces(legend, LEGEND, spacing)
    return [
        piece.box.grown(spacing.line) for piece in drawn if isinstance(piece, Block) and piece.colour != BLACK
    ]


def filled_without_pixels(asked: PlateRequest | FigureRequest):  # type: ignore[no-untyped-def]
    """Return a filled page whose rasters take no memory."""
    from atlas.figure.layout import layout
    from tests.atlas import plates

    page = layout(asked)
    texts = filled(replace(asked, width=3000, height=2500, dpi=300, font_size=5.0))[2]
    rasters = {}
    for panel in page.panels:
        small = plates.raster(2, 2, panel.view)
        rasters[panel.name] = replace(
            small, indices=np.broadcast_to(np.uint8(1), (panel.height, panel.width))
        )
    return page, rasters, texts


def test_a_long_label_is_set_smaller_instead_of_leaving_the_page() -> None:
    with settings():
        setter = Typesetter(300)
        words = Words("a very long title " * 20, 500, 100, 8.0, 900)
        assert setter.points(words) < 2
        _, _, grey = setter.stamp(words)
        assert grey.shape[1] <= 900 + 6


def test_files_appear_whole_or_not_at_all(tmp_path: Path) -> None:
    page, rasters, texts = filled(request())
    out = tmp_path / "out"
    draw(page, rasters, texts, {"png": out / "p.png", "svg": out / "p.svg"}, RECORD)
    assert sorted(path.name for path in out.iterdir()) == ["p.png", "p.svg"]
    old = (out / "p.png").read_bytes()
    (out / ".parts").write_text("in the way")
    with pytest.raises(OutputFailed, match=r"p\.png' could not be written"):
        draw(page, rasters, texts, {"png": out / "p.png"}, RECORD)
    assert (out / "p.png").read_bytes() == old


def test_a_raster_of_another_size_is_an_error() -> None:
    page, rasters, texts = filled(request())
    rasters["plate"] = replace(rasters["plate"], indices=rasters["plate"].indices[1:])
    with pytest.raises(ValueError, match="its box is"):
        list(files(page, rasters, texts, ("png",), RECORD))


def test_characters_that_the_font_lacks_are_refused() -> None:
    page, rasters, texts = filled(request(title="日本"))
    with pytest.raises(LetteringRefused, match=r"U\+65E5"):
        list(files(page, rasters, texts, ("png",), RECORD))
    assert made(request(title="Größe, Ångström, Ωμέγα, Карта — π ≤ ∞, $5 and $6"), "png", "pdf")


def test_unknown_formats_are_refused() -> None:
    with pytest.raises(Refusal, match="did you mean 'tiff'"):
        made(request(), "tif")


def test_nothing_heavy_is_imported_before_something_is_drawn(tmp_path: Path) -> None:
    code = (
        "import sys, atlas.figure.plate; "
        "print(sorted({'matplotlib', 'PIL', 'datashader'} & set(sys.modules)))"
    )
    root = Path(__file__).parents[2]
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(root)},
    )
    assert done.stdout.strip() == "[]"
    assert done.stderr == ""
