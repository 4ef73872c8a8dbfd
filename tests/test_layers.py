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
 0  tiles tiles.page tiles.page_files tiles.errors tiles.tasks tiles.colour_tables
 1  tiles.number tiles.grid tiles.strip tiles.palette tiles.tally tiles.key tiles.png tiles.store
 1  tiles.site_folder
 2  tiles.window tiles.pyramid tiles.curve tiles.classes tiles.side_car
 3  tiles.codec tiles.shading tiles.stages tiles.values tiles.mixing tiles.plane
 4  tiles.column tiles.index tiles.meta tiles.value_codec
 5  tiles.unfinished tiles.plane_index tiles.plane_meta
 6  tiles.build tiles.plane_build tiles.plane_site
 7  tiles.site

10  atlas.errors atlas.arithmetic atlas.config atlas.families atlas.figure atlas.formula atlas.orbits
10  atlas.output atlas.planes atlas.planes.fates atlas.planes.plane_kernels atlas.points atlas.reading
10  atlas.orbits.lane_kernels atlas.orbits.orbit_kernels
10  atlas.config.draws
12  atlas.orbits.block atlas.output.remarks
11  atlas.arithmetic.functions atlas.orbits.schedule atlas.figure.lettering atlas.output.reporter
11  atlas.output.whole_file
12  atlas.formula.tree atlas.reading.place atlas.figure.tick_labels atlas.output.folders atlas.output.ledger
13  atlas.formula.algebra atlas.formula.grammar atlas.formula.formula_text atlas.formula.evaluation
13  atlas.formula.symbolic
13  atlas.arithmetic.float64 atlas.reading.kinds atlas.reading.yaml_text atlas.reading.sheet
13  atlas.figure.ticks atlas.figure.axes_image atlas.output.certificate_reader atlas.points.tables
14  atlas.formula.differentiation atlas.orbits.volumes atlas.reading.section atlas.figure.boxes
14  atlas.points.files atlas.points.cells
15  atlas.formula.expression atlas.reading.view_kinds atlas.figure.pieces atlas.figure.vector_files
15  atlas.points.opening atlas.reading.orbit_kinds
16  atlas.families.kinds atlas.families.records atlas.families.patterns atlas.families.wrapping
16  atlas.families.rows_one_variable atlas.families.rows_several_variables
16  atlas.reading.sheet_kinds atlas.figure.painting
16  atlas.points.intervals atlas.reading.start_kinds
17  atlas.families.keys atlas.families.map_family atlas.families.checks
17  atlas.config.settings atlas.figure.raster_files atlas.figure.typeset
18  atlas.families.reader atlas.config.keys
19  atlas.families.catalogue atlas.config.jobs atlas.config.view_rules atlas.config.view_kind
19  atlas.config.names
20  atlas.config.schema
20  atlas.orbits.step atlas.config.digests atlas.config.assembly atlas.figure.panels
21  atlas.points.jobs
21  atlas.orbits.kernel_source atlas.orbits.setting atlas.config.load atlas.output.certificate
21  atlas.figure.margins
21  atlas.figure.insets
22  atlas.orbits.orbit atlas.planes.plane_source atlas.planes.pixels atlas.config.remake
22  atlas.figure.layout atlas.figure.legends
23  atlas.planes.turns
24  atlas.planes.finder
25  atlas.planes.layers
24  atlas.output.colouring
26  atlas.planes.survey atlas.planes.searching atlas.output.panel atlas.output.panels
27  atlas.planes.plane_dataset atlas.output.panels.histogram atlas.output.panels.plane
23  atlas.orbits.sampling atlas.orbits.histogram atlas.plan atlas.figure.drawing
23  atlas.orbits.portrait
24  atlas.orbits.follow atlas.orbits.portrait_counts atlas.points.counting atlas.figure.plate
25  atlas.orbits.counting
26  atlas.orbits.counts
27  atlas.orbits.portrait_dataset
28  atlas.output.printing atlas.output.tiled
25  atlas.points.record atlas.points.spool
29  atlas.output.plane_tiles atlas.output.tileset atlas.points.binning atlas.points.plates
30  atlas.output.tile_makers
31  atlas.output.forecast
32  atlas.output.batch atlas.points.tile_sets

40  atlas.cli.options atlas.cli.progress atlas.cli.sentences atlas.cli.tables atlas.cli.family_text
40  atlas.cli.requests atlas.cli.point_requests
41  atlas.cli.colour_options
42  atlas.cli.bin atlas.cli.check atlas.cli.draw atlas.cli.families atlas.cli.render atlas.cli.schema
42  atlas.cli.show atlas.cli.site
43  atlas.cli
44  atlas
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
    "xarray": ("atlas.orbits.counts", "atlas.orbits.portrait_dataset", "atlas.planes.plane_dataset"),
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
