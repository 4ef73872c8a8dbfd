"""What long work tells about its progress; the command line shows it, everybody else may ignore it."""

from __future__ import annotations

from typing import Protocol

PREPARING = "preparing"
"""The stage in which a map is compiled; nothing is written in it."""


class Reporter(Protocol):
    """Listens to long work."""

    def begin(self, name: str, what: str, total: int) -> None:
        """Hear that a stage of an output begins, and of how many steps it is."""

    def advance(self, amount: int) -> None:
        """Hear that some steps of the stage are done; may be called from any thread."""


class Silence:
    """A reporter that tells nobody."""

    def begin(self, name: str, what: str, total: int) -> None:
        """Do nothing."""

    def advance(self, amount: int) -> None:
        """Do nothing."""
