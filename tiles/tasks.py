"""What the building of indices and sites asks of a scheduler."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Protocol, TypeVar

T = TypeVar("T")


class Run(Protocol):
    """A scheduler: runs tasks, perhaps in parallel threads, and hands the results to the caller's thread."""

    def __call__(self, tasks: Iterable[Callable[[], T]], done: Callable[[T], None]) -> None:
        """Run all tasks; call ``done`` with each result, in the order of the tasks."""


def serially(tasks: Iterable[Callable[[], T]], done: Callable[[T], None]) -> None:
    """Run tasks one after the other."""
    for task in tasks:
        done(task())
