"""What notebooks call: every public name twice, Datasets as promised, their files and pictures."""

from __future__ import annotations

import ast
import json
import math
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray
from hypothesis import given, settings
from hypothesis import strategies as st

import atlas
from tests.atlas.rendered import SMALL, command, config
from tests.test_layers import MODULES
from tiles.errors import Refusal, TooLarge
from tiles.strip import PER_COLUMN

VIEW = atlas.View(across=("r", "2.8", "4"), up=("x", 0, 1))
QUICK: dict[str, Any] = {"size": (60, 40), "samples": 200, "transient": 200, "transient_limit": 2000}


def logistic(**more: Any) -> xarray.Dataset:
    """Return the orbit histogram of the logistic map, small."""
    counted: xarray.Dataset = atlas.orbit_counts(atlas.family("logistic"), VIEW, **{**QUICK, **more})
    return counted


@pytest.fixture(scope="module")
def ds() -> xarray.Dataset:
    return logistic()


# Names


def _axes() -> Any:
    from matplotlib.figure import Figure

    return Figure().add_subplot()


def _points(folder: Path) -> Any:
    return atlas.bin_points({"a": [0.1, 0.6], "b": [0.5, 0.5]}, (("a", 0, 1), ("b", 0, 1)), size=(2, 2))


def _plate(folder: Path) -> Any:
    return atlas.plate("logistic", ("r", 3, 4), ("x", 0, 1), size="320x200px", dpi=100, samples=50)


def _record(folder: Path) -> Any:
    atlas.draw_plate(_plate(folder), [folder / "a.png"])
    return atlas.read_certificate(folder / "a.png")


POINTS = {"dose": [0.5, 1.5, 1.5], "response": [0.2, 0.2, 0.9]}
AXES: tuple[Any, Any] = ("dose", 0, 2), ("response", 0, 1)


def _tiled(folder: Path) -> Any:
    return atlas.tile_points(POINTS, *AXES, folder, name="tiled", levels=1)


def _rebuilt(folder: Path) -> bytes:
    _tiled(folder)
    atlas.rebuild_site(str(folder / "tiled/index.sqlite"), str(folder / "again"), palette="grey")
    return (folder / "again/index.html").read_bytes()


STATES = atlas.View(across=("x", "-1.5", "1.5"), up=("y", "-0.5", "0.5"))
FORCED = atlas.View(across=("a", 3, 4), up=("b", 3, 4))

CALLS: dict[str, Callable[[Path], Any]] = {
    "Axis": lambda folder: atlas.Axis.make(("r", 0, "1/3")),
    "View": lambda folder: atlas.View(across=("r", "2.8", "4"), up=("x", 0, 1)),
    "basins": lambda folder: atlas.basins(
        atlas.family("henon"), STATES, size=(6, 4), transient=100, steps=64
    ),
    "bin_points": _points,
    "draw_axes": lambda folder: atlas.draw_axes(_axes(), logistic()).get_array().tolist(),
    "draw_plate": lambda folder: atlas.draw_plate(_plate(folder), [folder / "a.png"]),
    "draw_points": lambda folder: atlas.draw_points(POINTS, *AXES, [folder / "a.png"], name="points"),
    "family": lambda folder: atlas.family("ricker"),
    "family_names": lambda folder: atlas.family_names,
    "load": lambda folder: atlas.load(SMALL),
    "lyapunov_spectrum": lambda folder: atlas.lyapunov_spectrum(
        atlas.family("henon"), {"a": "1.2"}, [{"x": 0, "y": 0}], 1000
    ),
    "needs": lambda folder: [record.name for record, _ in atlas.needs(SMALL)],
    "orbit_counts": lambda folder: logistic(),
    "parameter_plane": lambda folder: atlas.parameter_plane(
        atlas.family("forced_logistic"), FORCED, size=(6, 4), transient=100, steps=64
    ),
    "parse_config": lambda folder: atlas.parse_config(SMALL.read_bytes()),
    "phase_portrait": lambda folder: atlas.phase_portrait(
        atlas.family("henon"), STATES, size=(6, 4), samples=500
    ),
    "plate": _plate,
    "read_certificate": _record,
    "rebuild_site": _rebuilt,
    "render": lambda folder: [one.name for one in atlas.render(config(), folder, only=["rise"])],
    "schema": lambda folder: atlas.schema(),
    "tile_points": _tiled,
}


