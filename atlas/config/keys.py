"""The table of keys: what a plate, a tile set and a figure may hold, with type, default and meaning.

The reader, the ``defaults`` section, the editor schema and the documentation all come from these rows.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Any

from atlas.config.draws import DENSITIES, DRAWS, FOLLOWED, PLANES
from atlas.config.settings import SettingsKind
from atlas.reading.kinds import Colour, Measure, OrWord, Text, Truth, Whole, Word, Words
from atlas.reading.orbit_kinds import NumbersKind, RecordKind
from atlas.reading.section import Key
from atlas.reading.sheet import Size
from atlas.reading.sheet_kinds import FactorKind, InsetKind, PanelsKind, SizeKind
from atlas.reading.start_kinds import StartsKind
from atlas.reading.view_kinds import AxisKind, Levels, LevelsKind, PairsKind
from tiles.grid import PAIRS
from tiles.palette import PALETTES
from tiles.shading import SHADINGS

FORMATS = {"png": ".png", "tiff": ".tif", "pdf": ".pdf", "svg": ".svg"}
SHARED_AXES = ("across", "up")
MOST_SAMPLES = 10**12
TRANSIENT_LIMIT = 1_000_000

_TITLE = Key("title", Text(), None, "Title of the picture or of the page.")
_SIZE = Key(
    "size",
    SizeKind(),
    Size(Fraction(180), Fraction(110)),
    "Size of the whole sheet: millimetres (180x110) or pixels (1200x800px).",
    shared=True,
)
_DPI = Key("dpi", Whole(10, 100_000), 300, "Pixels per inch of the printed sheet.", shared=True)
_FORMATS = Key(
    "formats",
    Words(tuple(FORMATS), synonyms=(("tif", "tiff"),)),
    ("png",),
    "Files to be written: png, tiff (or tif), pdf, svg.",
    shared=True,
)
_FONT = Key("font_size", Measure(3, 72), 8.0, "Size of the lettering in points.", shared=True)

JOB_KEYS: tuple[Key[Any], ...] = (
    Key(
        "family",
        Text(what="the name of a family"),
        None,
        "A family of this file or of the catalogue.",
        True,
        counts=True,
    ),
    Key(
        "across",
        AxisKind(),
        None,
        "Horizontal axis: a parameter, state variable or observable with its interval.",
        True,
        counts=True,
    ),
    Key(
        "up",
        AxisKind(),
        None,
        "Vertical axis: a parameter, state variable or observable with its interval.",
        True,
        counts=True,
    ),
    Key(
        "draw",
        Word(tuple(DRAWS)),
        None,
        f"What is drawn: {', '.join(DRAWS)}; by default density, or fate over two parameters.",
        counts=True,
    ),
    Key("set", SettingsKind(), {}, "Values of parameters and patterns that run along no axis.", counts=True),
    Key(
        "starts",
        StartsKind(),
        None,
        "States that orbits start from: a list, or a grid over a box.",
        counts=True,
    ),
    Key(
        "follow",
        Word(FOLLOWED),
        None,
        "Each column starts where its neighbour ended: up, down or both ways along the parameter.",
        counts=True,
        only_for=("histogram", "follow"),
    ),
    Key(
        "record",
        RecordKind(),
        None,
        "Counts only every so many steps, at a phase: {every: 12, phase: 3}.",
        counts=True,
        only_for=("histogram", "portrait"),
    ),
    Key(
        "by_attractor",
        Truth(),
        False,
        "Whether the density of each attractor has a colour of its own.",
        counts=True,
        only_for=("histogram", "portrait"),
    ),
    Key(
        "extinct",
        NumbersKind("state variables", above_zero=True),
        None,
        "Sizes below which a state variable counts as extinct; by default the family's.",
        counts=True,
        only_for=PLANES,
    ),
    _TITLE,
    Key(
        "transient",
        Whole(0, 10**12),
        1000,
        "Steps of each orbit that are left out before sampling.",
        shared=True,
        counts=True,
    ),
    Key(
        "transient_limit",
        Whole(0, 10**12),
        TRANSIENT_LIMIT,
        "Steps up to which the transient of an orbit that has not settled is extended.",
        shared=True,
        counts=True,
    ),
    Key(
        "samples",
        OrWord("auto", Whole(1, MOST_SAMPLES)),
        "auto",
        "Samples of each orbit; auto gives a mean of at least 8 counts in each cell of the occupied range.",
        shared=True,
        counts=True,
        only_for=DENSITIES,
    ),
    Key(
        "steps",
        Whole(64, 10**9),
        2000,
        "Steps looked at after the transient in parameter planes and basin charts.",
        shared=True,
        counts=True,
        only_for=PLANES,
    ),
    Key(
        "values_per_column",
        Whole(1, 4096),
        32,
        "Parameter values, evenly spread, that each column of pixels averages over.",
        shared=True,
        counts=True,
        only_for=("histogram", "follow"),
    ),
    Key(
        "longest_period",
        Whole(1, 4096),
        64,
        "Longest cycle that is looked for to tell whether an orbit has settled.",
        shared=True,
        counts=True,
    ),
    Key(
        "shading",
        Word(SHADINGS),
        "equalised",
        f"How density becomes shade: {', '.join(SHADINGS)}.",
        shared=True,
        only_for=DENSITIES,
    ),
    Key("palette", Word(tuple(PALETTES)), None, "Colours; by default those for what is drawn.", shared=True),
    Key("background", Colour(), None, "Colour of empty cells; by default the palette's.", shared=True),
    Key(
        "missing",
        Colour(),
        None,
        "Colour where nothing was sampled; by default the palette's.",
        shared=True,
    ),
)

PLATE_KEYS: tuple[Key[Any], ...] = (
    *JOB_KEYS,
    _SIZE,
    _DPI,
    _FORMATS,
    _FONT,
    Key("key", Truth(), False, "Whether a colour key stands beside the picture.", shared=True),
    Key("letter", Text(3), None, "Panel letter at the upper left corner."),
    Key(
        "supersampling",
        FactorKind((1, 2, 4)),
        1,
        "Points along each side of a pixel of a parameter plane or basin chart, whose colours are mixed.",
        shared=True,
        only_for=PLANES,
    ),
    Key("inset", InsetKind(), None, "A part of the window, magnified and drawn over a corner."),
)

TILE_SET_KEYS: tuple[Key[Any], ...] = (
    *JOB_KEYS,
    Key(
        "levels",
        LevelsKind(),
        Levels(4, 4),
        "Deepest level; level k has 2**k tiles an axis.",
        shared=True,
    ),
    Key(
        "pairs",
        PairsKind(PAIRS),
        "diagonal",
        "Level pairs that are built: diagonal, all, or a list.",
        shared=True,
    ),
)

FIGURE_KEYS: tuple[Key[Any], ...] = (
    Key(
        "panels",
        PanelsKind(),
        None,
        "Plates: one row, or rows from the top down.",
        required=True,
    ),
    Key(
        "share",
        Words(SHARED_AXES, fewest=0),
        (),
        "Axes whose labels stand once: across for panels above each other, up for panels side by side.",
    ),
    Key(
        "letters",
        Truth(),
        None,
        "Whether the panels carry the letters a, b, c; by default where there are at least two.",
        shared=True,
    ),
    _TITLE,
    _SIZE,
    _DPI,
    _FORMATS,
    _FONT,
)

SECTIONS: dict[str, tuple[Key[Any], ...]] = {
    "plates": PLATE_KEYS,
    "tile_sets": TILE_SET_KEYS,
    "figures": FIGURE_KEYS,
}

DEFAULT_KEYS: tuple[Key[Any], ...] = tuple(
    {key.name: key for keys in SECTIONS.values() for key in keys if key.shared}.values()
)

CONFIG_KEYS: dict[str, str] = {
    "title": "Title of the whole file; tile sets without a title of their own carry it.",
    "families": "Families of your own; those of the catalogue need no entry.",
    "defaults": "Values for every plate, tile set and figure below that does not give its own.",
    "plates": "Figures at a print size, by name.",
    "tile_sets": "Zoomable tile sets, by name.",
    "figures": "Several plates as panels of one sheet, by name.",
}
