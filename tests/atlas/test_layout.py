"""Layouts: whole pixels, nothing outside the page, no panel over another, and refusals that say what fits."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.config.load import parse_config
from atlas.figure.boxes import Box
from atlas.figure.layout import (
    FigureRequest,
    Layout,
    LayoutRefused,
    PlateRequest,
    default_font_size,
    layout,
)
from atlas.figure.panels import request_of
from atlas.reading.sheet import Inset, Size
from tiles.window import View

VIEW = View(across=("r", "2.8", 4), up=("x", 0, 1))
DEEP = View(across=("r", "3.569945671", "3.569945672"), up=("x", "0.89248", "0.89249"))
LOG = View(across={"name": "r", "low": "0.01", "high": 100, "scale": "log"}, up=("x", "-1e-9", "2e-9"))


def contains(outer: Box, inner: Box) -> bool:
    return (
        outer.left <= inner.left
        and outer.top <= inner.top
        and inner.right <= outer.right
        and inner.bottom <= outer.bottom
    )


def overlap(one: Box, other: Box) -> bool:
    return (
        one.left < other.right
        and other.left < one.right
        and one.top < other.bottom
        and other.top < one.bottom
    )


def laid_out(request: PlateRequest | FigureRequest) -> Layout | None:
    """Return the layout, or None where the page is refused for want of room and for nothing else."""
    try:
        return layout(request)
    except LayoutRefused as problem:
        refusal = str(problem)
    assert "leaves no room" in refusal
    return None


def rows(*names: str, views: tuple[View, ...] = (VIEW,)) -> tuple[tuple[PlateRequest, ...], ...]:
    view = itertools.cycle(views)
    return tuple(tuple(PlateRequest(name, next(view)) for name in row) for row in names)


def test_the_page_is_the_size_asked_for() -> None:
    width, height = Size.parse("180x110").pixels(600)
    page = layout(PlateRequest("growth", VIEW, width, height, 600, 8.0))
    assert (page.width, page.height) == (4252, 2598)
    panel = page.panels[0]
    assert panel.width > 0.9 * page.width
    assert panel.height > 0.85 * page.height
    assert panel.area == Box(0, 0, 4252, 2598)


@settings(deadline=None)
@given(
    width=st.integers(200, 20000),
    height=st.integers(150, 20000),
    dpi=st.sampled_from([72, 100, 300, 600, 1000]),
    font=st.sampled_from([None, 6.0, 8.0, 14.0]),
    view=st.sampled_from([VIEW, DEEP, LOG]),
    key=st.booleans(),
    legend=st.sampled_from([0.0, 3.0, 7.5]),
    letter=st.sampled_from(["", "a"]),
    title=st.sampled_from(["", "Title"]),
)
def test_a_plate_fits_its_page_or_is_refused(
    width: int,
    height: int,
    dpi: int,
    font: float | None,
    view: View,
    key: bool,
    legend: float,
    letter: str,
    title: str,
) -> None:
    request = PlateRequest("p", view, width, height, dpi, font, key, letter, title, legend_width=legend)
    page = laid_out(request)
    if page is None:
        return
    panel = page.panels[0]
    assert contains(Box(0, 0, width, height), panel.raster.grown(page.spacing.line + page.spacing.tick))
    assert min(panel.width, panel.height) >= 3 * page.spacing.em - 1
    assert all(isinstance(side, int) for side in (panel.left, panel.top, panel.width, panel.height))
    assert (panel.legend is not None) == (legend > 0)
    assert (panel.key is not None) == (key and not legend)
    if panel.legend is not None:
        assert contains(panel.area, panel.legend)
        assert not overlap(panel.legend, panel.raster.grown(page.spacing.line))
        assert panel.legend.width >= page.spacing.ems(legend)
        assert (panel.legend.top, panel.legend.height) == (panel.top, panel.height)
    if panel.key is not None:
        assert contains(panel.area, panel.key.grown(page.spacing.line))
        assert not overlap(panel.key.grown(page.spacing.line), panel.raster.grown(page.spacing.line))
    assert layout(request) == page


@settings(deadline=None, max_examples=50)
@given(
    count=st.lists(st.integers(1, 4), min_size=1, max_size=4),
    width=st.integers(1000, 8000),
    height=st.integers(1000, 8000),
    share=st.sets(st.sampled_from(["across", "up"])),
)
def test_panels_are_equal_and_apart(count: list[int], width: int, height: int, share: set[str]) -> None:
    names = [[f"{i}{j}" for j in range(n)] for i, n in enumerate(count)]
    request = FigureRequest(
        "f",
        tuple(tuple(PlateRequest(name, VIEW) for name in row) for row in names),
        width,
        height,
        300,
        8.0,
        frozenset(share),
        title="All",
    )
    page = laid_out(request)
    if page is None:
        return
    assert [panel.name for panel in page.panels] == [name for row in names for name in row]
    for one, other in itertools.combinations(page.panels, 2):
        assert not overlap(one.area, other.area)
    whole = Box(0, 0, width, height)
    rim = page.spacing.line + page.spacing.tick
    assert all(contains(whole, p.area) and contains(p.area, p.raster.grown(rim)) for p in page.panels)
    assert len({p.height for p in page.panels}) == 1
    for row in names:
        assert len({(p.width, p.top) for p in page.panels if p.name in row}) == 1
    if len(set(count)) == 1:
        assert len({p.width for p in page.panels}) == 1
        assert len({p.left for p in page.panels}) == count[0]


def test_shared_axes_are_labelled_at_the_outer_panels_only() -> None:
    shared = FigureRequest("f", rows("ab", "cd"), 2126, 1535, 300, 8.0, frozenset({"across", "up"}))
    page = layout(shared)
    assert [(p.show_across_labels, p.show_up_labels) for p in page.panels] == [
        (False, True),
        (False, False),
        (True, True),
        (True, False),
    ]
    own = layout(FigureRequest("f", rows("ab", "cd"), 2126, 1535, 300, 8.0))
    assert all(p.show_across_labels and p.show_up_labels for p in own.panels)
    assert page.panels[0].width > own.panels[0].width
    assert page.panels[0].height > own.panels[0].height


def test_letters_run_in_reading_order_and_own_letters_stand() -> None:
    two = (PlateRequest("p", VIEW), PlateRequest("q", VIEW, letter="x"), PlateRequest("s", VIEW))
    page = layout(FigureRequest("f", (two,), 3000, 900, 300, 8.0))
    assert [p.letter for p in page.panels] == ["a", "x", "b"]
    page = layout(FigureRequest("f", (two,), 3000, 900, 300, 8.0, letters=False))
    assert [p.letter for p in page.panels] == ["", "x", ""]


def test_different_axes_cannot_be_shared() -> None:
    request = FigureRequest("f", rows("ab", views=(VIEW, DEEP)), 2126, 1000, 300, 8.0, frozenset({"up"}))
    with pytest.raises(LayoutRefused, match="figure 'f': panels that share the axis up must have the same"):
        layout(request)


def test_a_row_without_panels_is_refused() -> None:
    with pytest.raises(LayoutRefused, match="row without panels"):
        layout(FigureRequest("f", ((),), 2126, 1000))


def test_a_size_without_room_names_one_that_has() -> None:
    width, height = Size.parse("10x5").pixels(300)
    with pytest.raises(
        LayoutRefused, match=r"plate 'p': a size of 10x5 mm .* leaves no room .* at least \d+ mm"
    ):
        layout(PlateRequest("p", VIEW, width, height, 300, 8.0))
    width, height = Size.parse("10x60").pixels(300)
    with pytest.raises(LayoutRefused, match=r"make its width at least (\d+) mm") as caught:
        layout(PlateRequest("p", VIEW, width, height, 300, 8.0))
    enough = math.ceil(1.15 * int(str(caught.value).split("width at least ")[1].split(" ")[0]))
    layout(PlateRequest("p", VIEW, *Size.parse(f"{enough}x60").pixels(300), 300, 8.0))


@pytest.mark.parametrize("corner", ["upper left", "upper right", "lower left", "lower right"])
def test_an_inset_covers_whole_pixels_of_its_window(corner: str) -> None:
    part = View(across=("r", "3.82", "3.87"), up=("x", "0.44", "0.56"))
    inset = Inset(part.across, part.up, corner, 0.35)  # type: ignore[arg-type]
    page = layout(PlateRequest("p", VIEW, 2126, 1299, 300, 8.0, inset=inset))
    panel, found = page.panels[0], page.panels[0].inset
    assert found is not None
    assert found.view == part
    assert contains(panel.raster, found.raster.grown(page.spacing.line))
    assert found.raster.width == round(0.35 * panel.width)
    assert ("left" in corner) == (found.raster.left - panel.left < panel.raster.right - found.raster.right)
    assert ("upper" in corner) == (found.raster.top - panel.top < panel.raster.bottom - found.raster.bottom)
    for low, high, first, last, start, cells, drawn in (
        (
            Fraction("3.82"),
            Fraction("3.87"),
            found.window.left,
            found.window.right,
            panel.left,
            panel.width,
            VIEW.across,
        ),
        (
            Fraction("0.44"),
            Fraction("0.56"),
            panel.raster.bottom + panel.top - found.window.bottom,
            panel.raster.bottom + panel.top - found.window.top,
            panel.top,
            panel.height,
            VIEW.up,
        ),
    ):
        cell = (drawn.high.value - drawn.low.value) / cells
        edges = [drawn.low.value + (edge - start) * cell for edge in (first, last)]
        assert low - cell < edges[0] <= low
        assert high <= edges[1] < high + cell


def test_insets_outside_their_plate_or_too_small_are_refused() -> None:
    outside = View(across=("r", "3.9", "4.1"), up=("x", 0, 1))
    with pytest.raises(LayoutRefused, match=r"not inside the plate's r from 2\.8 to 4"):
        layout(PlateRequest("p", VIEW, 2126, 1299, inset=Inset(outside.across, outside.up)))
    with pytest.raises(LayoutRefused, match="does not fit"):
        layout(PlateRequest("p", VIEW, 2126, 1299, inset=Inset(VIEW.across, VIEW.up, width=0.001)))
    bad = Inset(VIEW.across, VIEW.up, "uper left")  # type: ignore[arg-type]
    with pytest.raises(LayoutRefused, match="did you mean 'upper left'"):
        layout(PlateRequest("p", VIEW, 2126, 1299, inset=bad))


def test_font_sizes_grow_with_the_page() -> None:
    sizes = [default_font_size(width) for width in (20, 85, 180, 420, 1000, 5000)]
    assert sizes == sorted(sizes)
    assert sizes[1:3] == [7.0, 8.0]
    assert 18 < sizes[4] < 30


def test_only_what_is_coloured_by_kind_has_a_legend() -> None:
    head = "{family: henon, size: 180x110, dpi: 300, longest_period: 4096, "
    states, plane, both = (
        "across: [x, -1, 1], up: [y, -1, 1]",
        "across: [a, 0, 1], up: [b, 0, 1]",
        "across: [a, 0, 1], up: [x, -1, 1]",
    )
    config = parse_config(
        f"""
        plates:
          fate: {head} {plane}, draw: fate}}
          period: {head} {plane}, draw: period}}
          attractors: {head} {plane}, draw: attractors}}
          basin: {head} {states}, draw: basin}}
          follow: {head} {both}, follow: both}}
          split: {head} {both}, by_attractor: true}}
          lyapunov: {head} {plane}, draw: lyapunov}}
          escape: {head} {plane}, draw: escape}}
          portrait: {head} {states}}}
          histogram: {head} {both}}}
        """,
        "test",
    )
    widths = {}
    for name, plate in config.plates.items():
        asked = request_of(plate)
        assert isinstance(asked, PlateRequest)
        widths[name] = asked.legend_width
        assert (layout(asked).panels[0].legend is not None) == (asked.legend_width > 0)
    assert [name for name, width in widths.items() if width == 0] == [
        "lyapunov",
        "escape",
        "portrait",
        "histogram",
    ]
    assert widths["basin"] > widths["fate"] > widths["follow"] > 3


def test_requests_come_from_a_config() -> None:
    config = parse_config(
        """
        plates:
          one: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1], size: 90x60, dpi: 500, key: true,
                title: A plate, inset: {across: [r, 3.8, 3.9], up: [x, 0.4, 0.6], corner: lower left}}
          two: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1]}
        figures:
          both: {panels: [[one], [two]], share: [across], size: 180x200, dpi: 300, title: Both}
        """,
        "test",
    )
    plate = request_of(config.plates["one"])
    assert isinstance(plate, PlateRequest)
    assert (plate.width, plate.height, plate.dpi, plate.has_key) == (1772, 1181, 500, True)
    assert plate.title == "A plate"
    page = layout(plate)
    assert page.panels[0].inset is not None
    figure = layout(request_of(config.figures["both"]))
    assert [p.name for p in figure.panels] == ["one", "two"]
    assert [p.letter for p in figure.panels] == ["a", "b"]
    assert figure.title == "Both"
