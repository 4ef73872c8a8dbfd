"""Pages of planes: pictures of classes and values, legend, layers, and the words under the pointer."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
import yaml
from numpy.typing import NDArray

from tests.browser.conftest import Open
from tests.browser.opened import Opened
from tests.browser.synthetic_site import SyntheticSite
from tests.tiles.planes import HEADER, VIEW, Plane
from tiles.classes import class_colours
from tiles.grid import TILE
from tiles.plane_build import build_planes
from tiles.plane_meta import class_name
from tiles.shading import colour_table
from tiles.site import build_site
from tiles.values import fit_values, shade_values

pytestmark = pytest.mark.browser
LEVELS = (2, 2)
SIZES = [(360, 640), (390, 844), (740, 360), (900, 640), (1280, 800)]
NAMES = {**HEADER["class_names"], "60000": "unsettled"}
PLATE = {"family": "forced_logistic", "draw": "fate", "palette": "kinds", "steps": "500"}
Made = tuple[Plane, Path]


@pytest.fixture(scope="module")
def planes(tmp_path_factory: pytest.TempPathFactory) -> Made:
    """A plane with classes and two layers of values, and the folder of its site."""
    plane, folder = Plane(*LEVELS), tmp_path_factory.mktemp("planes")
    build_planes(
        folder / "index.sqlite",
        VIEW,
        across_level=LEVELS[0],
        up_level=LEVELS[1],
        pairs="diagonal",
        source=plane.source,
        header={**HEADER, "class_names": NAMES, "plate": PLATE},
    )
    build_site(folder / "index.sqlite", folder / "site")
    return plane, folder / "site"


def pictured(plane: Plane, pair: tuple[int, int], layer: str) -> NDArray[np.uint8]:
    """Return the colours of a level pair, shape (columns, rows, 3)."""
    if layer == "fate":
        colours = np.zeros((1 << 16, 3), np.uint8)
        present = np.unique(plane.classes).tolist()
        colours[present] = class_colours(present)
        return colours[plane.majority(pair)]
    kind, palette = {"lyapunov": ("diverging", "balance"), "rotation": ("cyclic", "wheel")}[layer]
    fit = fit_values(plane.means((1, 1), layer), kind=kind)
    return colour_table(palette)[shade_values(plane.means(pair, layer), fit)]


def window(opened: Opened) -> tuple[slice, slice]:
    """Return the columns and rows that an exact view inside the ends of the axes shows."""
    found = []
    for name, side in (("across", "width"), ("up", "height")):
        axis = opened.axis(name)
        first = axis["start"] / axis["pixel"]
        assert first.denominator == 1
        found.append(slice(int(first), int(first) + opened.call("plot")[side]))
    return found[0], found[1]


@pytest.mark.parametrize("ratio", [1, 1.25, 2])
@pytest.mark.parametrize("layer", ["fate", "lyapunov", "rotation"])
def test_a_screenshot_shows_the_layer(planes: Made, open_page: Open, ratio: float, layer: str) -> None:
    plane, folder = planes
    link = f"#across=2,0.8&up=2,0.8&layer={layer}"
    opened = open_page(folder, size=(500, 600), ratio=ratio, hash=link).settle()
    assert opened.call("layer") == layer
    columns, rows = window(opened)
    assert columns.start >= 0
    assert columns.stop <= 1024
    wanted = pictured(plane, LEVELS, layer)[columns, rows]
    np.testing.assert_array_equal(opened.plot(), wanted.transpose(1, 0, 2)[::-1])


@pytest.mark.parametrize("ratio", [1, 1.25])
def test_colours_of_classes_never_mix(planes: Made, open_page: Open, ratio: float) -> None:
    plane, folder = planes
    opened = open_page(folder, size=(600, 600), ratio=ratio)
    known = {*map(tuple, class_colours(np.unique(plane.classes).tolist()))}
    kinds = set()
    for across, up in [("1.75", "1.5"), ("1.703125", "1.703125"), ("2.34375", "3"), ("1.5", "2")]:
        opened.go(f"{across},0.8", f"{up},0.8")
        kinds.add(opened.call("shown")["kind"])
        assert {*map(tuple, np.unique(opened.plot()[2:-2, 2:-2].reshape(-1, 3), axis=0))} <= known
    assert kinds == {"shrunk", "stretched"}


def test_the_legend_names_the_classes(planes: Made, open_page: Open) -> None:
    plane, folder = planes
    page = open_page(folder).settle().page
    entries = page.locator("#legend li").all()
    own = [1, 60000, 60002, 60003]
    numbers = own + sorted({*np.unique(plane.classes).tolist()} - {*own})
    assert [entry.text_content() for entry in entries] == [class_name(NAMES, number) for number in numbers]
    colours = [
        entry.locator(".swatch").evaluate("each => getComputedStyle(each).backgroundColor")
        for entry in entries
    ]
    assert colours == [f"rgb({r}, {g}, {b})" for r, g, b in class_colours(numbers)]
    share = 100 * (plane.classes == 60002).mean()
    title = entries[2].get_attribute("title")
    assert title.startswith("chaotic: ")
    assert float(title.split()[1]) == pytest.approx(share, rel=1e-3)
    assert not page.locator("#bar").is_visible()


def test_the_layer_is_chosen_by_list_key_and_link(planes: Made, open_page: Open) -> None:
    opened = open_page(planes[1]).settle()
    page = opened.page
    assert opened.call("layer") == "fate"
    assert "#" not in page.url
    chooser = page.get_by_label("Layer", exact=True)
    assert chooser.locator("option").all_text_contents() == ["fate", "largest exponent", "rotation number"]
    chooser.select_option("rotation number")
    opened.settle()
    assert page.url.endswith("#layer=rotation")
    assert page.locator("#bar").is_visible()
    assert not page.locator("#legend").is_visible()
    assert page.text_content("#caption") == "rotation numberno value"
    page.locator("canvas").focus()
    opened.press("l")
    assert opened.call("layer") == "fate"
    assert chooser.input_value() == "fate"
    opened.press("l", "+", "ArrowLeft")
    assert page.url.endswith("&layer=lyapunov")
    assert "0" in page.locator("#scale span").all_text_contents()
    again = open_page(planes[1], hash="#" + page.url.split("#")[1]).settle()
    assert again.call("view") == opened.call("view")
    assert again.call("layer") == "lyapunov"
    assert again.page.get_by_label("Layer", exact=True).input_value() == "lyapunov"
    assert "largest exponent over a and b" in again.page.get_attribute("canvas", "aria-label")
    again.page.evaluate("location.hash = ''")
    again.page.wait_for_function("atlasPage.layer() === 'fate'")
    assert again.settle().axis("across")["low"] == 2


def test_letters_and_arrows_in_the_list_stay_there(planes: Made, open_page: Open) -> None:
    opened = open_page(planes[1]).settle()
    before = opened.call("view")
    opened.page.get_by_label("Layer", exact=True).focus()
    opened.press("ArrowDown")
    opened.page.wait_for_function("atlasPage.layer() === 'lyapunov'")
    opened.press("r")
    opened.page.wait_for_function("atlasPage.layer() === 'rotation'")
    assert opened.settle().call("view") == before


@pytest.mark.parametrize(
    "link", ["#layer=none", "#across=2,0.8&up=2,0.8&layer=%zz", "#layers=fate", "#across="]
)
def test_a_link_to_no_layer(planes: Made, open_page: Open, link: str) -> None:
    opened = open_page(planes[1], hash=link).settle()
    assert "could not be read" in opened.status()
    assert opened.call("layer") == "fate"


def numbers_of(text: str) -> dict[str, str]:
    """Read the words under the pointer."""
    found = re.fullmatch(
        r"pointera = ([^b]*)b = ([0-9.]*)(.*)largest exponent = (.*)rotation number = (.*)", text
    )
    assert found, text
    return dict(zip(("a", "b", "class", "lyapunov", "rotation"), found.groups(), strict=True))


def value_of(text: str) -> float:
    """Read a value as the page writes it."""
    if text == "none":
        return float("nan")
    plain = text.translate(str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻−", "0123456789--"))
    factor, _, power = plain.partition("×10")
    return float(factor) * 10 ** int(power or 0)


@pytest.mark.parametrize(("levels", "pair"), [((2, 2), (2, 2)), ((1, 1), (1, 1)), ((4, 5), (2, 2))])
def test_class_and_values_under_the_pointer(
    planes: Made, open_page: Open, levels: tuple[int, int], pair: tuple[int, int]
) -> None:
    plane, folder = planes
    opened = open_page(folder, size=(700, 560), ratio=1.25)
    opened.go(f"{levels[0]},0.8", f"{levels[1]},0.8")
    assert opened.call("shown")["pair"] == list(pair)
    left, top = opened.plot_corner()
    plot, seen = opened.call("plot"), set()
    majority = plane.majority(pair)
    means = {name: plane.means(pair, name) for name in plane.values}
    for x, y in [(0.1, 0.2), (0.3, 0.9), (0.5, 0.5), (0.52, 0.37), (0.8, 0.1), (0.93, 0.77), (0.6, 0.6)]:
        across, down = int(x * plot["width"]), int(y * plot["height"])
        cell = []
        for name, pixel, level in (
            ("across", across, pair[0]),
            ("up", plot["height"] - 1 - down, pair[1]),
        ):
            axis = opened.axis(name)
            cell.append(int((axis["start"] + (2 * pixel + 1) * axis["pixel"] / 2) * (TILE << level)))
        if not all(0 <= at < TILE << level for at, level in zip(cell, pair, strict=True)):
            continue
        opened.page.mouse.move((left + across + 0.5) / 1.25, (top + down + 0.5) / 1.25)
        opened.settle()
        opened.page.wait_for_function("!document.getElementById('readout').textContent.includes('…')")
        found = numbers_of(opened.page.text_content("#readout"))
        number = int(majority[cell[0], cell[1]])
        assert found["class"] == class_name(NAMES, number)
        for name in plane.values:
            wanted = means[name][cell[0], cell[1]]
            assert value_of(found[name]) == pytest.approx(wanted, rel=6e-4, nan_ok=True)
        seen.add(number)
    assert len(seen) > 1


def test_side_cars_are_read_when_the_pointer_comes(planes: Made, open_page: Open) -> None:
    opened = open_page(planes[1], hash="#across=2,0.8&up=2,0.8").settle()

    def asked() -> list[str]:
        return [url.split("/values/")[1] for url in opened.requests if "/values/" in url]

    assert asked() == []
    assert opened.page.text_content("#readout").endswith("fate = –largest exponent = –rotation number = –")
    left, top = opened.plot_corner()
    columns, rows = window(opened)
    height = opened.call("plot")["height"]
    for column, row in [(600, 600), (700, 700), (400, 600), (600, 600)]:
        opened.page.mouse.move(
            left + column - columns.start + 0.5, top + height - 1 - (row - rows.start) + 0.5
        )
        opened.settle()
    assert asked() == ["2/2/2/2.js", "2/2/1/2.js"]
    opened.page.mouse.move(5, 5)
    opened.settle()
    assert len(asked()) == 2
    opened.go("0,0.8", "0,0.8")
    opened.page.mouse.move(left + 2, top + 2)  # beyond the ends of the axes
    opened.settle()
    assert opened.page.text_content("#readout").endswith("fate = –largest exponent = –rotation number = –")
    assert len(asked()) == 2


def test_the_keyboard_reads_the_centre(planes: Made, open_page: Open) -> None:
    plane, folder = planes
    opened = open_page(folder, hash="#across=2,0.8&up=2,0.8").settle()
    opened.page.locator("canvas").focus()
    opened.press("Shift+ArrowRight", "Shift+ArrowUp")
    columns, rows = window(opened)
    centre = (columns.start + columns.stop) // 2, (rows.start + rows.stop) // 2
    number = int(plane.majority(LEVELS)[centre[0], centre[1] - (opened.call("plot")["height"] % 2 == 0)])
    text = opened.page.text_content("#readout")
    assert text.startswith("centrea = ")
    assert class_name(NAMES, number) in text


def test_a_side_car_that_is_missing(tmp_path: Path, planes: Made, open_page: Open) -> None:
    plane = Plane(0, 0)
    build_planes(
        tmp_path / "index.sqlite",
        VIEW,
        across_level=0,
        up_level=0,
        pairs="all",
        source=plane.source,
        header=HEADER,
    )
    build_site(tmp_path / "index.sqlite", tmp_path / "site")
    (tmp_path / "site/values/0/0/0/0.js").unlink()
    opened = open_page(tmp_path / "site").settle()
    opened.page.mouse.move(450, 320)
    opened.page.wait_for_function("document.getElementById('readout').textContent.includes('not readable')")
    opened.problems.clear()  # the browser reports the missing file too


def test_the_copied_config_draws_the_layer(planes: Made, open_page: Open) -> None:
    opened = open_page(planes[1]).settle()
    kept = {"family": "forced_logistic", "steps": "500"}
    for layer in ({"draw": "fate"}, {"draw": "lyapunov", "palette": "balance"}):
        document = yaml.load(opened.call("plateText"), Loader=yaml.BaseLoader)
        plate = document["plates"]["view"]
        assert {key: plate[key] for key in plate if key not in ("across", "up")} == {**kept, **layer}
        opened.page.locator("canvas").focus()
        opened.press("l")


@pytest.mark.parametrize("size", SIZES)
def test_everything_fits_and_keeps_its_place(planes: Made, open_page: Open, size: tuple[int, int]) -> None:
    opened = open_page(planes[1], size=size, hash="#across=2,0.8&up=2,0.8").settle()
    page = opened.page
    inside = "[document.documentElement.scrollWidth, document.documentElement.scrollHeight]"
    before = opened.call("plot")
    for _ in range(3):
        assert page.evaluate(inside) == list(size)
        shown = (
            "button:visible, select, .choice label, #readout, #status, #key, #legend:visible, #bar:visible"
        )
        canvas = page.locator("canvas").bounding_box()
        for control in page.locator(shown).all():
            box = control.bounding_box()
            assert box["x"] >= 0
            assert box["x"] + box["width"] <= size[0]
            assert box["y"] + box["height"] <= size[1]
            assert (
                box["y"] + box["height"] <= canvas["y"] + 1 or box["y"] >= canvas["y"] + canvas["height"] - 1
            )
        page.mouse.move(canvas["x"] + canvas["width"] * 0.6, canvas["y"] + canvas["height"] * 0.4)
        opened.settle()
        words = page.locator("#readout span").all()
        edge = page.locator("#readout").bounding_box()
        assert len(words) == 5
        for word in words:
            box = word.bounding_box()
            assert box["x"] + box["width"] <= edge["x"] + edge["width"] + 1
            assert box["y"] + box["height"] <= edge["y"] + edge["height"] + 1
        assert opened.call("plot") == before
        page.locator("canvas").focus()
        opened.press("l")


def test_densities_have_no_layers(diagonal_site: tuple[SyntheticSite, Path], open_page: Open) -> None:
    opened = open_page(diagonal_site[1]).settle()
    assert not opened.page.locator("#layer").is_visible()
    assert not opened.page.locator("#legend").is_visible()
    opened.press("l")
    assert "#" not in opened.page.url
    assert opened.page.locator("#readout span").count() == 2
