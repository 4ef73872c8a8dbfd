"""Plates of planes, portraits, basins and followed attractors: every pixel is a look-up of the numbers."""

from __future__ import annotations

import base64
import json
import re
import shutil
from dataclasses import replace
from hashlib import blake2b
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

import atlas
from atlas.attractors.basins import Basins
from atlas.attractors.registry import Attractor
from atlas.config.digests import normalised
from atlas.config.remake import from_normalised
from atlas.figure.drawing import pieces
from atlas.figure.pieces import Words
from atlas.orbits.schedule import schedule
from atlas.output.certificate import read
from atlas.output.panels.basin import legend_of_basins, told
from atlas.output.panels.plane import FAR_BELOW, fitted_part
from atlas.output.printing import maker_of, sheet_of
from atlas.output.reporter import Silence
from atlas.planes.fates import CHAOTIC, ESCAPES, PERIODIC
from atlas.planes.survey import regions
from tests.atlas import kinds
from tests.atlas.kinds import boxes, classes_of, config, cut, plane
from tests.atlas.plates import opened, pdf_images
from tests.atlas.rendered import command, files, render, statuses
from tiles.classes import class_colours, class_shades, class_table
from tiles.errors import Refusal
from tiles.mixing import INKS, inked, mixed
from tiles.shading import colour_table, fit_counts, line_density, shade_counts
from tiles.values import ValueFit, fit_values, shade_values

PLATES = tuple(config().plates)
Colours = NDArray[np.uint8]


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """All plates and the figure, rendered by one worker."""
    out = tmp_path_factory.mktemp("kinds")
    only = [*PLATES, "mixed"]
    assert statuses(render(out, config(), only=only, workers=1)) == dict.fromkeys(only, "made")
    return out


def page(made: Path, name: str) -> Colours:
    return opened((made / f"{name}.png").read_bytes())


def crop(made: Path, name: str) -> Colours:
    """Return the raster of a plate as its PNG shows it."""
    return cut(page(made, name), boxes(config().plates[name])[name])


def of_classes(classes: NDArray[np.uint16]) -> Colours:
    """Return the colours of classes, top line first, by the colour of each class alone."""
    colours = np.zeros((1 << 16, 3), np.uint8)
    present = np.unique(classes)
    colours[present] = class_colours(present.tolist())
    return colours[classes][::-1]


def values_of(name: str, columns: int, rows: int, view: Any = None) -> NDArray[np.float32]:
    """Return the values of a plate, top line first, in single precision; superstable cycles far below."""
    plate = config().plates[name]
    found = plane(plate, columns, rows, plate.draw, view=view)[plate.draw].values
    return np.where(found == -np.inf, FAR_BELOW, found).astype(np.float32)[::-1]


KIND_OF_VALUES = {
    "lyapunov": "diverging",
    "lyapunov_2": "diverging",
    "rotation": "cyclic",
    "escape": "sequential",
}


def fit_of(name: str, values: NDArray[np.float32]) -> ValueFit:
    return fit_values(values, kind=KIND_OF_VALUES[config().plates[name].draw])


def test_a_plate_of_fates_shows_the_class_of_every_pixel_in_every_format(made: Path) -> None:
    plate = config().plates["fates"]
    box = boxes(plate)["fates"]
    expected = of_classes(classes_of(plate, box.width, box.height))
    for suffix in ("png", "tif"):
        assert np.array_equal(cut(opened((made / f"fates.{suffix}").read_bytes()), box), expected)
    (image,) = pdf_images((made / "fates.pdf").read_bytes())
    assert np.array_equal(image, expected)
    (inside,) = re.findall(rb'"data:image/png;base64,([^"]+)"', (made / "fates.svg").read_bytes())
    assert np.array_equal(opened(base64.b64decode(inside)), expected)


@pytest.mark.parametrize("name", ["periods", "several"])
def test_periods_and_numbers_of_attractors_are_classes(made: Path, name: str) -> None:
    found = crop(made, name)
    classes = classes_of(config().plates[name], found.shape[1], found.shape[0])
    assert len(np.unique(classes)) >= 3
    assert np.array_equal(found, of_classes(classes))


