"""Progress on a terminal: rate and time left; silence anywhere else."""

from __future__ import annotations

from types import TracebackType

from rich.console import Console
from rich.progress import BarColumn, Progress, ProgressColumn, Task, TaskID, TextColumn, TimeRemainingColumn
from rich.text import Text


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

    def __enter__(self) -> Bar:
        self._progress.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._progress.stop()

    def begin(self, name: str, what: str, total: int) -> None:
        """Show a new stage of an output."""
        if self._task is not None:
            self._progress.remove_task(self._task)
        self._task = self._progress.add_task(what, total=total or None, output=name)

    def advance(self, amount: int) -> None:
        """Move the bar."""
        if self._task is not None:
            self._progress.advance(self._task, amount)
