"""The configs that are delivered, each rendered small, and the README's promises about configs."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

import atlas
from atlas.config.jobs import Figure, Plate, TileSet
from atlas.config.load import Config, load, parse_config
from atlas.config.schema import key_rows
from atlas.figure.layout import layout
from atlas.figure.panels import request_of
from atlas.output.certificate_reader import read
from atlas.reading.sheet import Size
from atlas.reading.view_kinds import Levels
from tiles.palette import PALETTES

ROOT = Path(__file__).parents[2]
CONFIGS = sorted((ROOT / "configs").glob("*.yaml"))
README = (ROOT / "README.md").read_text("utf-8")
BLOCKS = re.findall(r"^```yaml\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)
QUICK = {"samples": 200, "transient": 200, "transient_limit": 2000, "values_per_column": 4, "steps": 64}
PLATE_SIZE, FIGURE_SIZE = (
    Size(Fraction(width), Fraction(height), "px") for width, height in ((300, 200), (600, 400))
)


def small(config: Config) -> Config:
    """Return a config with everything that takes time or room reduced.

    Each map is compiled anew, so that of portraits, planes and basins one of what is drawn is kept.
    """
    plates = {name: small_plate(plate) for name, plate in first_drawn(config.plates).items()}
    return replace(
        config,
        plates=plates,
        tile_sets={name: small_tile_set(tiles) for name, tiles in config.tile_sets.items()},
        figures={name: small_figure(figure, plates) for name, figure in config.figures.items()},
    )


def first_drawn(plates: dict[str, Plate]) -> dict[str, Plate]:
    """Return all orbit histograms, and of every other kind of view the first plate for what is drawn."""
    seen: set[tuple[str, str]] = set()
    kept = {}
    for name, plate in plates.items():
        if plate.kind == "histogram" or (plate.kind, plate.draw) not in seen:
            kept[name] = plate
        seen.add((plate.kind, plate.draw))
    return kept


def small_plate(plate: Plate) -> Plate:
    return replace(plate, size=PLATE_SIZE, dpi=100, supersampling=1, **QUICK)


def small_tile_set(tiles: TileSet) -> TileSet:
    levels = Levels(min(tiles.levels.across, 1), min(tiles.levels.up, 1))
    return replace(tiles, levels=levels, **QUICK)


def small_figure(figure: Figure, plates: dict[str, Plate]) -> Figure:
    return replace(figure, size=FIGURE_SIZE, dpi=100, plates={name: plates[name] for name in figure.plates})


def files_of(record: Plate | TileSet | Figure) -> Iterator[str]:
    if isinstance(record, TileSet):
        yield f"{record.name}/index.sqlite"
        yield f"{record.name}/site/index.html"
    else:
        for form in record.formats:
            yield f"{record.name}.{'tif' if form == 'tiff' else form}"


def check_picture(file: Path, record: Plate | TileSet | Figure) -> None:
    """Check the size of a picture and that something is drawn inside every frame."""
    assert isinstance(record, Plate | Figure)
    with Image.open(file) as image:
        assert image.size == record.pixels
        pixels = np.asarray(image.convert("RGB"))
    for panel in layout(request_of(record)).panels:
        inside = pixels[panel.top : panel.top + panel.height, panel.left : panel.left + panel.width]
        assert (inside != inside[0, 0]).any(), panel.name


def test_there_are_configs() -> None:
    assert {
        "ecology.yaml",
        "fishery.yaml",
        "hysteresis.yaml",
        "physics.yaml",
        "planes.yaml",
        "portraits.yaml",
        "seasons.yaml",
        "switching.yaml",
    } <= {path.name for path in CONFIGS}


def test_configs_show_every_kind_of_view() -> None:
    outputs = [record for path in CONFIGS for record in load(path).outputs().values()]
    plates = [record for record in outputs if isinstance(record, Plate)]
    assert {"histogram", "follow", "plane", "portrait", "basin"} == {plate.kind for plate in plates}
    assert {"density", "fate", "lyapunov", "rotation", "escape", "attractors", "basin"} <= {
        plate.draw for plate in plates
    }
    assert any(plate.draw == "lyapunov" and plate.family.patterns for plate in plates)
    assert {"histogram", "plane"} <= {record.kind for record in outputs if isinstance(record, TileSet)}


@pytest.mark.parametrize("path", CONFIGS, ids=lambda path: path.name)
def test_what_a_config_needs_is_known(path: Path) -> None:
    config = load(path)
    assert [output.name for output, _ in atlas.needs(config)] == list(config.outputs())


@pytest.mark.parametrize("path", CONFIGS, ids=lambda path: path.name)
def test_a_config_is_rendered_whole(path: Path, tmp_path: Path) -> None:
    config = small(load(path))
    outcomes = atlas.render(config, tmp_path)
    assert {outcome.name: outcome.status for outcome in outcomes} == dict.fromkeys(config.outputs(), "made")
    wanted = {name for record in config.outputs().values() for name in files_of(record)}
    found = {str(file.relative_to(tmp_path)) for file in tmp_path.rglob("*") if file.is_file()}
    assert wanted <= found
    for name in wanted:
        if not name.endswith(".html"):
            assert read(tmp_path / name)["name"] in config.outputs()
        if name.endswith((".png", ".tif")):
            check_picture(tmp_path / name, config.outputs()[Path(name).stem])


def test_readme_has_configs() -> None:
    assert BLOCKS


@pytest.mark.parametrize("block", BLOCKS, ids=lambda block: block.split(":")[0])
def test_a_config_of_the_readme_is_accepted(block: str) -> None:
    assert parse_config(block, "README.md").outputs()


def test_the_readme_lists_every_key_with_its_default_and_every_palette() -> None:
    for row in key_rows():
        assert re.search(
            rf"^\| .*{row.section.replace('_', ' ')}.* \| `{row.name}` \| {row.default} \|", README, re.M
        ), row
    for name in PALETTES:
        assert f"`{name}`" in README
