"""An orbit histogram drawn into axes of matplotlib."""

from __future__ import annotations

import numpy as np
import pytest
import xarray
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from atlas.figure.plate import draw_axes
from tiles.shading import colour_table, fit_counts, shade_counts


def dataset(columns: int, rows: int, scale: str = "linear") -> xarray.Dataset:
    counts = np.random.default_rng(3).poisson(2.0, (rows, columns)).astype(np.uint32)
    across = 2.8 + (np.arange(columns) + 0.5) * 1.2 / columns
    if scale == "log":
        across = 0.01 * 10 ** ((np.arange(columns) + 0.5) * 4 / columns)
    coordinates = {
        "x": ("x", (np.arange(rows) + 0.5) / rows, {"long_name": "stock", "units": "kt"}),
        "r": ("r", across, {"scale": scale}),
    }
    exposure = np.full(columns, counts.sum(axis=0).max(), np.uint64)
    return xarray.Dataset({"counts": (("x", "r"), counts), "exposure": ("r", exposure)}, coordinates)


@pytest.mark.parametrize("scale", ["linear", "log"])
def test_each_cell_is_a_pixel_when_the_axes_are_as_large(scale: str) -> None:
    drawn = dataset(200, 120, scale)
    figure = Figure(figsize=(2, 1.2), dpi=100)
    canvas = FigureCanvasAgg(figure)
    axes = figure.add_axes((0, 0, 1, 1))
    draw_axes(axes, drawn, palette="teal")
    axes.set_axis_off()
    canvas.draw()
    pixels = np.asarray(canvas.buffer_rgba())[..., :3]
    counts = drawn["counts"].to_numpy().T
    exposure = drawn["exposure"].to_numpy()
    shades = shade_counts(counts, exposure, 1 / 120, fit_counts(counts, exposure, 1 / 120))
    assert np.array_equal(pixels, colour_table("teal")[shades.T[::-1]])


def test_scales_ends_and_labels() -> None:
    axes = Figure().add_subplot()
    axes.set_xlabel("kept")
    draw_axes(axes, dataset(40, 30, "log"), shading="logarithmic", background="#eeeeee")
    assert axes.get_xscale() == "log"
    assert axes.get_yscale() == "linear"
    assert axes.get_xlim() == pytest.approx((0.01, 100))
    assert axes.get_ylim() == pytest.approx((0, 1))
    assert axes.get_xlabel() == "kept"
    assert axes.get_ylabel() == "stock $x$ (kt)"
