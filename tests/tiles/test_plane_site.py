"""The folder of a tile set of planes shows exactly the classes and values of the index, and appears whole."""

import base64
import json
import os
import re
import zlib

import numpy as np
import pytest
from PIL import Image

from tests.tiles.planes import VIEW, Plane
from tests.tiles.test_build import Interrupted, Stopped, Threads
from tests.tiles.test_plane_build import built
from tiles.classes import class_colours
from tiles.grid import TILE, Address
from tiles.palette import PaletteRefused
from tiles.plane_index import PlaneIndex
from tiles.plane_meta import class_name
from tiles.shading import LEVELS, colour_table
from tiles.side_car import side_car
from tiles.site import build_site
from tiles.values import fit_values, shade_values

A, U = 1, 2
PALETTES = {"lyapunov": "balance", "rotation": "wheel"}


@pytest.fixture(scope="module")
def plane():
    return Plane(A, U)


@pytest.fixture(scope="module")
def index_path(tmp_path_factory, plane):
    return built(tmp_path_factory.mktemp("index"), plane, pairs="all")


@pytest.fixture(scope="module")
def site(tmp_path_factory, index_path):
    folder = tmp_path_factory.mktemp("out") / "site"
    build_site(index_path, folder)
    return folder


def files(folder):
    """Every file of a folder by its relative name."""
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def described(site):
    text = (site / "meta.js").read_text("ascii")
    return json.loads(text.removeprefix("window.ATLAS_META = ").removesuffix(";\n"))


def addresses():
    pairs = [(a, u) for a in range(A + 1) for u in range(U + 1)]
    return [Address(*pair, c, r) for pair in pairs for c in range(2 ** pair[0]) for r in range(2 ** pair[1])]


def picture(site, layer, address):
    a, u, column, row = address
    with Image.open(site / "tiles" / layer / str(a) / str(u) / str(column) / f"{row}.png") as image:
        assert (image.mode, image.size) == ("P", (TILE, TILE))
        return np.asarray(image.convert("RGB"))


def cut(whole, address):
    """Return a tile of a whole level pair."""
    left, low = address.column * TILE, address.row * TILE
    return whole[left : left + TILE, low : low + TILE]


def test_pictures_of_classes_show_the_majority_in_its_colour(site, plane):
    for address in addresses():
        majority = cut(plane.majority(address.pair), address)
        colours = np.zeros((1 << 16, 3), np.uint8)
        present = np.unique(majority)
        colours[present] = class_colours(present.tolist())
        assert np.array_equal(picture(site, "fate", address), colours[majority].transpose(1, 0, 2)[::-1])


@pytest.mark.parametrize("layer", ["lyapunov", "rotation"])
def test_pictures_joined_are_the_shaded_means(site, plane, layer):
    kind = {"lyapunov": "diverging", "rotation": "cyclic"}[layer]
    fit = fit_values(plane.means((0, 1), layer), kind=kind)
    table = colour_table(PALETTES[layer])
    for address in addresses():
        shades = shade_values(plane.means(address.pair, layer), fit)
        expected = table[cut(shades, address)].transpose(1, 0, 2)[::-1]
        assert np.array_equal(picture(site, layer, address), expected)


def side_car_of(site, address):
    """Read a side-car script as the page does: classes, and values by layer."""
    a, u, column, row = address
    text = (site / "values" / str(a) / str(u) / str(column) / f"{row}.js").read_text("ascii")
    name, packed = re.fullmatch(r'atlasValues\("([0-9/]+)","([A-Za-z0-9+/=]+)"\);\n', text).groups()
    assert name == f"{a}/{u}/{column}/{row}"
    return unpacked(zlib.decompress(base64.b64decode(packed)))


