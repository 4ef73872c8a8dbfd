"""Ctrl-C and sudden death: nothing unfinished under a final name, and a second run completes the first."""

from __future__ import annotations

import signal
import subprocess
import sys
import time
from collections import Counter
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

import atlas
from tests.atlas.rendered import files

CONFIG = """
defaults: {samples: 100, transient: 100, size: 200x150px, dpi: 72, formats: [png, pdf]}
plates:
  rise: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1]}
  endless: {family: logistic, across: [r, 3.6, 4], up: [x, 0, 1], samples: 200000000, values_per_column: 1}
  waiting: {family: logistic, across: [r, 3.6, 4], up: [x, 0, 1], transient: 500000000000}
  piloted: {family: logistic, across: [r, 3.6, 4], up: [x, 0, 1], transient: 500000000000, samples: auto}
tile_sets:
  tiles: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1], levels: {across: 4, up: 1}}
"""
PATIENCE = 5.0
# A process that says on standard error what it does, and rests after each step of the stage named first.
SCRIPT = """
import sys, threading, time
from atlas.cli import progress, main

turn = threading.Lock()

def say(*words):
    with turn:
        print(*words, file=sys.stderr, flush=True)

class Told(progress.Bar):
    def begin(self, name, what, total):
        self.stage = what
        say(name, what)
    def advance(self, amount):
        say("step of", self.stage)
        if self.stage == sys.argv[1]:
            time.sleep(0.2)

progress.Bar = Told
main(sys.argv[2:])
"""


@pytest.fixture
def config(tmp_path: Path) -> Path:
    path = tmp_path / "config.yaml"
    path.write_text(CONFIG)
    return path


class Steps:
    """A reporter that counts the steps of each stage."""

    def __init__(self) -> None:
        self.stage = ""
        self.steps: Counter[str] = Counter()

    def begin(self, name: str, what: str, total: int) -> None:
        self.stage = what

    def advance(self, amount: int) -> None:
        self.steps[self.stage] += 1


def rendered(config: Path, out: Path, *names: str) -> Counter[str]:
    """Render outputs to their end in this process; return the steps that it took."""
    told = Steps()
    outcomes = atlas.render(atlas.load(config), out, only=names, reporter=told)
    assert {outcome.status for outcome in outcomes} <= {"made", "skipped"}
    assert [path.name for path in (out / ".parts").iterdir()] == ["finished.json"]
    return told.steps


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """The files of a render that nothing interrupted."""
    folder = tmp_path_factory.mktemp("whole")
    (folder / "config.yaml").write_text(CONFIG)
    steps = rendered(folder / "config.yaml", folder / "out", "rise", "tiles")
    assert steps["counting"] == 17
    return files(folder / "out")


@contextmanager
def started(slow: str, until: str, config: Path, out: Path, *names: str) -> Iterator[subprocess.Popen[str]]:
    """Start a render and wait until it has said a line, the line of a step five times."""
    only = [word for name in names for word in ("--only", name)]
    words = ["render", str(config), "--out", str(out), "--workers", "2", *only]
    with subprocess.Popen(
        [sys.executable, "-c", SCRIPT, slow, *words], stdout=-1, stderr=-1, text=True
    ) as process:
        assert process.stderr is not None
        missing = 5 if until.startswith("step") else 1
        for line in process.stderr:
            missing -= line.strip() == until
            if missing == 0:
                break
        assert missing == 0
        try:
            yield process
        finally:
            process.kill()


def interrupted(process: subprocess.Popen[str]) -> None:
    """Interrupt a render, which ends soon and says so in one sentence."""
    process.send_signal(signal.SIGINT)
    printed, said = process.communicate(timeout=PATIENCE)
    assert process.returncode == 130
    assert printed == ""
    assert "Traceback" not in said
    lines = [line for line in said.splitlines() if line and not line.startswith("step of")]
    assert lines == ["atlas: interrupted; finished outputs are kept, a new run goes on from there"]