@pytest.mark.parametrize("name", ["exponents", "leaving", "second", "turning"])
def test_values_are_shaded_by_the_fit_of_the_picture(made: Path, name: str) -> None:
    plate = config().plates[name]
    found = crop(made, name)
    values = values_of(name, found.shape[1], found.shape[0])
    expected = colour_table(plate.palette)[shade_values(values, fit_of(name, values))]
    assert np.array_equal(found[uncovered(plate)], expected[uncovered(plate)])


def uncovered(plate: Any) -> NDArray[np.bool_]:
    """Return which pixels of a plate's raster neither its inset nor the frame of its window covers."""
    layout = sheet_of(plate).page
    panel, line = layout.panels[0], layout.spacing.line
    seen = np.ones((panel.height, panel.width), np.bool_)
    if panel.inset:
        for box, rim in ((panel.inset.raster, 3 * line), (panel.inset.window, 2 * line)):
            left, top = box.left - panel.left - rim, box.top - panel.top - rim
            seen[max(0, top) : top + box.height + 2 * rim, left : left + box.width + 2 * rim] = False
        assert 0.5 < seen.mean() < 1.0
    return seen


def test_an_inset_of_exponents_has_the_fit_of_its_plate(made: Path) -> None:
    plate = config().plates["exponents"]
    both = boxes(plate)
    main = values_of("exponents", both["exponents"].width, both["exponents"].height)
    box = both["exponents/inset"]
    part = values_of("exponents", box.width, box.height, plate.inset.view)
    expected = colour_table(plate.palette)[shade_values(part, fit_of("exponents", main))]
    assert np.array_equal(cut(page(made, "exponents"), box), expected)
    assert fit_of("exponents", part) != fit_of("exponents", main)


@pytest.mark.parametrize("name", ["fine_fates", "fine_exponents", "fine_basins"])
def test_supersampled_pixels_are_mixed_from_the_colours_of_a_finer_plane(made: Path, name: str) -> None:
    plate = config().plates[name]
    factor, found = plate.supersampling, crop(made, name)
    rows, columns = factor * found.shape[0], factor * found.shape[1]
    if name == "fine_exponents":
        values = values_of(name, columns, rows)
        shades, table = shade_values(values, fit_of(name, values)), colour_table(plate.palette)
    elif name == "fine_fates":
        shades, table = class_shades(classes_of(plate, columns, rows)[::-1]), class_table()
    else:
        shades, table = class_shades(kinds.basins(plate, columns, rows).attractor.values[::-1]), class_table()
    expected = mixed(np.ascontiguousarray(shades), table, factor)
    assert np.array_equal(found, expected)
    assert len(np.unique(expected.reshape(-1, 3), axis=0)) > len(np.unique(shades))


def test_large_planes_are_fitted_to_every_second_or_fourth_pixel(monkeypatch: pytest.MonkeyPatch) -> None:
    values = np.arange(35.0).reshape(5, 7)
    assert fitted_part(values).shape == (5, 7)
    monkeypatch.setattr("atlas.output.panels.plane.FITTED_PIXELS", 34)
    assert fitted_part(values).tolist() == values[::2, ::2].tolist()
    monkeypatch.setattr("atlas.output.panels.plane.FITTED_PIXELS", 11)
    assert fitted_part(values).tolist() == values[::4, ::4].tolist()


def shaded(counts: Any, exposure: NDArray[np.uint64], cell: float, *, line: bool) -> tuple[Any, Any]:
    """Return shades and fit of counts of shape (columns, rows)."""
    fit = fit_counts(counts, exposure, cell, "equalised", line=line_density(cell) if line else None)
    return shade_counts(counts, exposure, cell, fit).T[::-1], fit


def test_a_portrait_shows_the_density_of_its_counts(made: Path) -> None:
    plate, found = config().plates["portrait"], crop(made, "portrait")
    rows, columns = found.shape[:2]
    dataset = kinds.portrait(plate, columns, rows)
    counts = np.ascontiguousarray(dataset.counts.values.T)
    record = read(made / "portrait.png")
    exposure = np.full(columns, record["samples"]["portrait"]["exposure"], np.uint64)
    area = plate.across.cell_size(columns) * plate.up.cell_size(rows)
    shades, _ = shaded(counts, exposure, area, line=False)
    assert np.array_equal(found, colour_table(plate.palette)[shades])
    assert record["counts_digest"] == dataset.attrs["counts_digest"]


