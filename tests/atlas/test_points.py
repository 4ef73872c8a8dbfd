"""Points of the user's own: every one in its exact cell, or counted where it is not drawn."""

from __future__ import annotations

import bisect
import hashlib
import tracemalloc
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray

import atlas
from atlas.errors import PlanRefused, PointsRefused
from atlas.points.cells import Account, Cells, Grid
from atlas.points.counting import StripCounter
from atlas.points.intervals import readable
from atlas.points.opening import table_of
from atlas.points.spool import Spool
from tiles.errors import Refusal, TooLarge
from tiles.strip import PER_COLUMN
from tiles.window import Axis, View

AXES = (("dose", 0, 10), ("response", -1, 1))
SIZE = (60, 40)


def points(count: int = 5000, seed: int = 0) -> dict[str, NDArray[np.float64]]:
    """Return random points, some outside `AXES`, some without a number."""
    random = np.random.default_rng(seed)
    dose, response = random.uniform(-1, 11, count), random.normal(0, 0.6, count)
    dose[::97] = np.nan
    response[::89] = np.nan
    response[5::500], dose[6::500] = np.inf, -np.inf
    return {"dose": dose, "response": response}


def csv(path: Path, table: dict[str, Any], separator: str = ",") -> Path:
    """Write a table as text that gives the same numbers back, missing ones as empty fields."""
    frame = pd.DataFrame({"row": np.arange(len(next(iter(table.values())))), **table})
    path.write_text(frame.to_csv(index=False, sep=separator), "utf-8")
    return path


def parquet(path: Path, table: dict[str, Any], **options: Any) -> Path:
    """Write a table as a Parquet file."""
    pq.write_table(pa.table(table), path, **options)
    return path


def same(one: Any, other: Any) -> None:
    """Compare two Datasets in all but the name and the bytes of the file."""
    for ds in (one, other):
        ds.attrs = {key: value for key, value in ds.attrs.items() if key not in ("file", "atlas-certificate")}
    assert one.identical(other)


# Cells


def test_counts_are_those_of_a_plain_histogram() -> None:
    table = points()
    ds = atlas.bin_points(table, AXES, size=SIZE)
    known = np.isfinite(table["dose"]) & np.isfinite(table["response"])
    dose, response = table["dose"][known], table["response"][known]
    expected, _, _ = np.histogram2d(dose, response, bins=SIZE, range=((0, 10), (-1, 1)))
    assert ds.counts.dims == ("response", "dose")
    assert ds.counts.dtype == np.uint32
    np.testing.assert_array_equal(ds.counts.to_numpy(), expected.T)
    height = 2 / SIZE[1]
    np.testing.assert_allclose(ds.density, ds.counts / (ds.exposure * height))
    np.testing.assert_allclose(ds.density.sum("response") * height, 1 - (ds.below + ds.above) / ds.exposure)


@pytest.mark.parametrize(
    "axis",
    [
        Axis.make(("x", "0.1", "0.7")),
        Axis.make(("x", -1, "1/3")),
        Axis.make(("x", 0, "2*pi")),
        Axis.make({"name": "x", "low": "1e-3", "high": 70, "scale": "log"}),
        Axis.make(("x", 10**9, "1000000000.0001")),
        Axis.make(("x", "-1.7e308", "1.7e308")),
    ],
    ids=str,
)
def test_a_value_on_an_edge_opens_the_cell_above_it_and_the_last_cell_is_closed(axis: Axis) -> None:
    cells = 73
    edges = axis.edges(cells)
    found = Cells(axis, cells).codes
    assert found(edges).tolist() == [*range(1, cells + 1), cells]
    assert found(np.nextafter(edges, -np.inf)).tolist() == list(range(cells + 1))
    assert found(np.nextafter(edges, np.inf)).tolist() == [*range(1, cells + 1), cells + 1]
    assert found(np.array([-np.inf, np.inf])).tolist() == [0, cells + 1]


def test_both_axes_place_points_on_edges_exactly() -> None:
    view = View(("dose", "0.1", "0.7"), ("response", 0, "1/3"))
    across, up = view.across.edges(6), view.up.edges(9)
    grid = [(a, u) for a in across for u in up]
    ds = atlas.bin_points({"dose": [a for a, _ in grid], "response": [u for _, u in grid]}, view, size=(6, 9))
    expected = np.ones((9, 6), int)
    expected[-1] *= 2
    expected[:, -1] *= 2
    np.testing.assert_array_equal(ds.counts, expected)
    assert ds.attrs["inside"] == len(grid)