@pytest.mark.parametrize("name", atlas.__all__)
def test_every_public_name_can_be_called_again_and_again(name: str, tmp_path: Path) -> None:
    once, twice = CALLS[name](tmp_path), CALLS[name](tmp_path)
    if isinstance(once, xarray.Dataset):
        xarray.testing.assert_identical(once, twice)
    else:
        assert once == twice
    assert getattr(atlas, name).__doc__


def test_no_module_has_the_name_of_a_call() -> None:
    assert not {f"atlas.{name}" for name in atlas.__all__} & set(MODULES)
    assert dir(atlas) == atlas.__all__


def test_an_unknown_name_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="module 'atlas' has no attribute 'orbit_count'"):
        atlas.orbit_count  # noqa: B018


def test_type_checkers_see_every_public_name() -> None:
    tree = ast.parse(Path(atlas.__file__).read_text("utf-8"))
    block = next(node for node in tree.body if isinstance(node, ast.If))
    seen = {
        alias.asname
        for node in block.body
        if isinstance(node, ast.ImportFrom)
        for alias in node.names
        if alias.name == alias.asname
    }
    seen |= {node.targets[0].id for node in block.body if isinstance(node, ast.Assign)}  # type: ignore[attr-defined]
    assert seen == set(atlas.__all__)


# Datasets


def test_a_dataset_has_the_axes_own_names_up_first(ds: xarray.Dataset) -> None:
    assert ds.counts.dims == ds.density.dims == ("x", "r")
    assert ds.sizes == {"x": 40, "r": 60}
    assert set(ds.data_vars) == {"counts", "density", *PER_COLUMN}
    assert all(ds[name].dims == ("r",) for name in PER_COLUMN)
    assert ds.counts.dtype == np.uint32
    assert ds.density.dtype == np.float64


def test_coordinates_are_cell_centres_ascending(ds: xarray.Dataset) -> None:
    low, width = Fraction("2.8"), Fraction("1.2") / 60
    assert ds.r.values.tolist() == [float(low + (2 * c + 1) * width / 2) for c in range(60)]
    assert ds.x.values.tolist() == [(2 * row + 1) / 80 for row in range(40)]
    assert ds.r.attrs == {
        "long_name": "growth rate",
        "units": "",
        "scale": "linear",
        "low": "2.8",
        "high": "4",
    }


def test_nothing_is_dropped_silently(ds: xarray.Dataset) -> None:
    view = atlas.View(across=("r", "2.9", "4.3"), up=("x", "0.3", "0.7"))
    tight = atlas.orbit_counts(
        atlas.family("logistic"), view, size=(60, 400), samples=200, transient=20, transient_limit=30
    )
    for one in (ds, tight):
        sums = one.counts.sum("x").astype(np.uint64)
        for name in ("below", "above", "escaped", "unsettled"):
            sums = sums + one[name]
        assert (sums == one.exposure).all()
    assert all(tight[name].sum() > 0 for name in ("below", "above", "escaped", "unsettled"))


def test_density_is_the_share_of_samples_per_unit_of_the_state(ds: xarray.Dataset) -> None:
    cell = ds.attrs["cell_size"]
    assert cell == 0.025
    assert (ds.density == ds.counts / (ds.exposure * cell)).all()
    inside = ds.counts.sum("x") / ds.exposure
    np.testing.assert_allclose((ds.density * cell).sum("x"), inside, rtol=1e-12)


def test_a_log_axis_has_centres_in_the_exponent_and_density_per_log_unit() -> None:
    view = atlas.View(across=("r", "2.8", "4"), up={"name": "x", "low": "0.01", "high": 1, "scale": "log"})
    counted = atlas.orbit_counts(atlas.family("logistic"), view, **QUICK)
    assert counted.attrs["cell_size"] == pytest.approx(math.log(100) / 40, rel=1e-15)
    np.testing.assert_allclose(counted.x, 0.01 * 100 ** ((np.arange(40) + 0.5) / 40), rtol=1e-14)
    assert counted.x.attrs["scale"] == "log"
    assert (counted.density == counted.counts / (counted.exposure * counted.attrs["cell_size"])).all()


def test_results_do_not_depend_on_workers_memory_or_how_numbers_are_written(ds: xarray.Dataset) -> None:
    xarray.testing.assert_identical(logistic(workers=1, memory="1GiB"), ds)
    xarray.testing.assert_identical(logistic(workers=7, memory=2**40), ds)
    as_floats = atlas.View(across=("r", 2.8, 4.0), up=("x", Fraction(0), 1.0))
    again = atlas.orbit_counts(atlas.family("logistic"), as_floats, **QUICK)
    assert again.attrs["counts_digest"] == ds.attrs["counts_digest"]


