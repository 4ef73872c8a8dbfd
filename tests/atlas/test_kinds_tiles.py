"""Tile sets of planes, portraits, basins and followed attractors against the Datasets of the same views."""

from __future__ import annotations

import base64
import json
import re
import zlib
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from PIL import Image

import atlas
from atlas.cli import main
from atlas.config.jobs import TileSet
from atlas.config.load import parse_config
from atlas.config.remake import from_normalised
from atlas.orbits.counting import piloted
from atlas.orbits.sampling import IN_TILES, ON_PLATES
from atlas.orbits.schedule import schedule
from atlas.output.certificate import read
from atlas.output.tileset import rebuild_site
from atlas.output.whole_tiles import follow_counter
from atlas.planes.fates import CLASS_CHAOTIC, CLASS_ESCAPES, CLASS_NONE, CLASS_UNSETTLED
from tests.atlas import kinds
from tests.atlas.kinds import KINDS, classes_of, config, plane
from tests.atlas.rendered import files, render, statuses
from tests.atlas.test_interrupt import started
from tiles.classes import class_colours
from tiles.errors import Refusal
from tiles.grid import TILE, Address
from tiles.index import Index
from tiles.plane_index import PlaneIndex
from tiles.shading import colour_table
from tiles.values import shade_values

SETS = tuple(config().tile_sets)
PLANES = ("fate_tiles", "escape_tiles", "number_tiles")


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """All tile sets, built by one worker."""
    out = tmp_path_factory.mktemp("tiles")
    assert statuses(render(out, config(), only=SETS, workers=1)) == dict.fromkeys(SETS, "made")
    return out


def job_of(name: str) -> TileSet:
    job: TileSet = config().tile_sets[name]
    return job


def opened(made: Path, name: str) -> Any:
    return PlaneIndex.open(made / name / "index.sqlite")


def mosaic(index: Any, pair: tuple[int, int], part: Any) -> NDArray[Any]:
    """Return a whole level pair, shape (columns, rows), of what a function takes from each tile."""
    rows = [
        np.concatenate(
            [part(index.plane(Address(*pair, column, row))) for row in range(1 << pair[1])], axis=1
        )
        for column in range(1 << pair[0])
    ]
    return np.concatenate(rows, axis=0)