def unpacked(raw):
    number = int.from_bytes(raw[:4], "little")
    present = np.frombuffer(raw, "<u2", number, 4)
    at = 4 + 2 * number
    kind = np.dtype("u1" if number <= 256 else "<u2")
    places = np.frombuffer(raw, kind, TILE * TILE, at)
    at += TILE * TILE * kind.itemsize
    values = []
    while at < len(raw):
        planes = np.frombuffer(raw, np.uint8, 3 * TILE * TILE, at).reshape(3, -1)
        bits = sum(planes[k].astype("<u4") << 8 * (k + 1) for k in range(3))
        values.append(bits.astype("<u4").view("<f4").reshape(TILE, TILE))
        at += 3 * TILE * TILE
    return present[places].reshape(TILE, TILE), values


def test_side_cars_hold_classes_exactly_and_values_to_five_digits(site, plane):
    for address in addresses():
        classes, values = side_car_of(site, address)
        assert np.array_equal(classes, cut(plane.majority(address.pair), address))
        assert len(values) == 2
        for found, layer in zip(values, ("lyapunov", "rotation"), strict=True):
            wanted = cut(plane.means(address.pair, layer), address)
            assert np.array_equal(np.isnan(found), np.isnan(wanted))
            np.testing.assert_allclose(found, wanted, rtol=2**-16, atol=1e-30)


def test_side_cars_of_many_classes_and_of_numbers_beyond_single_precision():
    classes = np.arange(TILE * TILE).reshape(TILE, TILE).astype(np.uint16)
    values = np.zeros((TILE, TILE))
    values[0, :5] = [1e300, -1e300, np.nan, 1 + 2.0**-16, 65536.0]
    text = side_car(Address(70, 1, 2**69, 1), classes, [values]).decode()
    assert text.startswith(f'atlasValues("70/1/{2**69}/1","')
    found, (numbers,) = unpacked(zlib.decompress(base64.b64decode(text.split('"')[3])))
    assert np.array_equal(found, classes)
    assert 3.4e38 < numbers[0, 0] < np.inf
    assert -np.inf < numbers[0, 1] < -3.4e38
    assert np.isnan(numbers[0, 2])
    assert numbers[0, 3] in (1.0, np.float32(1 + 2.0**-15))
    assert numbers[0, 4] == 65536


def test_the_description(site, plane):
    found = described(site)
    assert found["kind"] == "plane"
    fate, lyapunov, rotation = found["layers"]
    assert [layer["kind"] for layer in found["layers"]] == ["classes", "values", "values"]
    numbers, counts = np.unique(plane.classes, return_counts=True)
    own = [1, 60002, 60003]
    assert [entry["class"] for entry in fate["legend"]] == own + sorted({*numbers.tolist()} - {*own})
    shares = dict(zip(numbers.tolist(), counts / plane.classes.size, strict=True))
    assert {entry["class"]: entry["share"] for entry in fate["legend"]} == shares
    assert fate["legend"][0]["label"] == "fixed point"
    assert fate["legend"][3] == {
        "class": 2,
        "label": "period 2",
        "colour": "#{:02x}{:02x}{:02x}".format(*class_colours([2])[0]),
        "share": shares[2],
    }
    assert fate["name"] == fate["label"] == "fate"
    assert (lyapunov["label"], lyapunov["palette"]) == ("largest exponent", "balance")
    assert (rotation["name"], rotation["palette"]) == ("rotation", "wheel")
    for layer in (lyapunov, rotation):
        assert len(layer["key"]["colours"]) == LEVELS
        assert layer["key"]["caption"] == layer["label"]
    assert "0" in [text for _, text in lyapunov["key"]["labels"]]
    assert {"axes", "pairs", "present", "certificate", "title", "plate"} <= set(found)
    assert not {"key", "missing", "marks"} & set(found)


