"""Start-up of the command line, in fresh processes."""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

from tests.bench.timing import report

ATLAS = [sys.executable, "-c", "from atlas.cli import main; main()"]


def run() -> None:
    """Print seconds: these two numbers are asked for as seconds."""
    _time([*ATLAS, "--help"])
    report("atlas --help", "0.3 s", f"{min(_time([*ATLAS, '--help']) for _ in range(5)):.2f} s")
    with tempfile.TemporaryDirectory() as folder:
        draw = [*ATLAS, "draw", "logistic", "--size", "1200x800px", "--out", str(Path(folder) / "plate.png")]
        _time(draw)
        report("atlas draw of 1200x800px, second run", "4 s", f"{_time(draw):.2f} s")


def _time(command: list[str]) -> float:
    begin = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - begin