@given(
    ends=st.tuples(st.floats(-1.7e308, 1.7e308), st.floats(-1.7e308, 1.7e308)).filter(lambda e: e[0] < e[1]),
    cells=st.integers(1, 300),
    logarithmic=st.booleans(),
    values=st.lists(st.floats(allow_nan=False), max_size=30),
    spots=st.lists(st.tuples(st.integers(0, 300), st.integers(-3, 3)), max_size=30),
)
def test_cells_are_those_of_a_search_among_the_edges(
    ends: tuple[float, float],
    cells: int,
    logarithmic: bool,
    values: list[float],
    spots: list[tuple[int, int]],
) -> None:
    if logarithmic and ends[0] <= 0:
        ends = 1e-300, max(abs(ends[1]), 1e-299)
    axis = Axis.make(
        {"name": "x", "low": ends[0], "high": ends[1], "scale": "log" if logarithmic else "linear"}
    )
    edges = axis.edges(cells)
    try:
        found = Cells(axis, cells)
    except PlanRefused:
        steps = np.diff(edges.astype(np.longdouble)) / np.spacing(np.abs(edges[:-1]))
        assert steps.min() < 16
        return
    for number, steps in spots:
        value = edges[number % (cells + 1)]
        for _ in range(abs(steps)):
            value = np.nextafter(value, np.copysign(np.inf, steps))
        values.append(float(value))
    edge_list = edges.tolist()
    last = edge_list[-1]
    expected = [cells if value == last else bisect.bisect_right(edge_list, value) for value in values]
    assert found.codes(np.array(values)).tolist() == expected


def test_every_point_is_accounted_for() -> None:
    table = points()
    ds = atlas.bin_points(table, AXES, size=SIZE)
    dose, response = table["dose"], table["response"]
    missing = np.isnan(dose) | np.isnan(response)
    assert ds.attrs["points"] == dose.size
    assert ds.attrs["missing"] == missing.sum() > 0
    assert ds.attrs["across_below"] == (dose[~missing] < 0).sum() > 0
    assert ds.attrs["across_above"] == (dose[~missing] > 10).sum() > 0
    within = ~missing & (dose >= 0) & (dose <= 10)
    assert int(ds.exposure.sum()) == ds.attrs["within_across"] == within.sum()
    assert int(ds.below.sum()) == (response[within] < -1).sum() > 0
    assert int(ds.above.sum()) == (response[within] > 1).sum() > 0
    np.testing.assert_array_equal(ds.counts.sum("response") + ds.below + ds.above, ds.exposure)
    for name in ("escaped", "unsettled", "collapsed"):
        assert not ds[name].any()


def test_a_column_without_points_has_no_exposure_and_no_density() -> None:
    ds = atlas.bin_points({"dose": [0.5, 9.5], "response": [0.0, 0.5]}, AXES, size=(10, 4))
    assert ds.exposure.values.tolist() == [1, *[0] * 8, 1]
    assert ds.density.values.max() == 1 / (2 / 4)
    assert np.isfinite(ds.density).all()


# Tables


@pytest.mark.parametrize("rows", [1, 7, 100, 10**6])
def test_the_result_does_not_depend_on_the_chunks(rows: int) -> None:
    table = points(400)
    whole = atlas.bin_points(table, ("dose", "response"), size=SIZE)
    other = atlas.bin_points(table, ("dose", "response"), size=SIZE, rows_per_chunk=rows)
    assert whole.attrs == other.attrs
    same(whole, other)


def test_every_kind_of_table_gives_the_same_counts(tmp_path: Path) -> None:
    table = points(3000)
    frame = pd.DataFrame(table)
    nullable = frame.astype("Float64")
    records = frame.to_records(index=False)
    masked = {name: np.ma.array(np.where(np.isnan(v), 5, v), mask=np.isnan(v)) for name, v in table.items()}
    kinds: dict[str, Any] = {
        "csv": csv(tmp_path / "a.csv", table),
        "semicolons": csv(tmp_path / "b.csv", table, ";"),
        "tabs": str(csv(tmp_path / "c.CSV", table, "\t")),
        "parquet": parquet(tmp_path / "a.parquet", table),
        "row groups": parquet(tmp_path / "b.parquet", table, row_group_size=111),
        "single row group": parquet(
            tmp_path / "c.parquet", {"response": table["response"], "dose": table["dose"]}
        ),
        "frame": frame,
        "nullable": nullable,
        "indexed": frame.set_index(frame.index[::-1]),
        "records": records,
        "masked": masked,
        "lists": {name: [None if np.isnan(v) else v for v in values] for name, values in table.items()},
        "list of chunks": [frame[:1000], {name: values[1000:] for name, values in table.items()}],
        "iterator": (frame[first : first + 600] for first in range(0, 3000, 600)),
    }
    expected = atlas.bin_points(table, AXES, size=SIZE)
    for kind, given_table in kinds.items():
        found = atlas.bin_points(given_table, AXES, size=SIZE, rows_per_chunk=333)
        assert found.attrs["counts_digest"] == expected.attrs["counts_digest"], kind
        same(found, expected.copy())


