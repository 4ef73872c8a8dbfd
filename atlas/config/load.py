"""Reading a config: from a YAML file, a mapping or the parts of one plate to checked records."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, TypeVar

from atlas import errors
from atlas.config.assembly import read_figure, read_plate, read_tile_set
from atlas.config.digests import counting_digest, digest, normalised
from atlas.config.jobs import COUNTING_VERSION, Figure, Job, Plate, TileSet
from atlas.config.keys import CONFIG_KEYS, DEFAULT_KEYS, SECTIONS
from atlas.config.names import check_distinct
from atlas.errors import ConfigRefused
from atlas.families import catalogue
from atlas.families.reader import Family, family_from_config
from atlas.reading.kinds import Text
from atlas.reading.place import COMMAND_LINE, REQUEST, Place, path_of, shown
from atlas.reading.section import text_keys
from atlas.reading.yaml_text import LARGEST_FILE, read_yaml
from tiles.errors import nearest
from tiles.window import Axis

__all__ = [
    "COMMAND_LINE",
    "COUNTING_VERSION",
    "Config",
    "Figure",
    "Job",
    "Plate",
    "TileSet",
    "counting_digest",
    "digest",
    "load",
    "normalised",
    "parse_config",
    "plate_from_parts",
]

LONGEST_PATH = 4096
R = TypeVar("R")
AxisLike = Axis | Sequence[Any] | Mapping[str, Any]


@dataclass(frozen=True)
class Config:
    """Everything that a config file asks for, checked, with every default applied.

    Attributes
    ----------
    title : str
        Title of the file, empty if it has none.
    families : dict of str to Family
        The families that the file defines itself, in its order.
    plates, tile_sets, figures : dict
        Records by name, in the order of the file.
    path : Path or None
        The file, if it came from one.
    """

    title: str
    families: dict[str, Family]
    plates: dict[str, Plate]
    tile_sets: dict[str, TileSet]
    figures: dict[str, Figure]
    path: Path | None = None

    def outputs(self) -> dict[str, Plate | TileSet | Figure]:
        """Return every output by name: plates, then tile sets, then figures."""
        return {**self.plates, **self.tile_sets, **self.figures}


def load(path: str | os.PathLike[str]) -> Config:
    """Read a config file.

    Parameters
    ----------
    path : path
        A YAML file of at most 1 MiB, in UTF-8.

    Returns
    -------
    Config

    Raises
    ------
    ConfigRefused, FamilyRefused, FormulaRefused
        With one sentence that names the file, the place, what was found and what is allowed.
    """
    path = path_of(path, REQUEST.at("path"))
    where = errors.shown(os.fspath(path), LONGEST_PATH)[1:-1]
    return parse_config(_file_content(path, where), where, path=path)


def parse_config(
    given: bytes | str | Mapping[str, Any], where: str = "config", *, path: Path | None = None
) -> Config:
    """Read a config from YAML text or from a mapping.

    Parameters
    ----------
    given : bytes, str or mapping
        The YAML text, or what it would hold; numbers in a mapping may be texts or Python numbers.
    where : str
        What a sentence calls the config.
    path : Path, optional
        The file that it came from.

    Returns
    -------
    Config

    Raises
    ------
    ConfigRefused, FamilyRefused, FormulaRefused
        As :func:`load`.

    Examples
    --------
    >>> config = parse_config("plates: {rise: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1]}}")
    >>> config.plates["rise"].pixels
    (2126, 1299)
    """
    place = Place(where)
    tree = read_yaml(given, where) if isinstance(given, bytes | str) else given
    for word in text_keys(tree, place):
        if word not in CONFIG_KEYS:
            raise place.refusal(f"the section {shown(word)} is unknown{nearest(word, CONFIG_KEYS)}")
    assert isinstance(tree, Mapping)
    return _Reader(tree, place).config(path)


class _Reader:
    """Reads the sections of one config in the order in which they need each other."""

    def __init__(self, tree: Mapping[str, Any], place: Place) -> None:
        self.tree = tree
        self.place = place
        self.families: dict[str, Family] = {}

    def config(self, path: Path | None) -> Config:
        title = self.tree.get("title")
        title = Text().read(title, self.place.at("title")) if title is not None else ""
        self.families = self._each("families", self._family)
        names = {section: tuple(self._section(section)) for section in SECTIONS}
        if not self.families and not any(names.values()):
            raise self.place.refusal("there is nothing to make here; add plates or tile_sets")
        defaults = self._defaults()
        titled = {"title": title or None} | defaults
        plates = self._each("plates", lambda n, x, at: read_plate(n, x, at, self.family, defaults))
        tile_sets = self._each("tile_sets", lambda n, x, at: read_tile_set(n, x, at, self.family, titled))
        figures = self._each("figures", lambda n, x, at: read_figure(n, x, at, plates, defaults))
        check_distinct(names, self.place)
        return Config(title, self.families, plates, tile_sets, figures, path)

    def family(self, name: str, place: Place) -> Family:
        """Return a family of this config or of the catalogue."""
        if name in self.families:
            return self.families[name]
        if name in catalogue.NAMES:
            return catalogue.family(name)
        hint = nearest(name, [*self.families, *catalogue.NAMES])
        raise place.refusal(f"there is no family {shown(name)}{hint}")

    def _section(self, section: str) -> Mapping[str, Any]:
        given = self.tree.get(section)
        if given is None or given == "":
            return {}
        text_keys(given, self.place.at(section))
        assert isinstance(given, Mapping)
        return given

    def _each(self, section: str, read: Callable[[str, Any, Place], R]) -> dict[str, R]:
        place = self.place.at(section)
        return {name: read(name, given, place.at(name)) for name, given in self._section(section).items()}

    def _family(self, name: str, given: Any, place: Place) -> Family:
        return family_from_config(name, given, where=str(place))

    def _defaults(self) -> dict[str, Any]:
        place = self.place.at("defaults")
        shared = {key.name: key for key in DEFAULT_KEYS}
        own = {key.name for keys in SECTIONS.values() for key in keys} - set(shared)
        values = {}
        for word, given in self._section("defaults").items():
            if word in own:
                raise place.refusal(f"the key '{word}' has no common default; give it where it belongs")
            if word not in shared:
                raise place.refusal(f"the key {shown(word)} is unknown{nearest(word, shared)}")
            values[word] = shared[word].read(given, place.at(word))
        return values


def plate_from_parts(
    family: Family | str,
    across: AxisLike,
    up: AxisLike,
    *,
    set: Mapping[str, Any] | None = None,
    starts: Sequence[Mapping[str, Any]] | Mapping[str, Any] | None = None,
    name: str = "plate",
    place: Place = REQUEST,
    **options: Any,
) -> Plate:
    """Return a plate without any file, checked as one from a file is.

    Parameters
    ----------
    family : Family or str
        A family, or the name of one of the catalogue.
    across, up : Axis, (name, low, high) or mapping
        The axes.
    set : mapping of str to number, optional
        Values of parameters; of a pattern ``{"pattern": ["a", "a", "b"]}``.
    starts : sequence of mapping of str to number, or mapping, optional
        States to start from, or ``{"grid": [8, 8], "box": {"x": [0, 1], "y": [0, 1]}}``.
    name : str
        Name of the output.
    place : Place
        How a refusal calls the parts: ``across`` by default, ``--across`` with ``COMMAND_LINE``.
    **options
        Any other key of a plate in a config, such as ``draw="lyapunov"``, ``follow="both"``,
        ``record={"every": 12, "phase": 3}``, ``by_attractor=True``, ``extinct={"n": 1e-6}``, ``steps=4000``
        or ``supersampling=2``; None means not given.

    Returns
    -------
    Plate

    Raises
    ------
    ConfigRefused
        As :func:`load`.

    Examples
    --------
    >>> plate_from_parts("logistic", ("r", "2.8", 4), ("x", 0, 1), size="1200x800px").pixels
    (1200, 800)
    >>> plate_from_parts("hassell", ("growth", 5, 100), ("beta", 2, 10)).kind
    'plane'
    """
    parts = {"family": family, "across": across, "up": up, "set": set, "starts": starts, **options}
    parts = {key: value for key, value in parts.items() if value is not None}
    reader = _Reader({}, place)
    if isinstance(family, Family):
        reader.families[family.name] = family
        parts["family"] = family.name
    return read_plate(name, parts, place, reader.family)


def _file_content(path: Path, where: str) -> bytes:
    try:
        if path.is_dir():
            raise ConfigRefused(f"{where}: this is a folder; name a YAML file")
        if not path.exists():
            raise ConfigRefused(f"{where}: there is no such file")
        if not path.is_file():
            raise ConfigRefused(f"{where}: this is not a plain file; name a YAML file")
        with path.open("rb") as file:
            return file.read(LARGEST_FILE + 1)
    except (OSError, ValueError) as problem:
        reason = getattr(problem, "strerror", None) or "the name is not allowed"
        raise ConfigRefused(f"{where}: the file cannot be read: {shown(reason)[1:-1]}") from None