def test_a_basin_chart_shows_the_attractor_that_each_start_reaches(made: Path) -> None:
    plate, found = config().plates["basins"], crop(made, "basins")
    dataset = kinds.basins(plate, found.shape[1], found.shape[0])
    assert np.array_equal(found, of_classes(dataset.attractor.values))
    record = read(made / "basins.png")
    assert record["counts_digest"] == dataset.attrs["counts_digest"]
    listed = record["samples"]["basins"]["attractors"]
    assert [one["share"] for one in listed] == dataset.share.values.tolist()
    assert [one["share_error"] for one in listed] == dataset.share_error.values.tolist()


def test_one_sweep_is_shaded_as_a_histogram(made: Path) -> None:
    plate, found = config().plates["rising"], crop(made, "rising")
    dataset = kinds.followed(plate, found.shape[1], found.shape[0])
    counts = np.ascontiguousarray(dataset.counts.values.T)
    shades, _ = shaded(counts, dataset.exposure.values, plate.up.cell_size(found.shape[0]), line=True)
    assert np.array_equal(found, colour_table(plate.palette)[shades])
    assert read(made / "rising.png")["counts_digest"] == dataset.attrs["counts_digest"]


def test_two_sweeps_are_printed_over_each_other_by_one_fit(made: Path) -> None:
    plate, found = config().plates["both_ways"], crop(made, "both_ways")
    rows, columns = found.shape[:2]
    dataset = kinds.followed(plate, columns, rows)
    counts = dataset.counts.transpose("sweep", "a", "x").values.reshape(2 * columns, rows)
    exposure = dataset.exposure.values.reshape(-1)
    shades, _ = shaded(np.ascontiguousarray(counts), exposure, plate.up.cell_size(rows), line=True)
    up, down = (np.ascontiguousarray(half) for half in np.split(shades, 2, axis=1))
    assert np.array_equal(found, inked([up, down], INKS[:2]))
    assert not np.array_equal(up, down)  # where attractors coexist, the sweeps differ


def words_of(name: str) -> set[str]:
    """Return the words on the page of a plate."""
    sheet = sheet_of(config().plates[name])
    with schedule(1) as opened_schedule:
        panels = {
            view.name: maker_of(view.plate).make(view, name, opened_schedule, Silence())
            for view in sheet.views
        }
    rasters = {key: panel.raster for key, panel in panels.items()}
    texts = {key: panel.text for key, panel in panels.items()}
    return {piece.text for piece in pieces(sheet.page, rasters, texts) if isinstance(piece, Words)}


def test_legends_name_what_is_in_the_picture() -> None:
    assert {"period 2", "period 4", "chaotic", "escapes"} <= words_of("fates")
    assert {"upward", "downward"} <= words_of("both_ways")
    assert any(word.startswith("density (share of samples") for word in words_of("rising"))
    assert {"1 attractor", "2 attractors"} <= words_of("several")
    found = words_of("basins")
    assert "escapes" in found
    assert {re.sub(r"\d+: ", "", word) for word in found if re.match(r"\d+: ", word)} >= {"chaotic"}


def test_the_panels_of_a_figure_mix_kinds(made: Path) -> None:
    figure, whole = config().figures["mixed"], page(made, "mixed")
    places = boxes(figure)
    for name in ("fates", "fine_fates"):
        plate, box = config().plates[name], places[name]
        factor = plate.supersampling
        shades = class_shades(classes_of(plate, factor * box.width, factor * box.height)[::-1])
        assert np.array_equal(cut(whole, box), mixed(np.ascontiguousarray(shades), class_table(), factor))
    record = read(made / "mixed.png")
    assert record["kind"] == "figure"
    assert set(record["shares"]) == set(places) == {"fates", "fine_fates", "portrait", "both_ways"}
    box = places["portrait"]
    assert record["samples"]["portrait"]["columns"] == box.width