def test_numbers_of_text_are_read_to_the_last_bit(tmp_path: Path) -> None:
    edges = Axis.make(("dose", "0.1", "0.7")).edges(211)
    path = csv(tmp_path / "edges.csv", {"dose": edges, "response": np.zeros(edges.size)})
    ds = atlas.bin_points(path, (("dose", "0.1", "0.7"), ("response", 0, 1)), size=(211, 1))
    assert ds.counts.values.tolist() == [[*[1] * 210, 2]]


def test_blanks_quotes_and_a_byte_order_mark_belong_to_no_name_or_number(
    tmp_path: Path,
) -> None:
    path = tmp_path / "points.csv"
    path.write_bytes(b'\xef\xbb\xbf"dose", response \r\n"1", 0.5\r\n+2.0, 5e-1 \r\n\r\nNA,0.1\r\nnan,\r\n')
    ds = atlas.bin_points(path, AXES, size=(10, 2))
    assert (ds.attrs["points"], ds.attrs["missing"]) == (4, 2)
    assert ds.counts.values.sum(axis=1).tolist() == [0, 2]


def test_integers_and_decimals_of_a_parquet_file_are_numbers(tmp_path: Path) -> None:
    table = {
        "dose": pa.array([1, 2, 2**60 + 1, None], pa.int64()),
        "response": pa.array(["0.25", "0.50", "0.25", "0.25"]).cast(pa.decimal128(5, 2)),
    }
    ds = atlas.bin_points(parquet(tmp_path / "points.parquet", table), AXES, size=(10, 2))
    assert ds.counts.values.sum() == 2
    assert (ds.attrs["across_above"], ds.attrs["missing"]) == (1, 1)