@pytest.mark.parametrize(
    ("name", "until"),
    [("endless", "endless counting"), ("waiting", "waiting counting"), ("piloted", "piloted preparing")],
)
def test_an_interrupt_ends_long_orbits_at_once_and_keeps_what_was_finished(
    config: Path, tmp_path: Path, name: str, until: str
) -> None:
    with started("", until, config, tmp_path / "out", "rise", name) as process:
        time.sleep(1.0)  # the kernels are at work
        interrupted(process)
    assert set(files(tmp_path / "out")) == {"rise.png", "rise.pdf"}


def test_an_interrupted_tile_set_goes_on_from_the_columns_it_had(
    config: Path, tmp_path: Path, whole: dict[str, bytes]
) -> None:
    out = tmp_path / "out"
    with started("counting", "step of counting", config, out, "tiles") as process:
        interrupted(process)
    assert files(out) == {}
    assert [path.name for path in (out / ".parts").iterdir()] == ["tiles.sqlite"]
    assert 0 < rendered(config, out, "tiles")["counting"] <= 14
    assert files(out) == {name: content for name, content in whole.items() if name.startswith("tiles/")}


def test_an_interrupted_site_keeps_the_counts_and_the_tiles_it_had(
    config: Path, tmp_path: Path, whole: dict[str, bytes]
) -> None:
    out = tmp_path / "out"
    with started("tiles", "step of tiles", config, out, "rise", "tiles") as process:
        interrupted(process)
    assert set(files(out)) == {"rise.png", "rise.pdf"}
    assert {path.name for path in (out / ".parts").iterdir()} == {
        "finished.json",
        "tiles.site",
        "tiles.sqlite",
    }
    assert rendered(config, out, "rise", "tiles")["counting"] == 0
    assert files(out) == whole


@pytest.mark.parametrize(("slow", "until"), [("counting", "step of counting"), ("tiles", "step of tiles")])
def test_a_killed_render_leaves_nothing_unfinished_under_a_final_name(
    config: Path, tmp_path: Path, whole: dict[str, bytes], slow: str, until: str
) -> None:
    out = tmp_path / "out"
    with started(slow, until, config, out, "rise", "tiles") as process:
        process.kill()
        assert process.wait() == -signal.SIGKILL
    assert set(files(out)) == {"rise.png", "rise.pdf"}
    assert rendered(config, out, "rise", "tiles")["counting"] <= 14
    assert files(out) == whole


def test_an_interrupted_change_keeps_the_old_outputs_and_is_not_mixed_with_another(
    config: Path, tmp_path: Path, whole: dict[str, bytes]
) -> None:
    out = tmp_path / "out"
    rendered(config, out, "rise", "tiles")
    config.write_text(CONFIG.replace("samples: 100,", "samples: 150,"))
    with started("counting", "step of counting", config, out, "tiles") as process:
        interrupted(process)
    assert files(out) == whole
    config.write_text(CONFIG)
    assert atlas.render(atlas.load(config), out, only=["tiles"])[0].status == "skipped"
    assert atlas.render(atlas.load(config), out, only=["tiles"], force=True)[0].status == "made"
    assert files(out) == whole


def test_a_plate_that_is_killed_while_it_is_written_has_no_torn_file(tmp_path: Path) -> None:
    torn = (
        "import os, signal\n"
        "from pathlib import Path\n"
        "from atlas.cli import main\n"
        "write = Path.write_bytes\n"
        "def half(path, data):\n"
        "    write(path, data[:len(data) // 2])\n"
        "    os.kill(os.getpid(), signal.SIGKILL)\n"
        "Path.write_bytes = half\n"
        "main(['draw', 'logistic', '--samples', '50', '--size', '200x150px', '--dpi', '72', '--out', "
        f"'{tmp_path}/a.pdf'])\n"
    )
    old = tmp_path / "a.pdf"
    old.write_bytes(b"made before")
    ran = subprocess.run([sys.executable, "-c", torn], capture_output=True, check=False)
    assert ran.returncode == -signal.SIGKILL
    assert old.read_bytes() == b"made before"
