"""What is to be made: plates, tile sets and figures as records, every default applied."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

from atlas.config.draws import kind_of_view
from atlas.families.reader import Family
from atlas.reading.orbit_kinds import Record
from atlas.reading.sheet import Inset, Size
from atlas.reading.sheet_kinds import Panels
from atlas.reading.view_kinds import Levels, Pairs
from tiles.grid import TILE
from tiles.number import Exact
from tiles.window import Axis, View

COUNTING_VERSION = 1


@dataclass(frozen=True, kw_only=True)
class Job:
    """One view of one family, how its orbits are run and how the result is coloured.

    Attributes
    ----------
    name : str
        Name of the output.
    family : Family
        The map.
    view : View
        A parameter across and a state variable or observable up, two parameters, or two of the latter.
    set : dict of str to Exact
        Parameters given a value, sorted by name.
    starts : tuple of dict of str to Exact
        States that the orbits start from, each complete.
    transient, transient_limit : int
        Steps left out before sampling, and the number to which they are extended at most.
    samples : int or "auto"
        Samples of each orbit.
    values_per_column : int
        Parameter values in each column.
    longest_period : int
        Longest cycle looked for.
    draw : str
        What is drawn, one of `atlas.config.draws.DRAWS` that the axes allow.
    follow : "up", "down", "both" or None
        Whether each column starts where its neighbour ended, and in which direction.
    record : Record or None
        Which states are counted; all without it.
    by_attractor : bool
        Whether the density is split by attractor.
    extinct : dict of str to Exact
        Sizes below which state variables count as extinct, sorted by name; empty but in planes and basins.
    steps : int
        Steps looked at after the transient in planes and basins.
    shading, palette : str
        Names out of `tiles.shading.SHADINGS` and `tiles.palette.PALETTES`.
    background, missing : str or None
        Colours ``#rrggbb``; None is the palette's own.
    title : str or None
        Title of the picture or page.
    """

    name: str
    family: Family
    view: View
    set: dict[str, Exact] = field(default_factory=dict)
    starts: tuple[dict[str, Exact], ...]
    transient: int
    transient_limit: int
    samples: int | str
    values_per_column: int
    longest_period: int
    draw: str = "density"
    follow: str | None = None
    record: Record | None = None
    by_attractor: bool = False
    extinct: dict[str, Exact] = field(default_factory=dict)
    steps: int = 2000
    shading: str
    palette: str
    background: str | None
    missing: str | None
    title: str | None

    @property
    def across(self) -> Axis:
        """The horizontal axis."""
        return self.view.across

    @property
    def up(self) -> Axis:
        """The vertical axis."""
        return self.view.up

    @property
    def kind(self) -> str:
        """The kind of view: ``histogram``, ``follow``, ``portrait``, ``plane`` or ``basin``."""
        return kind_of_view(self.draw, self.across.name in self.family.parameter_names, self.follow)

    def parameters(self) -> dict[str, Exact]:
        """Return the value of every parameter that runs along no axis, given or the family's default."""
        axes = (self.across.name, self.up.name)
        return {
            parameter.name: self.set.get(parameter.name, parameter.default)
            for parameter in self.family.parameters
            if parameter.name not in axes
        }


@dataclass(frozen=True, kw_only=True)
class Plate(Job):
    """A figure at a print size.

    Attributes
    ----------
    size : Size
        Of the whole sheet.
    dpi : int
        Pixels per inch.
    formats : tuple of str
        Out of `atlas.config.keys.FORMATS`.
    font_size : float
        In points.
    key : bool
        Whether a colour key is drawn.
    letter : str or None
        Panel letter.
    supersampling : int
        Points along each side of a pixel of a plane or basin; 1 elsewhere.
    inset : Inset or None
        A magnified part of the window.
    """

    size: Size
    dpi: int
    formats: tuple[str, ...]
    font_size: float
    key: bool
    letter: str | None
    supersampling: int = 1
    inset: Inset | None

    @property
    def pixels(self) -> tuple[int, int]:
        """Width and height of the sheet in pixels."""
        return self.size.pixels(self.dpi)

    def inset_plate(self) -> Plate | None:
        """Return the plate whose window is the inset of this one, to be counted by itself."""
        if self.inset is None:
            return None
        return replace(self, name=f"{self.name}/inset", view=self.inset.view, inset=None)


@dataclass(frozen=True, kw_only=True)
class TileSet(Job):
    """One view as a pyramid of tiles with its index and page.

    Attributes
    ----------
    levels : Levels
        Deepest level across and up.
    pairs : "diagonal", "all" or tuple of (int, int)
        Which level pairs are built.
    """

    levels: Levels
    pairs: str | Pairs

    @property
    def cells(self) -> tuple[int, int]:
        """Columns and rows at the deepest levels."""
        return TILE << self.levels.across, TILE << self.levels.up


@dataclass(frozen=True, kw_only=True)
class Figure:
    """Several plates as panels of one sheet.

    Attributes
    ----------
    name : str
        Name of the output.
    panels : tuple of tuple of str
        Names of plates, row by row from the top.
    plates : dict of str to Plate
        The plates by name, in the order of the panels.
    share : tuple of str
        ``across``: panels above each other have equal across axes, labelled once; ``up``: panels side by
        side have equal up axes, labelled once.
    letters : bool
        Whether panels carry letters.
    size, dpi, formats, font_size, title
        As for a plate; they hold for the whole sheet instead of what the plates say.
    """

    name: str
    panels: Panels
    plates: dict[str, Plate]
    share: tuple[str, ...]
    letters: bool
    size: Size
    dpi: int
    formats: tuple[str, ...]
    font_size: float
    title: str | None

    @property
    def pixels(self) -> tuple[int, int]:
        """Width and height of the sheet in pixels."""
        return self.size.pixels(self.dpi)
