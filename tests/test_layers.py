"""The layers of the code: every module has a number and imports only modules with smaller ones.

``tiles`` lies below ``atlas`` and never imports it; every heavy library is imported by its own home only, and
nothing heavy is loaded before it is needed.
"""

from __future__ import annotations

import ast
import subprocess
import sys
from functools import cache
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]

TABLE = """
 0  tiles tiles.colour_tables tiles.errors tiles.key tiles.page tiles.page_files tiles.png
 0  tiles.site_folder tiles.strip tiles.tally tiles.tasks
 1  tiles.curve tiles.grid tiles.number tiles.palette tiles.store
 2  tiles.classes tiles.codec tiles.mixing tiles.pyramid tiles.side_car tiles.stages tiles.values
 2  tiles.window
 3  tiles.column tiles.plane tiles.shading tiles.value_codec
 4  tiles.index tiles.meta
 5  tiles.plane_index tiles.plane_meta tiles.unfinished
 6  tiles.build tiles.plane_build tiles.plane_site
 7  tiles.site

10  atlas.arithmetic atlas.arithmetic.functions atlas.attractors atlas.config atlas.config.draws
10  atlas.errors atlas.families atlas.families.rows_one_variable atlas.families.rows_several_variables
10  atlas.figure atlas.figure.lettering atlas.formula atlas.orbits atlas.orbits.lane_kernels
10  atlas.orbits.orbit_kernels atlas.output atlas.output.panels atlas.output.remarks
10  atlas.output.reporter atlas.output.whole_file atlas.planes atlas.planes.fates
10  atlas.planes.plane_kernels atlas.planes.turn_kernels atlas.points atlas.reading atlas.reading.sheet
11  atlas.figure.axes_image atlas.figure.tick_labels atlas.formula.tree atlas.orbits.block
11  atlas.orbits.schedule atlas.output.certificate_reader atlas.output.folders atlas.output.ledger
11  atlas.reading.place
12  atlas.arithmetic.float64 atlas.figure.ticks atlas.formula.algebra atlas.formula.evaluation
12  atlas.formula.formula_text atlas.formula.grammar atlas.formula.symbolic atlas.points.tables
12  atlas.reading.kinds atlas.reading.yaml_text
13  atlas.figure.boxes atlas.formula.differentiation atlas.orbits.volumes atlas.output.dataset_parts
13  atlas.points.cells atlas.points.files atlas.reading.section
14  atlas.figure.pieces atlas.figure.vector_files atlas.formula.expression atlas.planes.pixels
14  atlas.points.opening atlas.reading.orbit_kinds atlas.reading.view_kinds
15  atlas.attractors.ends atlas.families.kinds atlas.families.patterns atlas.families.records
15  atlas.families.wrapping atlas.figure.painting atlas.output.colouring atlas.planes.turns
15  atlas.points.intervals atlas.reading.sheet_kinds atlas.reading.start_kinds
16  atlas.config.settings atlas.families.checks atlas.families.keys atlas.families.map_family
16  atlas.figure.raster_files atlas.figure.typeset atlas.output.inking atlas.planes.layers
17  atlas.config.keys atlas.families.reader
18  atlas.config.jobs atlas.config.names atlas.config.view_kind atlas.config.view_rules
18  atlas.families.catalogue atlas.orbits.step
19  atlas.config.assembly atlas.config.digests atlas.config.schema atlas.figure.panels
19  atlas.orbits.kernel_source atlas.orbits.setting atlas.output.certificate atlas.output.panel
20  atlas.attractors.kernels atlas.config.load atlas.figure.insets atlas.figure.margins
20  atlas.orbits.orbit atlas.output.tiled atlas.planes.plane_source atlas.points.jobs
21  atlas.config.remake atlas.figure.layout atlas.figure.legends atlas.orbits.histogram
21  atlas.orbits.portrait atlas.orbits.sampling atlas.plan atlas.planes.exponents atlas.planes.finder
22  atlas.attractors.per_pixel atlas.attractors.registry atlas.figure.drawing atlas.orbits.follow
22  atlas.orbits.portrait_counts atlas.planes.searching atlas.planes.spectrum atlas.points.counting
23  atlas.attractors.by_start atlas.figure.plate atlas.orbits.counting atlas.planes.survey
23  atlas.points.record atlas.points.spool
24  atlas.attractors.basins atlas.attractors.split_counts atlas.orbits.counts
24  atlas.output.panels.histogram atlas.output.panels.plane atlas.planes.plane_dataset
25  atlas.attractors.basin_dataset atlas.orbits.portrait_dataset atlas.output.panels.basin
25  atlas.output.panels.follow atlas.points.binning
26  atlas.output.panels.portrait
27  atlas.output.panels.split
28  atlas.output.printing
29  atlas.output.plane_tiles atlas.output.tileset atlas.points.plates
30  atlas.output.whole_tiles
31  atlas.output.tile_makers
32  atlas.output.forecast
33  atlas.output.batch atlas.points.tile_sets

50  atlas.cli.family_text atlas.cli.options atlas.cli.point_requests atlas.cli.progress
50  atlas.cli.requests atlas.cli.sentences atlas.cli.tables
51  atlas.cli atlas.cli.check atlas.cli.colour_options atlas.cli.families atlas.cli.render
51  atlas.cli.schema atlas.cli.show
52  atlas.cli.bin atlas.cli.draw atlas.cli.site
53  atlas
"""
LAYERS = {module: int(row.split()[0]) for row in TABLE.split("\n") if row for module in row.split()[1:]}

