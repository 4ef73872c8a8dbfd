"""Pictures put into PDF and SVG files in place of one-pixel placeholders, palette and pixels unchanged."""

from __future__ import annotations

import base64
import re
import struct
from collections.abc import Iterator, Sequence

from atlas.figure.boxes import Box


def png_chunks(png: bytes) -> Iterator[tuple[bytes, bytes]]:
    """Yield the chunks of a PNG file as (type, data), in order."""
    start = 8
    while start + 8 <= len(png):
        length, kind = struct.unpack_from(">I4s", png, start)
        yield kind, png[start + 8 : start + 8 + length]
        start += 12 + length


def pdf_with_pictures(pdf: bytes, pictures: Sequence[bytes]) -> bytes:
    """Return a PDF file whose images, in the order of their objects, are replaced.

    Parameters
    ----------
    pdf : bytes
        A file with a plain cross-reference table and one image object a picture.
    pictures : sequence of bytes
        PNG files, with a palette or RGB; their compressed pixels are taken over as they are.

    Raises
    ------
    ValueError
        When the file has another number of images.
    """
    table = int(re.findall(rb"startxref\s+(\d+)", pdf)[-1])
    head = re.compile(rb"xref\s+0 (\d+)\s+").match(pdf, table)
    if head is None:
        raise ValueError("the PDF file has no plain cross-reference table")
    count = int(head[1])
    rows = [pdf[head.end() + 20 * n : head.end() + 20 * (n + 1)] for n in range(count)]
    offsets = {n: int(row[:10]) for n, row in enumerate(rows) if row[17:18] == b"n"}
    starts = sorted(offsets.values())
    ends = dict(zip(starts, [*starts[1:], table], strict=True))
    objects = {n: pdf[start : ends[start]] for n, start in offsets.items()}
    images = sorted(n for n, text in objects.items() if b"/Subtype /Image" in text.split(b"stream", 1)[0])
    if len(images) != len(pictures):
        raise ValueError(f"the PDF file has {len(images)} images, not {len(pictures)}")
    for number, picture in zip(images, pictures, strict=True):
        objects[number] = _pdf_image(number, picture)
    out, place, new = [pdf[: starts[0]]], starts[0], dict(enumerate(rows))
    for number in sorted(objects, key=offsets.__getitem__):
        new[number] = b"%010d 00000 n \n" % place
        out.append(objects[number])
        place += len(objects[number])
    trailer = pdf[head.end() + 20 * count :].split(b"startxref", 1)[0]
    out += [head[0], *(new[n] for n in range(count)), trailer, b"startxref\n%d\n%%%%EOF\n" % place]
    return b"".join(out)


def _pdf_image(number: int, png: bytes) -> bytes:
    """Return an image object: PNG's palette, predictors and compressed pixels are PDF's too (ISO 32000)."""
    found: dict[bytes, bytes] = {}
    for kind, data in png_chunks(png):
        found[kind] = found.get(kind, b"") + data
    width, height, depth = struct.unpack_from(">IIB", found[b"IHDR"])
    palette = found.get(b"PLTE")
    space, colours = b"/DeviceRGB", 3
    if palette is not None:
        space = b"[ /Indexed /DeviceRGB %d <%s> ]" % (len(palette) // 3 - 1, palette.hex().encode())
        colours = 1
    return b"".join(
        [
            b"%d 0 obj\n<< /Type /XObject /Subtype /Image /Width %d /Height %d " % (number, width, height),
            b"/ColorSpace %s " % space,
            b"/BitsPerComponent %d /Filter /FlateDecode " % depth,
            b"/DecodeParms << /Predictor 15 /Colors %d " % colours,
            b"/BitsPerComponent %d /Columns %d >> /Length %d >>\nstream\n"
            % (depth, width, len(found[b"IDAT"])),
            found[b"IDAT"],
            b"\nendstream\nendobj\n",
        ]
    )


def svg_with_pictures(svg: bytes, pictures: Sequence[tuple[Box, bytes]], dpi: float) -> bytes:
    """Return an SVG file whose images, in painting order, are replaced.

    Parameters
    ----------
    svg : bytes
        A file in points, with one image element a picture.
    pictures : sequence of (Box, bytes)
        Where each stands in pixels of the page, and its PNG file.
    dpi : float
        Pixels an inch.

    Raises
    ------
    ValueError
        When the file has another number of images.
    """
    parts = re.split(rb"<image\b[^>]*/>", svg)
    if len(parts) != len(pictures) + 1:
        raise ValueError(f"the SVG file has {len(parts) - 1} images, not {len(pictures)}")
    out = [parts[0]]
    for (box, png), rest in zip(pictures, parts[1:], strict=True):
        sides = zip(("x", "y", "width", "height"), (box.left, box.top, box.width, box.height), strict=True)
        places = " ".join(f'{name}="{length * 72 / dpi:.6f}"' for name, length in sides)
        out += [
            f'<image {places} preserveAspectRatio="none" '.encode(),
            b'xlink:href="data:image/png;base64,',
            base64.b64encode(png),
            b'"/>',
            rest,
        ]
    return b"".join(out)