def test_every_tile_has_a_picture_a_layer_and_a_side_car(site):
    found = files(site)
    listed = {f"{a}/{u}/{column}/{row}" for a, u, column, row in addresses()}
    for folder, suffix in (("tiles/fate", "png"), ("tiles/lyapunov", "png"), ("values", "js")):
        names = {name for name in found if name.startswith(f"{folder}/")}
        assert names == {f"{folder}/{name}.{suffix}" for name in listed}
    assert {path.name for path in site.iterdir() if path.is_dir()} == {"tiles", "values"}


def test_names_of_classes():
    names = {"1": "fixed point", "period": "attractor {}"}
    assert [class_name(names, number) for number in (1, 2, 60)] == [
        "fixed point",
        "attractor 2",
        "attractor 60",
    ]
    assert class_name({}, 7) == "7"


@pytest.mark.parametrize(("workers", "ahead"), [(1, 0), (7, 100)])
def test_any_number_of_workers_writes_the_same_folder(tmp_path, index_path, site, workers, ahead):
    build_site(index_path, tmp_path / "site", run=Threads(workers, ahead))
    assert files(tmp_path / "site") == files(site)


def test_an_interrupted_site_is_continued(tmp_path, index_path, site):
    for limit in (0, 3, 2):
        with pytest.raises(Interrupted):
            build_site(index_path, tmp_path / "site", run=Stopped(limit))
        assert os.listdir(tmp_path) == [".parts"]
    done = {path: path.stat().st_mtime_ns for path in (tmp_path / ".parts").rglob("*.js")}
    torn = next((tmp_path / ".parts" / "site" / "values").rglob("0.js")).parent
    torn.rename(torn.with_name(f".{torn.name}"))  # as if stopped between two names
    build_site(index_path, tmp_path / "site")
    assert files(tmp_path / "site") == files(site)
    kept = [
        path
        for path, time in done.items()
        if (tmp_path / "site" / path.relative_to(tmp_path / ".parts" / "site")).stat().st_mtime_ns == time
    ]
    assert 0 < len(kept) < len(done)


def test_palettes_go_to_the_layers_that_they_fit(tmp_path, index_path, site):
    build_site(index_path, tmp_path / "same", palette="kinds")
    assert files(tmp_path / "same") == files(site)
    build_site(index_path, tmp_path / "dark", background="#102030")
    found = described(tmp_path / "dark")
    assert found["background"] == "#102030"
    assert found["layers"][1]["none"] == "#102030"
    with pytest.raises(PaletteRefused):
        build_site(index_path, tmp_path / "site", palette="plaid")


def test_sequential_values_follow_the_shading(tmp_path):
    plane = Plane(0, 0)
    plane.values = {"escape": np.abs(plane.values["lyapunov"])}
    header = {
        "class_layer": "fate",
        "value_layers": [
            {"name": "escape", "palette_kind": "sequential", "unit": "steps", "palette": "teal"}
        ],
    }

    def finish(index):
        index.put_value_fit("escape", index.value_fit_from("escape", "sequential"))

    path = built(tmp_path, plane, header=header, finish=finish)
    for shading in ("equalised", "logarithmic"):
        build_site(path, tmp_path / shading, shading=shading, palette="kinds")
        layer = described(tmp_path / shading)["layers"][1]
        assert (layer["palette"], layer["key"]["caption"]) == ("teal", "escape (steps)")
        fit = fit_values(plane.means((0, 0), "escape"), kind="sequential", shading=shading)
        shades = shade_values(plane.means((0, 0), "escape"), fit)
        expected = colour_table("teal")[shades].transpose(1, 0, 2)[::-1]
        assert np.array_equal(picture(tmp_path / shading, "escape", Address(0, 0, 0, 0)), expected)
    build_site(path, tmp_path / "usual")
    assert described(tmp_path / "usual")["layers"][1]["palette"] == "teal"
    build_site(path, tmp_path / "brick", palette="brick")
    assert described(tmp_path / "brick")["layers"][1]["palette"] == "brick"


def test_the_view_comes_from_the_index(index_path):
    with PlaneIndex.open(index_path) as index:
        assert index.view == VIEW
