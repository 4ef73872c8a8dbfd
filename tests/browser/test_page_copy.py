"""What 'Copy YAML' and 'Copy command' give: texts that draw the view again, saved or typed alone."""

from __future__ import annotations

import shlex
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
import yaml

from atlas.cli import main
from atlas.config.load import Config, parse_config
from atlas.orbits.schedule import schedule
from atlas.output.reporter import Silence
from atlas.output.tiled import Places
from atlas.output.tileset import make_tile_set
from tests.browser.conftest import Open
from tests.browser.opened import Opened
from tests.browser.synthetic_site import SyntheticSite
from tiles.number import exact

pytestmark = pytest.mark.browser
Site = tuple[SyntheticSite, Path]
SIDES = {"across": "width", "up": "height"}
SOUND = """
families:
  sound:
    title: "Scallops: an 'invented' stock, # 1"
    state: {n: {label: stock, unit: kt, start: 0.3, domain: [0, 5]}}
    parameters:
      r: {default: 2.6, label: "null"}
      h: {default: 0.2, label: "harvested fraction: {h}"}
    helpers: {s: (1 - h) * n, no: "-s"}
    step: {n: "where(s >= 0, s * exp(r * (1 + no)), 0)"}
    escape: 1e6
    note: "Not a stock: a test."
defaults: {samples: 50, transient: 50, values_per_column: 1}
tile_sets:
  linear:
    family: sound
    across: {name: r, low: 1.6, high: 4.2, label: "growth, a year: 'r'"}
    up: [n, -1/3, 3.5]
    levels: 0
    set: {h: 1/3}
    starts: [{n: 0.1}, {n: 1/3}]
    background: "#fffdf8"
  log:
    family: sound
    across: {name: h, low: 1/1000, high: 0.6, scale: log}
    up: {name: n, low: 1/100, high: 3.5, scale: log}
    levels: 0
  angle: {family: sine, across: [r, 0.65, 1], up: [x, 0, 1*pi/3], levels: 0}
"""
VIEWS = [("0.71875", "0.5"), ("3", "2"), ("19", "20")]


@pytest.fixture(scope="module")
def config() -> Config:
    return parse_config(SOUND)


