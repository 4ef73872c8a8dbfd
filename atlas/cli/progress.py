"""Progress on a terminal: rate and time left; silence anywhere else."""

from __future__ import annotations

import os
import signal
import sys
import threading
from types import FrameType, TracebackType
from typing import Any

from rich.console import Console
from rich.progress import BarColumn, Progress, ProgressColumn, Task, TaskID, TextColumn, TimeRemainingColumn
from rich.text import Text

from atlas.errors import INTERRUPTED
from atlas.output.reporter import PREPARING


class _Rate(ProgressColumn):
    """Steps a second, with a prefix."""

    def render(self, task: Task) -> Text:
        speed = task.finished_speed or task.speed
        if not speed or not task.total:
            return Text("")
        for unit, size in (("G", 1e9), ("M", 1e6), ("k", 1e3)):
            if speed >= size:
                return Text(f"{speed / size:.1f} {unit}/s")
        return Text(f"{speed:.0f} /s")


class Bar:
    """A reporter that draws a bar on standard error while it is a terminal.

    Use it as a context.
    """

    def __init__(self) -> None:
        console = Console(stderr=True)
        columns = (
            TextColumn("{task.fields[output]}"),
            TextColumn("[dim]{task.description}"),
            BarColumn(),
            _Rate(),
            TimeRemainingColumn(),
        )
        self._progress = Progress(*columns, console=console, transient=True, disable=not console.is_terminal)
        self._task: TaskID | None = None
        self._preparing = False
        self._before: Any = None

    def __enter__(self) -> Bar:
        if threading.current_thread() is threading.main_thread():
            self._before = signal.signal(signal.SIGINT, self._interrupted)
        self._progress.start()
        return self

    def _interrupted(self, number: int, frame: FrameType | None) -> None:
        """End at once while a map is compiled: the compiler loses exceptions, and nothing is written."""
        if not self._preparing:
            raise KeyboardInterrupt
        self._progress.stop()
        sys.stderr.write("atlas: interrupted; finished outputs are kept, a new run goes on from there\n")
        sys.stderr.flush()
        os._exit(INTERRUPTED)

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._progress.stop()
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)

    def begin(self, name: str, what: str, total: int) -> None:
        """Show a new stage of an output."""
        self._preparing = what == PREPARING
        if self._task is not None:
            self._progress.remove_task(self._task)
        self._task = self._progress.add_task(what, total=total or None, output=name)

    def advance(self, amount: int) -> None:
        """Move the bar."""
        if self._task is not None:
            self._progress.advance(self._task, amount)