def test_counts_are_those_of_a_plate_of_the_same_request(tmp_path: Path) -> None:
    plate = atlas.plate(
        "logistic",
        ("r", "2.8", 4),
        ("x", 0, 1),
        size="320x200px",
        dpi=100,
        samples=200,
        transient=200,
        values_per_column=4,
    )
    record = atlas.draw_plate(plate, [tmp_path / "a.png"]).record
    sampled = record["samples"]["plate"]
    counted = logistic(size=(sampled["columns"], sampled["rows"]), transient_limit=None)
    assert counted.attrs["counts_digest"] == record["counts_digest"]


def test_automatic_samples_fill_the_cells(ds: xarray.Dataset) -> None:
    chosen = logistic(samples="auto")
    assert chosen.attrs["samples"] >= 256
    mean = chosen.counts.sum("x") / (chosen.counts > 0).sum("x")
    assert mean.min() >= 8


def test_settings_and_starts_are_used() -> None:
    family = atlas.load(SMALL).families["sound"]
    view = atlas.View(across=("r", "1.6", "2"), up=("n", 0, 2))
    plain = atlas.orbit_counts(family, view, **QUICK)
    for more in ({"set": {"h": "0.4"}}, {"set": {"h": 0.1}}):
        other = atlas.orbit_counts(family, view, **QUICK, **more)
        assert other.attrs["counts_digest"] != plain.attrs["counts_digest"]
    twice = atlas.orbit_counts(family, view, **QUICK, starts=[{"n": 0.1}, {"n": Fraction(1, 3)}])
    assert (twice.exposure == 2 * plain.exposure).all()
    assert (plain.n.attrs["units"], plain.n.attrs["long_name"]) == ("kt", "stock")


WRONG: list[tuple[dict[str, Any], str]] = [
    ({"size": (0, 40)}, "size[1]: '0' is out of range"),
    ({"size": (60, 2.5)}, "size[2]: '2.5' is not a whole number"),
    ({"size": 60}, "size: '60' is no resolution; write (columns, rows)"),
    ({"size": (60,)}, "size: a list is no resolution"),
    ({"samples": 0}, "samples: '0' is out of range"),
    ({"samples": "many"}, "samples: 'many' is not auto, or a whole number"),
    ({"samples": 1 << 31}, "samples a column are more than a count can hold; use at most 1073741823 samples"),
    ({"transient": -1}, "transient: '-1' is out of range"),
    ({"transient": 5000}, "transient_limit: the limit 2000 is below the transient 5000; raise it"),
    ({"values_per_column": 0}, "values_per_column: '0' is out of range"),
    ({"longest_period": None, "samples": True}, "samples: 'True' is not a whole number"),
    ({"set": {"r": 3}}, "set.r: 'r' already runs along an axis; remove it here"),
    ({"set": {"k": 3}}, "set: the family 'logistic' has no parameter 'k'; allowed: r"),
    ({"starts": [{"y": 1}]}, "starts[1]: the family 'logistic' has no state variable 'y'; allowed: x"),
    ({"starts": []}, "starts: an empty list is not a list of states"),
    ({"starts": [{"x": float("nan")}]}, "starts[1].x: 'nan' is not a number"),
    ({"workers": 0}, "workers: 0 is not a whole number from 1 to 1024"),
    ({"workers": 2.0}, "workers: 2.0 is not a whole number from 1 to 1024"),
    ({"memory": "1MiB"}, "1MiB is too little"),
]


@pytest.mark.parametrize(("more", "sentence"), WRONG)
def test_a_wrong_request_gets_one_sentence(more: dict[str, Any], sentence: str) -> None:
    with pytest.raises(Refusal) as caught:
        logistic(**{key: value for key, value in more.items() if value is not None})
    assert sentence in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("across", "up", "sentence"),
    [
        (("r", 3, 4), ("y", 0, 1), "up: the family 'logistic' has no parameter or state variable 'y'"),
        (("x", 0, 1), ("r", 3, 4), r"across: a state variable \(x\) across and a parameter .* swap the axes"),
        (("r", 3, "3.0000000000000002"), ("x", 0, 1), "finer than float64 can resolve"),
    ],
)
def test_a_wrong_view_gets_one_sentence(across: Any, up: Any, sentence: str) -> None:
    with pytest.raises(Refusal, match=sentence):
        atlas.orbit_counts(atlas.family("logistic"), atlas.View(across=across, up=up), **QUICK)