def single(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return finite values rounded to 24 bits, others as none."""
    return np.where(np.isfinite(values), values.astype(np.float32).astype(float), np.nan)


@pytest.mark.parametrize("name", PLANES)
def test_the_deepest_pair_holds_the_classes_of_the_parameter_plane(made: Path, name: str) -> None:
    job = job_of(name)
    fate = job if name == "number_tiles" else atlas.plate(
        job.family, job.across, job.up, transient=job.transient, steps=job.steps,
        transient_limit=job.transient_limit,
    )  # fmt: skip
    expected = classes_of(fate, *job.cells).T
    with opened(made, name) as index:
        found = mosaic(index, index.pairs[-1], lambda tile: tile.majority())
        totals = index.class_totals()
    assert np.array_equal(found, expected)
    numbers, often = np.unique(expected, return_counts=True)
    assert totals == dict(zip(numbers.tolist(), often.tolist(), strict=True))
    assert len(totals) >= 3


@pytest.mark.parametrize(
    ("name", "layers"), [("fate_tiles", ["lyapunov"]), ("escape_tiles", ["lyapunov", "escape"])]
)
def test_the_deepest_pair_holds_its_values_to_24_bits(made: Path, name: str, layers: list[str]) -> None:
    job = job_of(name)
    expected = plane(job, *job.cells, *layers)
    with opened(made, name) as index:
        assert [layer["name"] for layer in index.value_layers] == layers
        for layer in layers:
            found = mosaic(index, index.pairs[-1], lambda tile, layer=layer: tile.means(layer))
            np.testing.assert_array_equal(found, single(expected[layer].values.T))


def test_coarser_pairs_are_majorities_and_means_of_finite_values(made: Path) -> None:
    job = job_of("fate_tiles")
    found = plane(job, *job.cells, "lyapunov")
    classes, values = classes_of(job, *job.cells).T, single(found.lyapunov.values.T)
    with opened(made, "fate_tiles") as index:
        assert len(index.pairs) == 6
        for across, up in index.pairs:
            a, u = 1 << (1 - across), 1 << (2 - up)
            shape = (TILE << across, a, TILE << up, u)
            blocks = classes.reshape(shape).transpose(0, 2, 1, 3).reshape(shape[0], shape[2], a * u)
            numbers = np.unique(classes)
            often = (blocks[..., None] == numbers).sum(axis=2)
            majority = numbers[np.argmax(often, axis=2)]
            assert np.array_equal(mosaic(index, (across, up), lambda tile: tile.majority()), majority)
            parts = values.reshape(shape)
            finite = np.isfinite(parts)
            number = finite.sum(axis=(1, 3))
            total = np.where(finite, parts, 0.0).sum(axis=(1, 3))
            mean = np.where(number, total / np.maximum(number, 1), np.nan)
            means = mosaic(index, (across, up), lambda tile: tile.means("lyapunov"))
            np.testing.assert_allclose(means, mean, rtol=1e-12, atol=1e-12)


def picture(site: Path, layer: str, address: Address) -> NDArray[np.uint8]:
    a, u, column, row = address
    with Image.open(site / "tiles" / layer / str(a) / str(u) / str(column) / f"{row}.png") as image:
        return np.asarray(image.convert("RGB"))


def described(site: Path) -> Any:
    """Return what a page is told."""
    text = (site / "meta.js").read_text("ascii")
    return json.loads(text.removeprefix("window.ATLAS_META = ").removesuffix(";\n"))


@pytest.mark.parametrize(
    ("name", "layers"),
    [
        ("fate_tiles", ["fate", "lyapunov"]),
        ("escape_tiles", ["fate", "lyapunov", "escape"]),
        ("number_tiles", ["attractors", "lyapunov"]),
        ("basin_tiles", ["basin"]),
        ("portrait_tiles", ["density"]),
        ("rising_tiles", ["density"]),
    ],
)
def test_the_site_has_a_folder_a_layer_and_its_page(made: Path, name: str, layers: list[str]) -> None:
    site, job = made / name / "site", job_of(name)
    assert {path.name for path in (site / "tiles").iterdir()} == set(layers)
    assert (site / "index.html").is_file()
    for script in re.findall(r'src="([^"]+\.js)"', (site / "index.html").read_text("utf-8")):
        assert (site / script).is_file(), script
    planes = layers != ["density"]
    assert (site / "values").is_dir() == planes
    with opened(made, name) if planes else Index.open(made / name / "index.sqlite") as index:
        pairs = index.pairs
        stored = {address for pair in pairs for address in index.addresses(pair)}
    if planes:
        assert [layer["name"] for layer in described(site)["layers"]] == layers
        assert len(stored) == sum(1 << sum(pair) for pair in pairs)
    for folder, suffix in [(f"tiles/{layer}", "png") for layer in layers] + [("values", "js")] * planes:
        found = {
            Address(*(int(part) for part in path.with_suffix("").parts[-4:]))
            for path in (site / folder).rglob(f"*.{suffix}")
        }
        assert found == stored, folder
    assert described(site)["plate"]["transient"] == job.transient


def test_pictures_are_look_ups_of_classes_and_means(made: Path) -> None:
    site = made / "escape_tiles/site"
    with opened(made, "escape_tiles") as index:
        fits = {layer["name"]: index.value_fit(layer["name"]) for layer in index.value_layers}
        assert set(fits) == {"lyapunov", "escape"}
        for pair in index.pairs:
            for address in index.addresses(pair):
                tile = index.plane(address)
                colours = np.zeros((1 << 16, 3), np.uint8)
                present = np.unique(tile.majority())
                colours[present] = class_colours(present.tolist())
                assert np.array_equal(
                    picture(site, "fate", address), colours[tile.majority()].transpose(1, 0, 2)[::-1]
                )
                for layer, palette in (("lyapunov", "balance"), ("escape", "blue")):
                    shades = shade_values(tile.means(layer), fits[layer])
                    expected = colour_table(palette)[shades].transpose(1, 0, 2)[::-1]
                    assert np.array_equal(picture(site, layer, address), expected)


def test_side_cars_tell_what_is_under_the_pointer(made: Path) -> None:
    site = made / "fate_tiles/site"
    with opened(made, "fate_tiles") as index:
        for address in (Address(0, 0, 0, 0), Address(1, 2, 1, 3)):
            a, u, column, row = address
            text = (site / f"values/{a}/{u}/{column}/{row}.js").read_text("ascii")
            told = re.fullmatch(r'atlasValues\("([0-9/]+)","([A-Za-z0-9+/=]+)"\);\n', text)
            assert told is not None
            assert told[1] == f"{a}/{u}/{column}/{row}"
            raw = zlib.decompress(base64.b64decode(told[2]))
            number = int.from_bytes(raw[:4], "little")
            present = np.frombuffer(raw, "<u2", number, 4)
            places = np.frombuffer(raw, "u1", TILE * TILE, 4 + 2 * number)
            assert np.array_equal(present[places].reshape(TILE, TILE), index.plane(address).majority())


def test_the_page_is_told_the_legend_and_the_words(made: Path) -> None:
    meta = described(made / "fate_tiles/site")
    assert meta["kind"] == "plane"
    classes, exponents = meta["layers"]
    labels = {entry["class"]: entry["label"] for entry in classes["legend"]}
    assert labels[2] == "period 2"
    assert labels[CLASS_CHAOTIC] == "chaotic"
    assert labels[CLASS_ESCAPES] == "escapes"
    assert "Lyapunov exponent" in exponents["label"]
    numbers = described(made / "number_tiles/site")["layers"][0]["legend"]
    assert {entry["label"] for entry in numbers} >= {"1 attractor", "2 attractors"}
    basins = described(made / "basin_tiles/site")["layers"][0]["legend"]
    assert any(re.fullmatch(r"\d+: chaotic", entry["label"]) for entry in basins)


@pytest.mark.parametrize("name", ["portrait_tiles", "rising_tiles"])
def test_portraits_and_followed_attractors_are_those_of_the_datasets(made: Path, name: str) -> None:
    job = job_of(name)
    dataset = (kinds.portrait if name == "portrait_tiles" else kinds.followed)(job, *job.cells)
    with Index.open(made / name / "index.sqlite") as index:
        pair = index.pairs[-1]
        found = np.zeros(job.cells, np.uint32)
        for address in index.addresses(pair):
            left, low = address.column * TILE, address.row * TILE
            found[left : left + TILE, low : low + TILE] = index.get(address)
        assert np.array_equal(found, dataset.counts.values.T)
        assert found.any()
        record = index.certificate
    assert record["counts_digest"] == dataset.attrs["counts_digest"]


def test_basins_are_those_of_the_dataset(made: Path) -> None:
    job = job_of("basin_tiles")
    dataset = kinds.basins(job, *job.cells)
    with opened(made, "basin_tiles") as index:
        assert np.array_equal(
            mosaic(index, index.pairs[-1], lambda tile: tile.majority()), dataset.attractor.values.T
        )
        record = index.certificate
    assert record["counts_digest"] == dataset.attrs["counts_digest"]
    assert [one["share"] for one in record["samples"]["attractors"]] == dataset.share.values.tolist()


@pytest.mark.parametrize("name", SETS)
def test_the_record_in_an_index_makes_the_same_tile_set_again(made: Path, name: str) -> None:
    record = read(made / name / "index.sqlite")
    assert record["kind"] == "tile set"
    assert from_normalised(record["config"]) == job_of(name)
    if name in PLANES:
        with opened(made, name) as index:
            assert record["counts_digest"] == index.counts_digest()


@pytest.mark.parametrize(("workers", "memory"), [(2, "1GiB"), (7, "16GiB")])
def test_tile_sets_depend_neither_on_workers_nor_on_memory(
    made: Path, tmp_path: Path, workers: int, memory: str
) -> None:
    only = ["fate_tiles", "escape_tiles", "portrait_tiles", "basin_tiles", "rising_tiles"]
    render(tmp_path, config(), only=only, workers=workers, memory=memory)
    expected = {name: content for name, content in files(made).items() if name.split("/")[0] in only}
    found = files(tmp_path)
    assert found.keys() == expected.keys()
    assert [name for name in found if found[name] != expected[name]] == []


def test_one_tile_at_a_time_makes_the_same_tile_set(
    made: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("atlas.output.batch.builders", lambda *given: 1)
    monkeypatch.setattr("atlas.output.plane_tiles.PIXELS_AT_ONCE", 1 << 12)
    render(tmp_path, config(), only=["escape_tiles"], workers=2)
    expected = {name: content for name, content in files(made).items() if name.startswith("escape_tiles/")}
    assert files(tmp_path) == expected


def test_finished_tile_sets_are_skipped(made: Path) -> None:
    assert statuses(render(made, config(), only=SETS)) == dict.fromkeys(SETS, "skipped")


def test_a_site_in_another_palette_computes_nothing(
    made: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def forbidden(*_: Any, **__: Any) -> None:
        raise AssertionError("nothing is to be computed")

    monkeypatch.setattr("atlas.planes.finder.FateFinder.find", forbidden)
    index = made / "escape_tiles/index.sqlite"
    before = index.read_bytes()
    with pytest.raises(SystemExit) as ended:
        main(
            [
                "site",
                str(index),
                "--out",
                str(tmp_path / "other"),
                "--palette",
                "ember",
                "--background",
                "#fffdf8",
            ]
        )
    assert ended.value.code in (0, None)
    assert index.read_bytes() == before
    here, there = made / "escape_tiles/site", tmp_path / "other"
    address = Address(1, 1, 0, 1)
    with opened(made, "escape_tiles") as found:
        shades = shade_values(found.plane(address).means("escape"), found.value_fit("escape"))
    table = colour_table("ember", background="#fffdf8")
    assert np.array_equal(picture(there, "escape", address), table[shades].transpose(1, 0, 2)[::-1])
    palettes = [layer.get("palette") for layer in described(there)["layers"]]
    assert palettes == [None, "balance", "ember"]  # each layer has one of its kind
    rebuild_site(index, tmp_path / "same")
    assert files(tmp_path / "same") == files(here)


def test_a_site_in_a_palette_that_does_not_exist_is_refused(made: Path, tmp_path: Path) -> None:
    with pytest.raises(Refusal, match="palette"):
        rebuild_site(made / "fate_tiles/index.sqlite", tmp_path / "site", palette="embre")
    assert not (tmp_path / "site").exists()


def test_a_tile_set_of_both_sweeps_is_refused_before_anything_is_made(tmp_path: Path) -> None:
    settings = {"family": "henon", "across": ["a", 1, 1.1], "up": ["x", -1, 1], "levels": 0, "follow": "both"}
    with pytest.raises(
        Refusal, match="a tile set follows one sweep; make one set with follow: up and another"
    ):
        render(tmp_path / "out", atlas.parse_config({"tile_sets": {"set": settings}}))
    assert not (tmp_path / "out").exists()


class Steps:
    """A reporter that counts the steps of each stage."""

    def __init__(self) -> None:
        self.stage = ""
        self.steps: Counter[str] = Counter()

    def begin(self, name: str, what: str, total: int) -> None:
        self.stage = what

    def advance(self, amount: int) -> None:
        self.steps[self.stage] += amount


def finished(out: Path, name: str) -> Counter[str]:
    """Render a tile set to its end in this process; return the steps that it took."""
    told = Steps()
    (outcome,) = atlas.render(config(), out, only=[name], reporter=told)
    assert outcome.status == "made"
    assert [path.name for path in (out / ".parts").iterdir()] == ["finished.json"]
    return told.steps


def test_a_killed_plane_goes_on_from_the_tiles_it_had(made: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    with started("finding fates", "step of finding fates", KINDS, out, "fate_tiles") as process:
        assert process.stderr is not None
        for _ in range(12):  # a tile takes four steps
            process.stderr.readline()
        process.kill()
        process.wait()
    assert files(out) == {}
    pixels = job_of("fate_tiles").cells[0] * job_of("fate_tiles").cells[1]
    assert 0 < finished(out, "fate_tiles")["finding fates"] < pixels
    expected = {name: content for name, content in files(made).items() if name.startswith("fate_tiles/")}
    assert files(out) == expected


def test_a_basin_chart_killed_while_its_site_is_written_is_completed(made: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    with started("tiles", "basin_tiles tiles", KINDS, out, "basin_tiles") as process:
        process.kill()
        process.wait()
    assert files(out) == {}
    finished(out, "basin_tiles")
    expected = {name: content for name, content in files(made).items() if name.startswith("basin_tiles/")}
    assert files(out) == expected


def test_certificates_of_planes_say_what_their_tiles_tell_and_no_more(made: Path) -> None:
    with opened(made, "number_tiles") as index:
        none = float((mosaic(index, index.pairs[-1], lambda tile: tile.majority()) == CLASS_NONE).mean())
        assert index.certificate["shares"] == {"without_attractor": none}
    with opened(made, "escape_tiles") as index:
        classes = mosaic(index, index.pairs[-1], lambda tile: tile.majority())
        shares = index.certificate["shares"]
        assert set(shares) == {"escaped", "extinct", "unsettled"}
        assert shares["escaped"] == (classes == CLASS_ESCAPES).mean() > 0
        assert shares["unsettled"] == (classes == CLASS_UNSETTLED).mean()


def test_automatic_samples_of_a_followed_tile_set_are_those_of_tiles(tmp_path: Path) -> None:
    view = {"family": "henon", "across": ["a", 1, "1.1"], "up": ["x", "-1.5", "1.5"], "follow": "up"}
    wanted = parse_config({"tile_sets": {"rising": {**view, "levels": 0, "transient_limit": 2000}}})
    assert statuses(render(tmp_path, wanted, workers=1)) == {"rising": "made"}
    with schedule(1) as workers:
        counter = follow_counter(wanted.tile_sets["rising"])
        expected = piloted(counter, workers, IN_TILES)
        assert expected < piloted(counter, workers, ON_PLATES)
    assert read(tmp_path / "rising/index.sqlite")["samples"]["of_each_orbit"] == expected