HOMES = {
    "click": ("atlas.cli",),
    "colorcet": ("tiles.palette",),
    "dask": ("atlas.orbits.schedule",),
    "datashader": ("tiles.shading",),
    "h5netcdf": ("atlas.output.certificate_reader",),
    "matplotlib": ("atlas.figure.typeset",),
    "numba": ("atlas.orbits.step", "atlas.arithmetic"),
    "pandas": ("atlas.points",),
    "PIL": ("atlas.figure.raster_files",),
    "pyarrow": ("atlas.points",),
    "rich": ("atlas.cli",),
    "sympy": ("atlas.formula.symbolic",),
    "xarray": (
        "atlas.attractors.basin_dataset",
        "atlas.orbits.counts",
        "atlas.orbits.portrait_dataset",
        "atlas.planes.plane_dataset",
        "atlas.planes.spectrum",
    ),
    "yaml": ("atlas.reading.yaml_text",),
}
NEEDED_LATE = ("dask", "datashader", "matplotlib", "numba", "numpy", "pandas", "sympy", "xarray")
LAZY = ("atlas", "atlas.cli")


def _modules() -> dict[str, Path]:
    found = {}
    for folder in ("atlas", "tiles"):
        for path in (ROOT / folder).rglob("*.py"):
            name = ".".join(path.relative_to(ROOT).with_suffix("").parts)
            found[name.removesuffix(".__init__")] = path
    return found


MODULES = _modules()


@cache
def _imports(module: str) -> set[str]:
    """Return the full names that a file imports anywhere: at its top, in functions, for type checkers."""
    found = set()
    for node in ast.walk(ast.parse(MODULES[module].read_text("utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{module} imports relatively"
            found |= {_whole(str(node.module), alias.name) for alias in node.names}
    return found


def _whole(module: str, name: str) -> str:
    return f"{module}.{name}" if f"{module}.{name}" in LAYERS else module


def _inside(module: str, package: str) -> bool:
    return module == package or module.startswith(f"{package}.")


def test_the_table_names_every_module_once_and_no_other() -> None:
    listed = TABLE.split()
    assert sorted(LAYERS) == sorted(word for word in listed if not word.isdigit())
    assert sorted(MODULES) == sorted(LAYERS)


@pytest.mark.parametrize("module", sorted(set(MODULES) - {"atlas"}))
def test_a_module_imports_only_modules_of_smaller_numbers(module: str) -> None:
    own = {name for name in _imports(module) if name.split(".")[0] in ("atlas", "tiles")}
    assert own <= set(LAYERS), f"{module} imports what is not there"
    above = {name for name in own if LAYERS[name] >= LAYERS[module]}
    assert not above, f"{module} ({LAYERS[module]}) must not import {sorted(above)}"


def test_the_library_never_imports_the_application() -> None:
    for module in MODULES:
        if _inside(module, "tiles"):
            assert not {name for name in _imports(module) if _inside(name, "atlas")}, module
    assert max(number for module, number in LAYERS.items() if _inside(module, "tiles")) < min(
        number for module, number in LAYERS.items() if _inside(module, "atlas")
    )


@pytest.mark.parametrize("library", sorted(HOMES))
def test_a_heavy_library_has_one_home(library: str) -> None:
    users = {
        module
        for module in MODULES
        if any(_inside(name, library) for name in _imports(module))
        if not any(_inside(module, home) for home in HOMES[library])
    }
    assert not users


def test_packages_import_nothing_by_themselves() -> None:
    for module, path in MODULES.items():
        if path.name == "__init__.py" and module not in LAZY:
            assert _imports(module) <= {"__future__"}, module


def test_modules_are_imported_by_name_only_where_the_table_cannot_see_it() -> None:
    users = {module for module, path in MODULES.items() if "import_module" in path.read_text("utf-8")}
    assert users == set(LAZY)


@pytest.mark.parametrize(
    "first", ["import atlas", "import atlas.cli", "import atlas.cli; atlas.cli.main(['--help'])"]
)
def test_nothing_heavy_is_loaded_before_it_is_needed(first: str) -> None:
    script = f"import atexit, sys\natexit.register(lambda: print(*sys.modules, file=sys.stderr))\n{first}\n"
    ran = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    loaded = {name.split(".")[0] for name in ran.stderr.split()}
    assert "atlas" in loaded
    assert not loaded & set(NEEDED_LATE)
    assert ("render" in ran.stdout) == ("--help" in first)