def test_counts_of_orbits_are_of_a_parameter_and_a_state() -> None:
    plane = atlas.View(across=("growth", 5, 100), up=("beta", 2, 10))
    with pytest.raises(Refusal, match="view: growth across and beta up make a parameter plane; put a param"):
        atlas.orbit_counts(atlas.family("hassell"), plane, **QUICK)
    portrait = atlas.View(across=("x", -2, 2), up=("y", -1, 1))
    with pytest.raises(Refusal, match="view: x across and y up make a phase portrait; put a parameter"):
        atlas.orbit_counts(atlas.family("henon"), portrait, **QUICK)


def test_a_result_that_does_not_fit_is_refused_with_its_size() -> None:
    with pytest.raises(TooLarge, match=r"a Dataset of 20000 x 20000 cells would need 6\.\d GiB of"):
        logistic(size=(20_000, 20_000))


NUMBERS = st.floats() | st.text(max_size=4)


@settings(max_examples=60)
@given(
    st.fixed_dictionaries(
        {},
        optional={
            "size": st.tuples(*[st.integers(-2, 9) | st.floats() | st.text(max_size=3)] * 2),
            "samples": st.integers(-3, 40) | st.floats() | st.text(max_size=4) | st.booleans(),
            "transient": st.integers(-3, 40) | st.text(max_size=4),
            "values_per_column": st.integers(-1, 5) | st.none(),
            "starts": st.lists(
                st.dictionaries(st.sampled_from("xyr"), st.floats() | st.text(max_size=4)), max_size=3
            ),
            "set": st.dictionaries(st.sampled_from("xrk"), st.floats() | st.text(max_size=4), max_size=2),
            "workers": st.integers(-1, 3) | st.text(max_size=2),
            "memory": st.text(max_size=4) | st.integers(),
        },
    )
)
def test_any_request_is_counted_or_refused(more: dict[str, Any]) -> None:
    said = ""
    try:
        counted = logistic(**{"transient_limit": 60, "size": (4, 4), **more})
    except Refusal as problem:
        said = str(problem)
    assert said.isprintable()
    assert said or (counted.exposure % counted.attrs["samples"] == 0).all()


# Files and pictures


def test_a_dataset_comes_back_from_netcdf_with_its_certificate(ds: xarray.Dataset, tmp_path: Path) -> None:
    path = tmp_path / "rise.nc"
    ds.to_netcdf(path, engine="h5netcdf")
    with xarray.open_dataset(path, engine="h5netcdf") as opened:
        xarray.testing.assert_identical(opened.load(), ds)
        assert {name: opened[name].dtype for name in opened} == {name: ds[name].dtype for name in ds}
    assert atlas.read_certificate(path) == json.loads(ds.attrs["atlas-certificate"])
    assert json.loads(command("show", path).stdout) == atlas.read_certificate(path)


def test_the_certificate_of_a_dataset_says_how_it_was_made(ds: xarray.Dataset) -> None:
    text = ds.attrs["atlas-certificate"]
    assert text.isascii()
    record = json.loads(text)
    assert (record["record"], record["kind"], record["name"]) == (1, "dataset", "logistic")
    assert record["counts_digest"] == ds.attrs["counts_digest"]
    assert record["config"]["resolution"] == [60, 40]
    assert record["config"]["settings"]["across"]["low"] == "2.8"
    assert record["config"]["settings"]["samples"] == 200
    assert record["config"]["family"]["step"] == {"x": "r * x * (1 - x)"}
    assert record["samples"]["of_each_column"] == int(ds.exposure[0])
    assert record["shares"]["unsettled"] == int(ds.unsettled.sum()) / int(ds.exposure.sum())
    assert "palette" not in text


def test_a_dataset_is_drawn_into_axes_that_are_there_already(ds: xarray.Dataset, tmp_path: Path) -> None:
    path = tmp_path / "rise.nc"
    ds.to_netcdf(path, engine="h5netcdf")
    axes = _axes()
    image = atlas.draw_axes(axes, ds, shading="logarithmic", palette="grey", background="#ffeedd")
    assert image.axes is axes
    assert (axes.get_xlim(), axes.get_ylim()) == ((2.8, 4.0), (0.0, 1.0))
    assert "growth rate" in axes.get_xlabel()
    assert image.get_array().shape == (40, 60, 3)
    assert np.array_equal(image.get_array()[0, 0], (0xFF, 0xEE, 0xDD))
    with xarray.open_dataset(path, engine="h5netcdf") as opened:
        again = atlas.draw_axes(_axes(), opened, shading="logarithmic", palette="grey", background="#ffeedd")
    assert np.array_equal(again.get_array(), image.get_array())