@pytest.fixture(scope="module")
def out(config: Config, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The tile sets of the config."""
    folder = tmp_path_factory.mktemp("sets")
    with schedule(2) as opened:
        for name, job in config.tile_sets.items():
            make_tile_set(job, Places.of(folder, name), opened, Silence())
    return folder


def plate(opened: Opened) -> dict[str, Any]:
    """Return the plate that the page copies."""
    document = yaml.load(opened.call("plateText"), Loader=yaml.BaseLoader)
    assert list(document) == ["plates"]
    return dict(document["plates"]["view"])


@pytest.mark.parametrize("name", ["linear", "log", "angle"])
def test_a_copied_config_loads_alone_and_has_the_window(
    config: Config, out: Path, open_page: Open, name: str
) -> None:
    job = config.tile_sets[name]
    opened = open_page(out / name / "site").settle()
    for across, up in VIEWS:
        opened.go(f"{across},0.812345", f"{up},0.6")
        text = opened.call("plateText")
        copied = parse_config(text)
        assert list(yaml.safe_load(text)) == (["plates"] if name == "angle" else ["families", "plates"])
        again = copied.plates["view"]
        assert again.family.digest() == job.family.digest()
        assert again.family.name == job.family.name
        kept = ("starts", "samples", "transient", "values_per_column", "shading", "palette", "background")
        assert [getattr(again, key) for key in kept] == [getattr(job, key) for key in kept]
        assert again.set == job.set
        for side in SIDES:
            check_axis(getattr(again, side), getattr(job, side), opened.axis(side))
    opened.press("Home")
    whole = parse_config(opened.call("plateText")).plates["view"]
    assert (whole.across, whole.up) == (job.across, job.up)


def check_axis(found: Any, whole: Any, shown: dict[str, Any]) -> None:
    """Compare a copied axis with the window, to a hundredth of a device pixel."""
    assert (found.name, found.scale, found.label) == (whole.name, whole.scale, whole.label)
    for end in ("low", "high"):
        value, wanted = getattr(found, end).value, shown[end]
        if whole.scale == "log":
            step = wanted * Fraction(whole.cell_size(1)) * shown["pixel"]
        else:
            step = (whole.high.value - whole.low.value) * shown["pixel"]
        assert abs(value - wanted) <= step / 100
        digits = str(getattr(found, end)).partition("*")[0].partition(".")[2]
        assert "/" in digits or Fraction(1, 10 ** len(digits)) > step / 100_000


def test_mappings_of_python_values_give_the_same_family(config: Config, out: Path, open_page: Open) -> None:
    """Readers of YAML that give words like no and null a type find texts."""
    text = open_page(out / "linear" / "site").settle().call("plateText")
    family = parse_config(yaml.safe_load(text)).plates["view"].family
    assert family.formula_lines() == config.families["sound"].formula_lines()
    assert family.label_and_unit("r") == ("null", "")


def test_copied_ends_are_short_and_those_of_the_axis_exact(full_site: Site, open_page: Open) -> None:
    site, folder = full_site
    opened = open_page(folder)
    opened.go("3,0.8123", "2,0.3")
    copied = plate(opened)
    assert {key: copied[key] for key in ("family", "set", "title")} == site.meta()["plate"]
    assert all(len(end) <= 10 for name in SIDES for end in copied[name][1:])
    opened.press("Home")
    assert plate(opened)["across"] == ["r", "2.8", "4"]
    assert plate(opened)["up"] == ["x", "-1/3", "1"]


def test_log_axes_and_multiples_of_pi(curved_site: Site, open_page: Open) -> None:
    _, folder = curved_site
    opened = open_page(folder).settle()
    assert plate(opened)["across"] == {"name": "dose", "low": "0.001", "high": "500", "scale": "log"}
    assert plate(opened)["up"] == ["theta", "-1*pi/2", "1*pi"]
    opened.go("5,0.8", "4,0.35")
    across, up = opened.axis("across"), opened.axis("up")
    copied = plate(opened)
    for end, share in (
        ("low", across["start"]),
        ("high", across["start"] + across["pixel"] * opened.call("plot")["width"]),
    ):
        assert float(copied["across"][end]) == pytest.approx(1e-3 * 500_000 ** float(share), rel=1e-5)
        assert float(across[end]) == pytest.approx(1e-3 * 500_000 ** float(share), rel=1e-13)
    for text, end in zip(copied["up"][1:], ("low", "high"), strict=True):
        assert exact(text).of_pi
        assert abs(exact(text).value - up[end]) <= Fraction(3, 2) * up["pixel"] / 100
    assert opened.call("readout", 400, 300)[1].endswith("π")


POINTS = {
    "points": "a 'trial'.csv",
    "across": {"label": "dose (mg)"},
    "shading": "linear",
    "palette": "grey",
    "background": "#fafafa",
    "missing": "#cccccc",
}
OF_POINTS = {
    "across": {"name": "dose", "label": "", "unit": "", "low": "1/1000", "high": "500", "scale": "log"},
    "up": {"name": "net change", "label": "", "unit": "", "low": "-1/3", "high": "1"},
}


def test_a_view_of_points_is_copied_as_a_command_that_works(
    tmp_path: Path, open_page: Open, monkeypatch: pytest.MonkeyPatch
) -> None:
    site = SyntheticSite.whole([(0, 0)], axes=OF_POINTS, more={"plate": POINTS})
    opened = open_page(site.write(tmp_path / "site")).settle()
    button = opened.page.get_by_role("button", name="Copy command", exact=True)
    assert button.text_content().startswith("Copy command")
    assert not opened.page.get_by_role("button", name="Copy YAML").count()
    whole = opened.call("plateText")
    assert whole == (
        "atlas bin 'a '\\''trial'\\''.csv' --across dose=0.001:500 --scale-across log "
        "--label-across 'dose (mg)' --up 'net change=-1/3:1' --shading linear --palette grey "
        "--background '#fafafa' --out view.png\n"
    )
    opened.go("2,0.8", "3,0.8")
    axes = {side: opened.axis(side) for side in SIDES}
    words = shlex.split(opened.call("plateText"))
    given = dict(zip(words[3::2], words[4::2], strict=True))
    for side, name in (("across", "dose"), ("up", "net change")):
        found, ends = given[f"--{side}"].split("=")
        assert found == name
        for text, end in zip(ends.split(":"), ("low", "high"), strict=True):
            assert float(exact(text)) == pytest.approx(float(axes[side][end]), rel=1e-3)
    monkeypatch.chdir(tmp_path)
    Path(words[2]).write_text("dose,net change\n1,0.2\n0.7,0.35\n2,0.31\n")
    with pytest.raises(SystemExit) as ended:
        main([*words[1:], "--dpi", "72"])
    assert not ended.value.code
    assert (tmp_path / "view.png").is_file()


def test_the_key_shows_the_caption_of_the_data(tmp_path: Path, open_page: Open) -> None:
    key = {**SyntheticSite.whole([(0, 0)]).meta()["key"], "caption": "share per unit of ln n"}
    site = SyntheticSite.whole([(0, 0)], more={"key": key})
    page = open_page(site.write(tmp_path / "site")).settle().page
    assert page.text_content("#caption") == "share per unit of ln n"