def test_a_file_is_never_held_whole(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("atlas.points.files.BLOCK", 1 << 15)
    count = 200_000
    table = {"dose": np.linspace(0, 10, count), "response": np.sin(np.arange(count))}
    text = csv(tmp_path / "a.csv", table)
    many = {name: np.tile(values, 15) for name, values in table.items()}
    one_group = parquet(tmp_path / "a.parquet", many, row_group_size=15 * count, use_dictionary=False)
    del many
    before = pa.total_allocated_bytes()
    for path, rows, most in ((text, count, 3e6), (one_group, 15 * count, 15e6)):
        sizes, held = [], []
        for chunk in table_of(path).chunks("dose", "response", 10_000):
            sizes.append(chunk[0].size)
            held.append(pa.total_allocated_bytes() - before)
        assert sum(sizes) == rows
        assert max(sizes) <= 10_000
        assert max(held) < most < path.stat().st_size / 2, path.suffix


def test_chunks_are_taken_one_at_a_time() -> None:
    def chunks() -> Iterator[dict[str, NDArray[np.float64]]]:
        for number in range(30):
            yield {"dose": np.full(100_000, number / 3), "response": np.zeros(100_000)}

    tracemalloc.start()
    ds = atlas.bin_points(chunks(), AXES, size=(30, 4), rows_per_chunk=10_000)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert ds.exposure.values.tolist() == [100_000] * 30
    assert peak < 3 * 1.6e6


# Intervals


def test_open_ends_are_those_of_the_points() -> None:
    table = {"dose": [0.0123, 9.987, 5.0, np.nan], "response": [-3.0, 7.25, 1.0, 1e9]}
    ds = atlas.bin_points(table, ("dose", ("response", None, 8)), size=(3, 3))
    assert (ds.dose.attrs["low"], ds.dose.attrs["high"]) == ("0.01", "9.99")
    assert (ds.response.attrs["low"], ds.response.attrs["high"]) == ("-3", "8")
    assert ds.attrs["inside"] == 3
    log = atlas.bin_points(
        {"dose": [0.0123, 987.6], "response": [0, 1]},
        ({"name": "dose", "scale": "log", "label": "dose given"}, "response"),
        size=(5, 2),
    )
    assert (log.dose.attrs["low"], log.dose.attrs["high"]) == ("0.0123", "988")
    assert (log.dose.attrs["scale"], log.dose.attrs["long_name"]) == ("log", "dose given")
    assert log.exposure.values.tolist() == [1, 0, 0, 0, 1]


@given(
    ends=st.tuples(st.floats(-1e300, 1e300), st.floats(-1e300, 1e300)).map(sorted),
    logarithmic=st.booleans(),
)
def test_an_interval_is_widened_to_few_digits_and_by_little(ends: list[float], logarithmic: bool) -> None:
    low, high = ends
    if logarithmic:
        low, high = sorted(max(abs(end), 1e-290) for end in ends)
    first, last = readable(low, high, logarithmic=logarithmic)
    assert float(first) <= low <= high <= float(last)
    assert first < last
    assert not logarithmic or first.value > 0
    if low < high:
        size = atlas.Axis.make(("x", low, high))
        span = size.high.value - size.low.value
        assert size.low.value - first.value <= span / 100
        assert last.value - size.high.value <= span / 100
    assert atlas.Axis.make(("x", str(first), str(last))).high == last


def test_equal_values_get_an_interval_around_them() -> None:
    assert [str(end) for end in readable(5.0, 5.0)] == ["4.99", "5.01"]
    assert [str(end) for end in readable(0.0, 0.0)] == ["-1", "1"]
    assert [str(end) for end in readable(0.02, 0.02, logarithmic=True)] == ["0.0199", "0.0201"]


# Datasets


def test_a_dataset_can_be_saved_and_drawn_and_carries_its_certificate(tmp_path: Path) -> None:
    from matplotlib.figure import Figure

    path = csv(tmp_path / "stock.csv", points())
    ds = atlas.bin_points(path, AXES, size=SIZE)
    ds.to_netcdf(tmp_path / "stock.nc", engine="h5netcdf")
    record = atlas.read_certificate(tmp_path / "stock.nc")
    assert record["kind"] == "points"
    assert record["counts_digest"] == ds.attrs["counts_digest"]
    assert record["config"]["resolution"] == list(SIZE)
    assert record["config"]["points"] == {
        "file": "stock.csv",
        "digest": hashlib.blake2b(path.read_bytes(), digest_size=16).hexdigest(),
        "columns": {"across": "dose", "up": "response"},
    }
    assert record["shares"]["missing"] == ds.attrs["missing"] / ds.attrs["points"]
    assert str(tmp_path) not in str(record)
    image = atlas.draw_axes(Figure().subplots(), ds)
    assert image.get_array().shape[:2] == SIZE[::-1]


def test_a_dataset_beyond_the_memory_is_refused_before_anything_is_read() -> None:
    with pytest.raises(TooLarge, match="a Dataset of 60000 x 60000 cells would need"):
        atlas.bin_points("absent.csv", AXES, size=(60000, 60000))


# Plates


def test_a_plate_shows_the_counts_of_its_own_pixels(tmp_path: Path) -> None:
    from PIL import Image

    from atlas.points.plates import draw_points
    from tiles.shading import colour_table, fit_counts, shade_counts

    path = csv(tmp_path / "stock.csv", points(20_000))
    out = [tmp_path / "stock.png", tmp_path / "again.png"]
    made = [
        draw_points(path, ("dose", 0, 10), ("response", -1, 1), [file], size="600x400px", palette="grey")
        for file in out
    ]
    assert out[0].read_bytes() == out[1].read_bytes()
    assert atlas.read_certificate(out[0]) == made[0].record
    columns, rows = made[0].record["config"]["resolution"]
    ds = atlas.bin_points(path, AXES, size=(columns, rows))
    assert ds.attrs["counts_digest"] == made[0].record["counts_digest"]
    counts, exposure = ds.counts.values.T.copy(), ds.exposure.values
    fit = fit_counts(counts, exposure, 2 / rows)
    expected = colour_table("grey")[shade_counts(counts, exposure, 2 / rows, fit).T[::-1]]
    with Image.open(out[0]) as image:
        page = np.asarray(image.convert("RGB"))
    assert page.shape == (400, 600, 3)
    spots = np.lib.stride_tricks.sliding_window_view(page[:, :, 0], expected.shape[1], axis=1)
    found = [
        (top, left)
        for top in range(400 - rows + 1)
        for left in range(600 - columns + 1)
        if (spots[top, left] == expected[0, :, 0]).all()
        and (page[top : top + rows, left : left + columns] == expected).all()
    ]
    assert len(found) == 1


def test_the_command_writes_every_format_and_says_what_is_not_drawn(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = csv(tmp_path / "Größe 1.csv", points())
    out = [tmp_path / "out" / f"stock.{suffix}" for suffix in ("png", "tif", "pdf", "svg")]
    words = ["--across", "dose=0:10", "--up", "response=-1:", "--size", "60x45", "--dpi", "100", "--key"]
    words += ["--label-across", "dose given", "--title", "Invented data", "--shading", "logarithmic"]
    code, said, told = run(capsys, path, *words, *(word for file in out for word in ("--out", file)))
    assert code == 0
    assert said.split() == [str(file) for file in out]
    assert told.count("\n") == 1
    assert "of 5000 points" in told
    assert "lack a number" in told
    assert "lie outside 'dose' from 0 to 10" in told
    records = [atlas.read_certificate(file) for file in out]
    assert all(record == records[0] for record in records)
    settings = records[0]["config"]["settings"]
    assert settings["across"]["label"] == "dose given"
    assert settings["shading"] == "logarithmic"
    assert records[0]["name"] == "Gr_e_1"
    assert not (tmp_path / "out" / ".parts").exists()
    code, said, _ = run_command(capsys, "show", out[2])
    assert code == 0
    assert '"kind": "points"' in said


def test_points_that_are_all_drawn_need_no_words(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = csv(tmp_path / "a.csv", {"dose": [1.0, 2.0], "response": [3.0, 4.0]})
    out = tmp_path / "a.png"
    assert run(capsys, path, "--across", "dose", "--up", "response", "--out", out) == (0, f"{out}\n", "")


# Tile sets


@pytest.mark.parametrize("width", [1, 64, 100, 256, 512])
def test_strips_from_the_disk_are_those_of_the_whole(width: int, tmp_path: Path) -> None:
    grid = Grid.of(View(*AXES), 512, 40)
    table, whole = points(3000), StripCounter(0, 512, 40)
    with Spool(tmp_path, 512, 40) as spool:
        for chunk in table_of(table).chunks("dose", "response", 500):
            columns, codes = Account().placed(chunk, grid)
            whole.add(columns, codes)
            spool.add(columns, codes)
        expected = whole.strip()
        expected.check()
        for first in range(0, 512, width):
            last = min(first + width, 512)
            strip = spool.source(first, last)
            strip.check()
            assert strip.first == first
            np.testing.assert_array_equal(strip.counts, expected.counts[first:last])
            np.testing.assert_array_equal(strip.numbers, expected.numbers[:, first:last])
        assert not list(tmp_path.iterdir())


def tile_set(out: Path, table: Any, **options: Any) -> Any:
    """Make a small tile set; return what became of its points."""
    from atlas.points.tile_sets import tile_points

    return tile_points(table, *AXES, out, **{"levels": 1, "pairs": "all", **options})


def test_a_tile_set_holds_the_counts_of_the_dataset(tmp_path: Path) -> None:
    from tiles.grid import Address
    from tiles.index import Index

    path = parquet(tmp_path / "stock.parquet", points(20_000))
    made = tile_set(tmp_path / "out", path)
    ds = atlas.bin_points(path, AXES, size=(512, 512))
    with Index.open(tmp_path / "out" / "stock" / "index.sqlite") as index:
        assert index.certificate == made.record
        assert index.pairs == ((0, 0), (0, 1), (1, 0), (1, 1))
        for name in PER_COLUMN:
            np.testing.assert_array_equal(index.columns(1)[name], ds[name].to_numpy())
        for column in range(2):
            for row in range(2):
                part = ds.counts.values[row * 256 : row * 256 + 256, column * 256 : column * 256 + 256]
                np.testing.assert_array_equal(index.get(Address(1, 1, column, row)), part.T)
        whole = ds.counts.values.reshape(256, 2, 256, 2).sum(axis=(1, 3))
        np.testing.assert_array_equal(index.get(Address(0, 0, 0, 0)), whole.T)
        assert made.record["counts_digest"] == index.counts_digest()
    assert made.record["kind"] == "points"
    assert made.record["samples"]["points"] == 20_000
    site = tmp_path / "out" / "stock" / "site"
    assert (site / "tiles" / "density" / "0" / "0" / "0" / "0.png").is_file()
    assert "20000 points of stock.parquet" in (site / "meta.js").read_text("ascii")
    assert sorted(entry.name for entry in (tmp_path / "out").iterdir()) == ["stock"]


def test_a_tile_set_does_not_depend_on_workers_or_chunks(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    one = tile_set(tmp_path / "one", points(), workers=1)
    monkeypatch.setattr("atlas.points.tile_sets.ROWS_PER_CHUNK", 321)
    monkeypatch.setattr("atlas.output.tileset.CELLS_PER_STRIP", 512 * 32)
    other = tile_set(tmp_path / "other", (chunk for chunk in [points()]), workers=3)
    assert one == other


def test_an_interrupted_tile_set_leaves_nothing_and_goes_on(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    expected = tile_set(tmp_path / "whole", points(), workers=1)
    asked: list[int] = []
    real = Spool.source

    def source(spool: Spool, first: int, last: int) -> Any:
        asked.append(first)
        if len(asked) == 2:
            raise KeyboardInterrupt
        return real(spool, first, last)

    monkeypatch.setattr(Spool, "source", source)
    out = tmp_path / "out"
    with pytest.raises(KeyboardInterrupt):
        tile_set(out, points(), workers=1)
    assert not any((out / "points").iterdir())
    assert [file.name for file in (out / ".parts").glob("*.sqlite")] == ["points.sqlite"]
    assert tile_set(out, points(), workers=1) == expected
    assert asked[2:] == asked[1:2], "only the tile column that was missing is counted"
    asked.clear()
    with pytest.raises(KeyboardInterrupt):
        tile_set(out, points(), workers=1, name="other")
    tile_set(out, points(seed=1), workers=1, name="other")
    assert sorted(asked[2:]) == [0, 256], "other points are counted from the start"


def test_the_command_makes_a_tile_set(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = csv(tmp_path / "stock.csv", points(2000))
    words = ["--across", "dose=0.1:10", "--scale-across", "log", "--up", "response", "--levels", "1,0"]
    code, said, told = run(capsys, path, *words, "--name", "trial", "--out", tmp_path)
    assert code == 0, told
    assert said == f"{tmp_path / 'trial' / 'site' / 'index.html'}\n"
    assert "lie outside 'dose' from 0.1 to 10" in told
    record = atlas.read_certificate(tmp_path / "trial" / "index.sqlite")
    assert record["config"]["resolution"] == [512, 256]
    assert record["config"]["settings"]["across"]["scale"] == "log"
    page = tmp_path / "again"
    assert run_command(capsys, "site", tmp_path / "trial" / "index.sqlite", "--out", page)[0] == 0
    assert (page / "index.html").is_file()


# Refusals


def run_command(capsys: pytest.CaptureFixture[str], *words: object) -> tuple[int, str, str]:
    """Run the command line; return its exit code, standard output and standard error."""
    from atlas.cli import main

    with pytest.raises(SystemExit) as end:
        main([str(word) for word in words])
    said, told = capsys.readouterr()
    assert isinstance(end.value.code, int)
    return end.value.code, said, told


def run(capsys: pytest.CaptureFixture[str], *words: object) -> tuple[int, str, str]:
    """Run ``atlas bin``."""
    return run_command(capsys, "bin", *words)


FILES = {
    "good.csv": b"dose,response,site\n1,2,north\n3,4,south\n",
    "empty.csv": b"",
    "head.csv": b"dose,response\n",
    "ragged.csv": b"dose,response\n1,2\n3\n",
    "words.csv": b"dose,response\n1,2\n3,high\n",
    "nothing.csv": b"dose,response\n,2\nnan,3\n1,inf\n",
    "twice.csv": b"dose,response,dose\n1,2,3\n",
    "picture.csv": b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR\0\0",
    "latin.csv": "dose,größe\n1,2\n".encode("latin-1"),
    "zero.csv": b"dose,response\n0,1\n0.5,2\n",
    "text.parquet": b"dose,response\n1,2\n",
    "good.txt": b"dose,response\n1,2\n",
}
REFUSED = [
    ("absent.csv", ["dose", "response"], "absent.csv: there is no such file"),
    ("folder.csv", ["dose", "response"], "this is a folder"),
    ("good.txt", ["dose", "response"], "points are read from .csv and .parquet, not from .txt"),
    ("empty.csv", ["dose", "response"], "the file is empty"),
    ("head.csv", ["dose", "response"], "no row in which both 'dose' and 'response' are finite"),
    ("head.csv", ["dose=0:1", "response=0:1"], "no row in which both 'dose' and 'response' are finite"),
    ("nothing.csv", ["dose=0:1", "response=0:1"], "no row in which both"),
    ("nothing.csv", ["dose", "response"], "no row in which both"),
    ("ragged.csv", ["dose", "response"], "row 3 (the head is row 1) has 1 fields and the head 2"),
    ("words.csv", ["dose", "response"], "the column 'response' holds 'high' in row 3"),
    ("twice.csv", ["dose", "response"], "two columns are called 'dose'"),
    ("picture.csv", ["dose", "response"], "this is no CSV text"),
    ("latin.csv", ["dose", "response"], "this is no CSV text in UTF-8"),
    ("text.parquet", ["dose", "response"], "this is no whole Parquet file"),
    ("kinds.parquet", ["dose", "when"], "the column 'when' holds values of type timestamp"),
    ("kinds.parquet", ["dose", "name"], "the column 'name' holds values of type string"),
    ("kinds.parquet", ["dose", "true"], "the column 'true' holds values of type bool"),
    ("good.csv", ["dos", "response"], "there is no column 'dos'; did you mean 'dose'?"),
    ("good.csv", ["dose", "zzz"], "there is no column 'zzz'; allowed: dose, response, site"),
    ("good.csv", ["dose", "site"], "the column 'site' holds 'north' in row 2"),
    ("good.csv", ["dose", "dose"], "--up: 'dose' stands on both axes"),
    ("good.csv", ["dose=5", "response"], "there is no column 'dose=5'; did you mean 'dose'?"),
    (
        "good.csv",
        ["dose=2:1", "response"],
        "--across: axis 'dose': the interval from 2 to 1 is empty or reversed",
    ),
    ("good.csv", ["dose=9:", "response"], "the interval from 9 to 3 is empty or reversed"),
    ("good.csv", ["dose=a:b", "response"], "--across.low: 'a' is not a number"),
    ("good.csv", ["dose=0:1e999", "response"], "--across.high"),
    ("good.csv", ["dose=1:1.0000000000000001", "response"], "cells that float64 can tell apart"),
    ("good.csv", ["=0:1", "response"], "--across.name"),
    ("good.csv", ["dose=0:1", "response", "--scale-across", "log"], "a log axis cannot start at 0"),
    ("good.csv", ["dose=0:", "response", "--scale-across", "log"], "a log axis cannot start at 0"),
    (
        "zero.csv",
        ["dose", "response", "--scale-across", "log"],
        "give the low end; the smallest value above 0 is 0.5",
    ),
    (
        "good.csv",
        ["dose", "response", "--scale-up", "lag"],
        "--scale-up: 'lag' is unknown; did you mean 'log'?",
    ),
    (
        "good.csv",
        ["dose", "response", "--palette", "gray"],
        "--palette: 'gray' is unknown; did you mean 'grey'?",
    ),
    ("good.csv", ["dose", "response", "--size", "1x1"], "leaves no room"),
    ("good.csv", ["dose", "response", "--size", "99999x99999px"], "good: 99999 x 99999 pixels would need"),
    ("good.csv", ["dose", "response", "--title", "日本"], "font"),
    ("good.csv", ["dose", "response", "--pairs", "all"], "--pairs: this belongs to a tile set; add --levels"),
    ("good.csv", ["dose", "response", "--name", "a/b"], "--name: 'a/b' cannot name an output"),
    ("good.csv", ["dose", "response", "--memory", "1kB"], "--memory"),
    ("good.csv", ["dose", "response", "--levels", "deep"], "--levels: 'deep' is not"),
    ("good.csv", ["dose", "response", "--levels", "3,"], "--levels: '3,' is no pair of levels"),
    ("good.csv", ["dose", "response", "--levels", "12,12"], "--levels: 12 across and 12 up are too deep"),
    ("good.csv", ["dose", "response", "--levels", "99"], "--levels: 99 across and 99 up are too deep"),
    ("good.csv", ["dose", "response", "--levels", "2", "--pairs", "some"], "--pairs: 'some' is unknown"),
    ("good.csv", ["dose", "response", "--levels", "2", "--dpi", "100"], "--dpi: this belongs to a picture"),
]


@pytest.mark.parametrize(("file", "words", "reason"), REFUSED, ids=lambda given: str(given)[:60])
def test_a_wrong_request_is_one_sentence_and_leaves_nothing(
    file: str, words: list[str], reason: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "folder.csv").mkdir()
    for name, content in FILES.items():
        (tmp_path / name).write_bytes(content)
    parquet(
        tmp_path / "kinds.parquet",
        {"dose": [1.0], "when": pa.array([1], pa.timestamp("s")), "name": ["a"], "true": [True]},
    )
    out = tmp_path / "out"
    target = out if "--levels" in words else out / "a.png"
    code, said, told = run(capsys, tmp_path / file, "--across", words[0], "--up", *words[1:], "--out", target)
    assert (code, said) == (2, "")
    assert told.startswith("atlas: ")
    assert told.count("\n") == 1
    assert reason in told
    assert not [found for found in out.rglob("*") if found.is_file()]


def test_outputs_are_checked_before_the_points_are_counted(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = csv(tmp_path / "a.csv", points(50))
    axes = ["--across", "dose", "--up", "response"]
    (tmp_path / "file").touch()
    for words, reason in (
        (["--out", tmp_path / "a.gif"], "has no suffix of a picture"),
        (["--out", tmp_path / "a.png", "--out", tmp_path / "b.png"], "are both png"),
        (["--out", tmp_path / "file" / "a.png"], "cannot be written to"),
        (["--levels", "1", "--out", tmp_path / "file"], "cannot be written to"),
        (["--levels", "1", "--out", tmp_path / "x", "--out", tmp_path / "y"], "give --out once"),
        ([], "--out is missing"),
    ):
        code, _, told = run(capsys, path, *axes, *words)
        assert (code, told.count("\n")) == (2, 1)
        assert reason in told


@pytest.mark.parametrize(
    ("table", "reason"),
    [
        (5, "a value of type int holds no points"),
        (b"dose,response", "a value of type bytes holds no points"),
        ([np.zeros((3, 2))], "points, chunk 1: columns have no names"),
        ({"dose": [1, 2], "response": [1]}, "holds 2 values and 'response' 1"),
        ({"dose": ["a", "b"], "response": [1, 2]}, "the column 'dose' holds texts, not numbers"),
        ({"dose": [True, False], "response": [1, 2]}, "the column 'dose' holds truth values"),
        ({"dose": [[1, 2], [3, 4]], "response": [1, 2]}, "has 2 dimensions"),
        ({"dose": [1.0, "x"], "response": [1, 2]}, "not numbers"),
        ({"dose": np.array(["2020-01-01"], "M8[D]"), "response": [1]}, "holds dates"),
        (pd.DataFrame({"dose": ["a"], "response": [1]}), "not numbers"),
        (pd.DataFrame({"dose": pd.to_datetime(["2020-01-01"]), "response": [1]}), "holds dates"),
        (pd.DataFrame({"a": [1]}), "there is no column 'dose'; allowed: a"),
        (pd.DataFrame([[1, 2, 3]], columns=["dose", "dose", "response"]), "two columns are called 'dose'"),
        ({f"column {n}": [1] for n in range(50)}, "among its 50 columns are column 0"),
        ([], "no row in which both"),
        ([{"dose": [1], "response": [1]}, {"dose": [1]}], "points, chunk 2: there is no column 'response'"),
    ],
)
def test_values_that_hold_no_points_are_refused(table: Any, reason: str) -> None:
    with pytest.raises(PointsRefused) as caught:
        atlas.bin_points(table, AXES, size=(3, 3))
    assert reason in str(caught.value)
    assert "\n" not in str(caught.value)


def test_axes_are_refused_as_those_of_any_view() -> None:
    table = points(10)
    for axes, reason in (
        (("dose", 5), "up: .* is no axis"),
        ((("dose", 0), "response"), "across: a list is no axis"),
        (({"name": "dose", "hi": 3}, "response"), "the key 'hi' is unknown"),
        (({"low": 3}, "response"), "the key 'name' is missing"),
    ):
        with pytest.raises(Refusal, match=reason):
            atlas.bin_points(table, axes, size=(3, 3))  # type: ignore[arg-type]
    with pytest.raises(PlanRefused, match="rows_per_chunk: 0"):
        atlas.bin_points(table, AXES, size=(3, 3), rows_per_chunk=0)


def test_points_that_can_be_read_once_need_their_ends() -> None:
    once = iter([points(10)])
    with pytest.raises(PointsRefused, match="can be read only once, so both axes need their ends"):
        atlas.bin_points(once, ("dose", ("response", 0, 1)), size=(3, 3))
    assert atlas.bin_points(once, AXES, size=(3, 3)).attrs["points"] == 10


def test_a_wrong_word_far_down_a_file_is_found_in_its_row(tmp_path: Path) -> None:
    path = tmp_path / "long.csv"
    lines = [f"{number},0.25\n" for number in range(300_000)]
    lines[250_000] = "oops,0.25\n"
    path.write_text("dose,response\n" + "".join(lines), "ascii")
    assert path.stat().st_size > 3 << 20
    with pytest.raises(PointsRefused, match="'dose' holds 'oops' in row 250002"):
        atlas.bin_points(path, AXES, size=(3, 3))


def test_a_column_of_more_points_than_a_count_holds_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("atlas.points.counting.MOST", 99)
    table = {"dose": np.ones(100), "response": np.zeros(100)}
    with pytest.raises(PointsRefused, match="a column gets more than 99 points"):
        atlas.bin_points(table, AXES, size=(3, 3), rows_per_chunk=30)


@given(data=st.binary(max_size=300), head=st.sampled_from([b"", b"dose,response\n", b"dose;response\n1;2\n"]))
def test_no_bytes_give_a_traceback(
    data: bytes, head: bytes, tmp_path_factory: pytest.TempPathFactory
) -> None:
    for suffix in ("csv", "parquet"):
        path = tmp_path_factory.getbasetemp() / f"bytes.{suffix}"
        path.write_bytes(head + data)
        message = ""
        try:
            atlas.bin_points(path, ("dose", "response"), size=(3, 3))
        except Refusal as problem:
            message = str(problem)
        assert "\n" not in message