def test_a_plate_is_drawn_without_a_config(tmp_path: Path) -> None:
    plate = atlas.plate(
        "logistic",
        ("r", "3.5", 4),
        {"name": "x", "low": "0.1", "high": 1, "scale": "log"},
        set={},
        starts=[{"x": "0.2"}],
        size="320x200px",
        dpi=100,
        samples=50,
        palette="grey",
    )
    made = atlas.draw_plate(plate, [tmp_path / "a.svg", str(tmp_path / "b.tif")], workers=2)
    assert made.samples > 0
    assert (
        atlas.read_certificate(tmp_path / "a.svg")
        == atlas.read_certificate(tmp_path / "b.tif")
        == made.record
    )
    with pytest.raises(Refusal, match="palette"):
        atlas.plate("logistic", ("r", 3, 4), ("x", 0, 1), palette="gray")


def test_a_config_holds_families_plates_tile_sets_and_figures() -> None:
    found = atlas.load(SMALL)
    assert list(found.families) == ["sound"]
    assert list(found.plates) == ["growth", "rise"]
    assert list(found.tile_sets) == ["tiles"]
    assert list(found.figures) == ["both"]
    assert found.plates["rise"].view == VIEW


# Calls instead of commands


def test_a_path_is_rendered_as_the_config_it_names(tmp_path: Path) -> None:
    (made,) = atlas.render(str(SMALL), str(tmp_path), only=["rise"])
    assert (made.name, made.status) == ("rise", "made")


NO_ARGUMENT: list[tuple[Callable[[], Any], str]] = [
    (lambda: atlas.load(3), "path: '3' is no path"),  # type: ignore[arg-type]
    (lambda: atlas.render(3), "config: '3' is no config"),  # type: ignore[arg-type]
    (lambda: atlas.render(SMALL, 5), "out: '5' is no path"),  # type: ignore[arg-type]
    (lambda: atlas.render("nowhere.yaml"), "nowhere.yaml: there is no such file"),
    (lambda: atlas.orbit_counts(atlas.family("tent"), (("r", 1, 2), ("x", 0, 1)), **QUICK), "view: a list"),  # type: ignore[arg-type]
    (lambda: atlas.bin_points({"a": [1]}, ("a",), size=(2, 2)), "view: a list is no view"),  # type: ignore[arg-type]
    (lambda: atlas.plate("logistic", ("r", 4, 1), ("x", 0, 1)), "across: axis 'r'"),
    (lambda: atlas.plate("logistic", ("r", 3, 4), ("x", 0, 1), draw="fate"), "draw: 'fate' cannot be drawn"),
    (
        lambda: atlas.plate("logistic", ("r", 3, 4), ("x", 0, 1), steps=99),
        "steps: '99' belongs to a parameter",
    ),
    (
        lambda: atlas.plate("logistic", ("r", 3, 4), ("x", 0, 1), record=3),
        "record: '3' stands where a mapping",
    ),
    (
        lambda: atlas.plate(
            "logistic", ("r", 3, 4), ("x", 0, 1), starts={"grid": [9999], "box": {"x": (0, 1)}}
        ),
        "starts.grid: a grid of 9999 has 9999 starts; at most 4096 are allowed",
    ),
    (
        lambda: atlas.draw_points({"a": [1], "b": [2]}, "a", "b", ["a.png"], palette="balance"),
        "palette: 'balance' is a diverging palette and density needs a sequential one",
    ),
    (lambda: atlas.rebuild_site("a.sqlite", "site", palette="gray"), "palette: 'gray'"),
    (lambda: atlas.rebuild_site(3, "site"), "index: '3' is no path"),  # type: ignore[arg-type]
]


@pytest.mark.parametrize(("call", "sentence"), NO_ARGUMENT)
def test_a_wrong_argument_gets_one_sentence(call: Callable[[], Any], sentence: str) -> None:
    with pytest.raises(Refusal) as caught:
        call()
    assert str(caught.value).startswith(sentence)


def test_a_zoom_beyond_float64_says_why_and_what_to_do() -> None:
    view = atlas.View(across=("r", "3.9", "3.900000000001"), up=("x", 0, 1))
    with pytest.raises(Refusal, match=r"rounding in the map grows to a cell.*use fewer rows, or make it at"):
        atlas.orbit_counts(atlas.family("logistic"), view, size=(4, 4000))
