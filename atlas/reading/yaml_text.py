"""Reading YAML into mappings, lists and texts: nothing is typed, executed or expanded without bound."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TypeAlias

import yaml
from yaml.events import (
    AliasEvent,
    CollectionEndEvent,
    DocumentEndEvent,
    DocumentStartEvent,
    Event,
    MappingStartEvent,
    NodeEvent,
    ScalarEvent,
    SequenceStartEvent,
    StreamEndEvent,
    StreamStartEvent,
)

from atlas.errors import ConfigRefused, shown
from atlas.reading.place import brief

Tree: TypeAlias = "str | list[Tree] | dict[str, Tree]"

LARGEST_FILE = 1 << 20
DEEPEST = 24
MOST_NODES = 100_000


def read_yaml(given: bytes | str, where: str) -> Tree:
    """Read one YAML document; every scalar stays the text that was written.

    Parameters
    ----------
    given : bytes or str
        The document, UTF-8 when it is bytes, at most 1 MiB.
    where : str
        What a sentence calls the document: the name of its file.

    Returns
    -------
    str, list or dict
        Mappings keep the order of the file. Empty values are empty texts.

    Raises
    ------
    ConfigRefused
        When the text is not UTF-8, not YAML, empty, larger than 1 MiB, more than one document, deeper
        than 24 levels or more than 100 000 values with aliases expanded; and for tags, merge keys, keys
        that are not text and keys given twice.

    Examples
    --------
    >>> read_yaml("a: [no, 010, 1e-3]", "example.yaml")
    {'a': ['no', '010', '1e-3']}
    """
    text = _decoded(given, where)
    try:
        return _Builder(text, where).document()
    except yaml.MarkedYAMLError as problem:
        mark = problem.problem_mark or problem.context_mark
        spot = f"line {mark.line + 1}, column {mark.column + 1}: " if mark else ""
        reason = brief(problem.problem or problem.context or "it cannot be read")
        raise ConfigRefused(f"{where}: {spot}this is not YAML: {reason}") from None
    except yaml.YAMLError:
        raise ConfigRefused(f"{where}: this is not YAML: it holds control characters") from None
    except (ValueError, OverflowError):
        raise ConfigRefused(
            f"{where}: this is not YAML: an escape or a directive holds a number that is out of range"
        ) from None


def _decoded(given: bytes | str, where: str) -> str:
    if len(given) > LARGEST_FILE:
        raise ConfigRefused(f"{where}: the file is larger than 1 MiB; a config is a short text")
    if isinstance(given, str):
        return given
    try:
        return given.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        raise ConfigRefused(
            f"{where}: byte {problem.start + 1} is not UTF-8; save the config as UTF-8 text"
        ) from None


class _Builder:
    """Builds the tree straight from the parser's events, so that every bound holds before memory is spent."""

    def __init__(self, text: str, where: str) -> None:
        self.where = where
        self.events: Iterator[Event] = yaml.parse(text, Loader=yaml.SafeLoader)
        self.anchors: dict[str, tuple[Tree, int] | None] = {}
        self.nodes = 0

    def document(self) -> Tree:
        tree: Tree | None = None
        for event in self.events:
            if isinstance(event, StreamStartEvent | StreamEndEvent | DocumentEndEvent):
                continue
            if isinstance(event, DocumentStartEvent):
                if tree is not None:
                    raise self.refusal(event, "a second document starts here; a config is one document")
                tree = self.node(next(self.events), 1)
        if tree is None or tree == "":
            raise ConfigRefused(f"{self.where}: the file is empty; a config holds families and plates")
        return tree

    def node(self, event: Event, depth: int) -> Tree:
        if isinstance(event, AliasEvent):
            return self.alias(event)
        assert isinstance(event, NodeEvent)
        self.count(event, 1)
        if event.tag is not None:  # type: ignore[attr-defined]
            tag = shown(event.tag)  # type: ignore[attr-defined]
            raise self.refusal(event, f"the tag {tag} is not allowed; a config holds plain values only")
        if depth > DEEPEST:
            raise self.refusal(event, f"values are nested deeper than {DEEPEST} levels")
        before = self.nodes
        if event.anchor is not None:
            self.anchors[event.anchor] = None
        tree = self.value(event, depth)
        if event.anchor is not None:
            self.anchors[event.anchor] = (tree, 1 + self.nodes - before)
        return tree

    def value(self, event: Event, depth: int) -> Tree:
        if isinstance(event, ScalarEvent):
            return self.text(event)
        if isinstance(event, SequenceStartEvent):
            return [self.node(entry, depth + 1) for entry in self.until_end()]
        assert isinstance(event, MappingStartEvent)
        return self.mapping(depth)

    def mapping(self, depth: int) -> dict[str, Tree]:
        tree: dict[str, Tree] = {}
        lines: dict[str, int] = {}
        for event in self.until_end():
            key = self.key(event)
            line = _line(event)
            if key in tree:
                raise self.refusal(event, f"the key {shown(key)} is given twice, first in line {lines[key]}")
            lines[key] = line
            tree[key] = self.node(next(self.events), depth + 1)
        return tree

    def key(self, event: Event) -> str:
        if not isinstance(event, ScalarEvent) or event.tag is not None:
            raise self.refusal(event, "a key must be plain text")
        self.count(event, 1)
        if event.value == "<<" and event.implicit[0]:
            raise self.refusal(event, "merge keys (<<) are not supported; put shared values under defaults")
        return self.text(event)

    def alias(self, event: AliasEvent) -> Tree:
        name = shown(event.anchor)
        if event.anchor not in self.anchors:
            raise self.refusal(event, f"the alias {name} refers to nothing above it")
        known = self.anchors[event.anchor]
        if known is None:
            raise self.refusal(event, f"the alias {name} refers to the value that holds it")
        tree, size = known
        self.count(event, size)
        return tree

    def text(self, event: ScalarEvent) -> str:
        value: str = event.value
        if any("\ud800" <= mark <= "\udfff" for mark in value):
            raise self.refusal(event, "half of a character pair stands alone; write the character itself")
        return value

    def until_end(self) -> Iterator[Event]:
        for event in self.events:
            if isinstance(event, CollectionEndEvent):
                return
            yield event

    def count(self, event: Event, nodes: int) -> None:
        self.nodes += nodes
        if self.nodes > MOST_NODES:
            raise self.refusal(event, f"with aliases expanded the file holds more than {MOST_NODES} values")

    def refusal(self, event: Event, sentence: str) -> ConfigRefused:
        return ConfigRefused(f"{self.where}: line {_line(event)}: {sentence}")


def _line(event: Event) -> int:
    return event.start_mark.line + 1 if event.start_mark else 1
