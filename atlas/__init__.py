"""Bifurcation diagrams, parameter planes, phase portraits and basin charts of iterated maps.

Plates and zoomable tile sets from formulas in a YAML file.

Everything that the commands do is a call. Modules are imported when a name is first used, so that importing
the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from atlas.attractors.basin_dataset import basins as basins
    from atlas.config.load import load as load
    from atlas.config.load import parse_config as parse_config
    from atlas.config.load import plate_from_parts
    from atlas.config.schema import schema as schema
    from atlas.families.catalogue import NAMES
    from atlas.families.catalogue import family as family
    from atlas.figure.axes_image import draw_axes as draw_axes
    from atlas.orbits.counts import orbit_counts as orbit_counts
    from atlas.orbits.portrait_dataset import phase_portrait as phase_portrait
    from atlas.output.batch import needs as needs
    from atlas.output.batch import render as render
    from atlas.output.certificate import read
    from atlas.output.printing import draw_plate as draw_plate
    from atlas.output.tileset import rebuild_site as rebuild_site
    from atlas.planes.plane_dataset import parameter_plane as parameter_plane
    from atlas.planes.spectrum import lyapunov_spectrum as lyapunov_spectrum
    from atlas.points.binning import bin_points as bin_points
    from atlas.points.plates import draw_points as draw_points
    from atlas.points.tile_sets import tile_points as tile_points
    from tiles.window import Axis as Axis
    from tiles.window import View as View

    family_names = NAMES
    plate = plate_from_parts
    read_certificate = read

_HOMES = {
    "Axis": ("tiles.window", "Axis"),
    "View": ("tiles.window", "View"),
    "basins": ("atlas.attractors.basin_dataset", "basins"),
    "bin_points": ("atlas.points.binning", "bin_points"),
    "draw_axes": ("atlas.figure.axes_image", "draw_axes"),
    "draw_plate": ("atlas.output.printing", "draw_plate"),
    "draw_points": ("atlas.points.plates", "draw_points"),
    "family": ("atlas.families.catalogue", "family"),
    "family_names": ("atlas.families.catalogue", "NAMES"),
    "load": ("atlas.config.load", "load"),
    "lyapunov_spectrum": ("atlas.planes.spectrum", "lyapunov_spectrum"),
    "needs": ("atlas.output.batch", "needs"),
    "orbit_counts": ("atlas.orbits.counts", "orbit_counts"),
    "parameter_plane": ("atlas.planes.plane_dataset", "parameter_plane"),
    "parse_config": ("atlas.config.load", "parse_config"),
    "phase_portrait": ("atlas.orbits.portrait_dataset", "phase_portrait"),
    "plate": ("atlas.config.load", "plate_from_parts"),
    "read_certificate": ("atlas.output.certificate", "read"),
    "rebuild_site": ("atlas.output.tileset", "rebuild_site"),
    "render": ("atlas.output.batch", "render"),
    "schema": ("atlas.config.schema", "schema"),
    "tile_points": ("atlas.points.tile_sets", "tile_points"),
}
__all__ = sorted(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'atlas' has no attribute '{name}'")
    module, attribute = _HOMES[name]
    return getattr(import_module(module), attribute)


def __dir__() -> list[str]:
    return __all__