@pytest.mark.parametrize(("workers", "memory"), [(2, "1GiB"), (7, "16GiB")])
def test_files_depend_neither_on_workers_nor_on_memory(
    made: Path, tmp_path: Path, workers: int, memory: str
) -> None:
    only = ["fates", "fine_exponents", "leaving", "several", "portrait", "basins", "both_ways", "mixed"]
    assert set(statuses(render(tmp_path, config(), only=only, workers=workers, memory=memory)).values()) == {
        "made"
    }
    expected = files(made)
    assert [name for name, content in files(tmp_path).items() if content != expected[name]] == []


def test_files_do_not_depend_on_regions(made: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Except the digest of a plane's numbers, which are hashed region by region."""
    monkeypatch.setattr("atlas.planes.survey.PIXELS_AT_ONCE", 1 << 9)
    only = ["fates", "several", "turning", "basins"]
    render(tmp_path, config(), only=only, workers=2)
    for name in only:
        assert np.array_equal(page(tmp_path, name), page(made, name)), name


def test_the_digest_of_a_plane_is_that_of_its_classes_region_by_region(made: Path) -> None:
    plate = config().plates["fates"]
    box = boxes(plate)["fates"]
    classes = classes_of(plate, box.width, box.height).T
    state = blake2b(digest_size=16)
    for region in regions(box.width, box.height):
        part = classes[region.left : region.right, region.low : region.high]
        state.update(np.ascontiguousarray(part, "<u2").data)
    assert read(made / "fates.png")["counts_digest"] == state.hexdigest()


def test_unchanged_plates_are_skipped_and_damaged_ones_made_again(made: Path, tmp_path: Path) -> None:
    out = Path(shutil.copytree(made, tmp_path / "out"))
    only = ["fates", "basins", "both_ways", "portrait"]
    assert statuses(render(out, config(), only=only)) == dict.fromkeys(only, "skipped")
    (out / "fates.svg").unlink()
    assert statuses(render(out, config(), only=only))["fates"] == "made"
    assert files(out) == files(made)
    tree = config().plates["fates"]
    changed = replace(config(), plates={"fates": replace(tree, steps=512)}, tile_sets={}, figures={})
    assert statuses(render(out, changed)) == {"fates": "made"}


@pytest.mark.parametrize("name", PLATES)
def test_the_record_in_a_file_makes_the_same_plate_again(made: Path, name: str) -> None:
    record = read(made / f"{name}.png")
    assert record["config"] == json.loads(json.dumps(normalised(config().plates[name])))
    again = from_normalised(record["config"])
    assert again == config().plates[name]
    assert normalised(again) == normalised(config().plates[name])


def test_a_plate_made_from_its_record_is_the_same_file(made: Path, tmp_path: Path) -> None:
    for name in ("fine_fates", "exponents", "basins", "rising"):
        again = from_normalised(read(made / f"{name}.png")["config"])
        atlas.draw_plate(again, [tmp_path / f"{name}.png"])
        assert (tmp_path / f"{name}.png").read_bytes() == (made / f"{name}.png").read_bytes(), name


def test_the_command_shows_the_record(made: Path) -> None:
    ran = command("show", made / "basins.png")
    assert ran.returncode == 0
    record = json.loads(ran.stdout)
    assert record == read(made / "basins.png")
    assert set(record["shares"]["basins"]) >= {"escaped", "unsettled", "extinct", "further_attractors"}


LOGISTIC = {"family": "forced_logistic", "size": "200x150px", "dpi": 72, "steps": 64, "transient": 64}
HENON = {"family": "henon", "size": "200x150px", "dpi": 72, "transient": 64}
FAR = {"across": ["a", 5, 6], "up": ["b", 5, 6]}
NEAR = {"across": ["a", "2.9", "3.1"], "up": ["b", "2.9", "3.1"]}
REMARKS: dict[str, tuple[dict[str, Any], str]] = {
    "gone": ({**LOGISTIC, **FAR}, r"^gone: every orbit escapes; choose other intervals or another start$"),
    "slow": (
        {**LOGISTIC, **NEAR, "transient_limit": 64},
        r"^slow: \d+\.\d\d% of the pixels had not settled; more steps or a higher transient_limit",
    ),
    "extinct": (
        {**LOGISTIC, **NEAR, "starts": [{"x": 0}]},
        r"^extinct: \d+ orbits start exactly on a repelling cycle and stay there; move the start",
    ),
    "beside": (
        {**HENON, "across": ["x", 5, 6], "up": ["y", 5, 6], "samples": 1000},
        r"^beside: nothing is drawn: 100\.000% of the samples lie below the window$",
    ),
    "fled": (
        {**HENON, "across": ["x", -1, 1], "up": ["y", -1, 1], "set": {"a": 3}, "samples": 1000},
        r"^fled: nothing is drawn: 100\.000% of the samples escaped$",
    ),
    "lost": (
        {**HENON, "across": ["x", -1, 1], "up": ["y", -1, 1], "set": {"a": 3}, "draw": "basin"},
        r"^lost: every orbit escapes",
    ),
    "shared": (
        {**HENON, "across": ["x", -2, 2], "up": ["y", -2, 2], "set": {"a": "0.5"}, "draw": "basin"},
        r"^shared: shares of the box: attractor 1 \(period 2\) 0\.\d+ ± 0\.0\d*, escaped 0\.\d+ \(stand",
    ),
    "swept": (
        {**HENON, "across": ["a", 3, 4], "up": ["x", -1, 1], "follow": "both", "samples": 100},
        r"^swept \(upward\): nothing is drawn: 100\.000% of the samples escaped$",
    ),
}


def test_what_must_not_go_unsaid_is_said(tmp_path: Path) -> None:
    given = atlas.parse_config(
        {"defaults": {"steps": 64}, "plates": {name: plate for name, (plate, _) in REMARKS.items()}}
    )
    outcomes = render(tmp_path, given)
    assert set(statuses(outcomes).values()) == {"made"}
    for name, (_, pattern) in REMARKS.items():
        assert any(re.search(pattern, remark) for remark in outcomes[name].remarks), (
            name,
            outcomes[name].remarks,
        )
        assert all("\n" not in remark for remark in outcomes[name].remarks)


def test_a_good_plane_says_nothing(tmp_path: Path) -> None:
    plate = {**LOGISTIC, "across": ["a", "2.2", "2.8"], "up": ["b", "2.2", "2.8"]}
    (outcome,) = atlas.render(atlas.parse_config({"plates": {"good": plate}}), tmp_path)
    assert outcome.remarks == ()


@pytest.mark.parametrize("extra", [{"draw": "basin"}, {"by_attractor": True}])
def test_insets_whose_colours_would_differ_are_refused(tmp_path: Path, extra: dict[str, Any]) -> None:
    inset = {"across": ["x", 0, "0.5"], "up": ["y", 0, "0.5"]}
    plate = {**HENON, "across": ["x", -1, 1], "up": ["y", -1, 1], "inset": inset, **extra}
    with pytest.raises(Refusal, match="attractors are numbered anew in every window"):
        render(tmp_path / "out", atlas.parse_config({"plates": {"chart": plate}}))
    assert not (tmp_path / "out").exists()


def test_many_basins_are_told_in_short_and_all_named_in_the_legend() -> None:
    none = np.zeros(1)
    attractors = [
        Attractor(
            n,
            PERIODIC if n > 1 else CHAOTIC,
            n if n > 1 else 0,
            none,
            none,
            none,
            none,
            n,
            n,
            n / 1000,
            0.001,
        )
        for n in range(1, 21)
    ]
    classes = np.arange(1, 22, dtype=np.uint16)[None]
    chart = Basins(classes, attractors, 3, 5, {ESCAPES: 10}, 0, 0)
    parts = told(chart)
    assert len(parts) == 13
    assert parts[0] == "attractor 9 (period 9) 0.009 ± 0.001"
    assert parts[-1] == "8 smaller ones 0.036 together"
    labels = [entry.label for entry in legend_of_basins(chart)]
    assert labels[:2] == ["1: chaotic", "2: period 2"]
    assert labels[-2:] == ["3 further", "escapes"]
