"""What is asked of a page: plates, insets and figures, and which of their panels carry labels."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from atlas.config.jobs import Figure, Plate
from atlas.figure.boxes import TICK_FONT
from atlas.figure.lettering import MM_PER_POINT, text_width
from atlas.reading.sheet import Inset
from tiles.errors import Refusal
from tiles.window import Axis, View

HINTED = 1.08  # type fitted to pixels may be a little wider than its font says


class LayoutRefused(Refusal):
    """A size, an inset or a set of panels that cannot be laid out."""


@dataclass(frozen=True)
class PlateRequest:
    """What the layout needs to know of one plate, or of one panel of a figure.

    Attributes
    ----------
    name : str
        Name in messages, and of the panel.
    view : View
        The two axes.
    width, height : int
        Size of the whole page in pixels; not used for the panels of a figure.
    dpi : float
        Pixels an inch.
    font_size : float, optional
        In points; by default chosen from the width, see :func:`default_font_size`.
    has_key : bool
        Whether a colour key stands to the right.
    letter : str, optional
        Panel letter, set bold at the upper left.
    title : str
        Above the frame; may be empty.
    inset : Inset, optional
        A magnified window.
    legend_width : float
        Where a legend stands to the right, the width of its longest label in font sizes, see
        :func:`legend_width`; else 0. A panel with a legend has no colour key.
    """

    name: str
    view: View
    width: int = 0
    height: int = 0
    dpi: float = 300.0
    font_size: float | None = None
    has_key: bool = False
    letter: str | None = None
    title: str = ""
    inset: Inset | None = None
    legend_width: float = 0.0


@dataclass(frozen=True)
class FigureRequest:
    """Plates set as rows of panels on one page.

    Attributes
    ----------
    name : str
        Name in messages.
    rows : tuple of tuple of PlateRequest
        From the top row to the bottom row, each from left to right.
    width, height : int
        Size of the whole page in pixels.
    dpi : float
        Pixels an inch.
    font_size : float, optional
        In points.
    share : frozenset of {"across", "up"}
        Axes whose labels stand only at the outer panels.
    letters : bool
        Whether panels without a letter of their own get a, b, c and so on.
    title : str
        Above all panels; may be empty.
    """

    name: str
    rows: tuple[tuple[PlateRequest, ...], ...]
    width: int
    height: int
    dpi: float = 300.0
    font_size: float | None = None
    share: frozenset[str] = frozenset()
    letters: bool = True
    title: str = ""


def request_of(record: Plate | Figure) -> PlateRequest | FigureRequest:
    """Return what the layout needs to know of a plate or a figure of a config."""
    if isinstance(record, Plate):
        return _plate_request(record)
    width, height = record.pixels
    return FigureRequest(
        record.name,
        tuple(tuple(_plate_request(record.plates[name]) for name in row) for row in record.panels),
        width,
        height,
        record.dpi,
        record.font_size,
        frozenset(record.share),
        record.letters,
        record.title or "",
    )


def _plate_request(plate: Plate) -> PlateRequest:
    width, height = plate.pixels
    return PlateRequest(
        plate.name,
        plate.view,
        width,
        height,
        plate.dpi,
        plate.font_size,
        plate.key,
        plate.letter,
        plate.title or "",
        plate.inset,
        legend_width(legend_labels(plate)),
    )


def legend_labels(plate: Plate) -> tuple[str, ...]:
    """Return the longest labels that the legend of a plate may have; none where it has no legend."""
    if plate.follow == "both":
        return ("upward", "downward")
    if plate.by_attractor:
        return ("attractor 10", "others")
    if plate.draw == "basin":
        return ("10: quasi-periodic", f"10: period {plate.longest_period}")
    if plate.draw == "attractors":
        return ("10 attractors",)
    if plate.draw in ("fate", "period"):
        return ("quasi-periodic", f"period {plate.longest_period}")
    return ()


def legend_width(labels: Iterable[str]) -> float:
    """Return the width of the longest of some labels of a legend, in font sizes."""
    widths = (text_width(label, 1.0) / MM_PER_POINT for label in labels)
    return TICK_FONT * HINTED * max(widths, default=0.0)


@dataclass(frozen=True)
class Panel:
    """A plate in its place on the page: its letter, and whether its axes are labelled."""

    plate: PlateRequest
    letter: str
    across_labels: bool
    up_labels: bool


def panels_of_figure(figure: FigureRequest) -> list[list[Panel]]:
    """Return the rows of panels with their letters, and which of them carry labels.

    Raises
    ------
    LayoutRefused
        When a row is empty, or panels that should share an axis have different ones.
    """
    if not figure.rows or not all(figure.rows):
        raise LayoutRefused(f"figure '{figure.name}' has a row without panels; name at least one plate a row")
    aligned = len({len(row) for row in figure.rows}) == 1
    letters = iter(_letters())
    rows = []
    for i, row in enumerate(figure.rows):
        made = []
        for j, plate in enumerate(row):
            below = figure.rows[i + 1][j] if aligned and i + 1 < len(figure.rows) else None
            before = row[j - 1] if j else None
            across = "across" not in figure.share or below is None
            up = "up" not in figure.share or before is None
            if not across and below is not None:
                _check_shared(figure, "across", plate.view.across, below.view.across)
            if not up and before is not None:
                _check_shared(figure, "up", before.view.up, plate.view.up)
            letter = plate.letter or (next(letters) if figure.letters else "")
            made.append(Panel(plate, letter, across, up))
        rows.append(made)
    return rows


def _letters() -> list[str]:
    alphabet = "abcdefghijklmnopqrstuvwxyz"
    return [*alphabet, *(first + second for first in alphabet for second in alphabet)]


def _check_shared(figure: FigureRequest, along: str, one: Axis, other: Axis) -> None:
    if one != other:
        raise LayoutRefused(
            f"figure '{figure.name}': panels that share the axis {along} must have the same one, not "
            f"{one.name} from {one.low} to {one.high} and {other.name} from {other.low} to {other.high}"
        )
