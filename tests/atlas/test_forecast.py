"""What `atlas check` says of memory holds in a process of its own; budgets split or refuse the work."""

from __future__ import annotations

import subprocess
import sys
import threading
from functools import partial
from pathlib import Path

import pytest

import atlas
from atlas.orbits.schedule import schedule
from atlas.output.batch import needs
from atlas.output.forecast import builders, building_memory, need_of
from atlas.plan import BASE_MEMORY, parse_memory
from tests.atlas.rendered import files
from tiles.errors import TooLarge

CONFIG = """
defaults: {samples: 50, transient: 50, transient_limit: 200, values_per_column: 2, formats: [png]}
plates:
  plate: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1], size: 6000x4000px}
  scan: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1], size: 3000x2000px, formats: [tiff, pdf]}
tile_sets:
  tiles: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1], levels: {across: 2, up: 8}}
"""
PEAK = """
import sys
from atlas.cli import main
try:
    main(sys.argv[1:])
finally:
    peak = [line.split()[1] for line in open("/proc/self/status") if line.startswith("VmHWM")]
    print(*peak, file=sys.stderr)
"""


@pytest.fixture
def config(tmp_path: Path) -> Path:
    path = tmp_path / "config.yaml"
    path.write_text(CONFIG)
    return path


@pytest.mark.parametrize("name", ["plate", "tiles"])
def test_the_peak_memory_is_the_predicted_one_within_a_quarter(config: Path, name: str) -> None:
    if not Path("/proc/self/status").exists():
        pytest.skip("only Linux tells the peak of a process that has ended")
    words = ["render", str(config), "--out", str(config.parent / "out"), "--only", name, "--workers", "2"]
    ran = subprocess.run([sys.executable, "-c", PEAK, *words], capture_output=True, text=True, check=True)
    peak = 1024 * int(ran.stderr.split()[-1])
    predicted = {record.name: need.memory for record, need in needs(atlas.load(config), workers=2)}[name]
    assert 0.75 * peak < predicted < 1.25 * peak


def test_samples_and_pixels_are_those_that_are_made(config: Path, tmp_path: Path) -> None:
    config.write_text(CONFIG.replace("6000x4000px", "600x400px").replace("up: 8", "up: 1"))
    found = {record.name: need for record, need in needs(atlas.load(config))}
    outcomes = atlas.render(atlas.load(config), tmp_path / "out", only=["plate", "tiles"])
    made = {one.name: one for one in outcomes}
    assert found["plate"].pixels == (600, 400)
    assert found["tiles"].pixels == (1024, 512)
    assert {name: found[name].samples for name in made} == {name: one.samples for name, one in made.items()}
    assert all(need.seconds > 0 for need in found.values())


def test_more_formats_pixels_and_workers_need_no_less() -> None:
    def plate(size: str, *formats: str) -> int:
        return need_of(
            atlas.plate("logistic", ("r", 3, 4), ("x", 0, 1), size=size, formats=list(formats)), 1
        ).memory

    assert plate("1200x800px", "png") < plate("6000x4000px", "png") < plate("6000x4000px", "png", "tiff")
    assert plate("6000x4000px", "tiff") == plate("6000x4000px", "tiff", "png", "pdf", "svg")
    assert building_memory(4096, 1) < building_memory(4096, 2) < building_memory(8192, 2)


def test_a_short_budget_lets_fewer_columns_be_built_at_once(config: Path) -> None:
    job = atlas.load(config).tile_sets["tiles"]
    assert builders(job, 64, 64 << 30) == 4  # columns of tiles
    assert builders(job, 3, 64 << 30) == 3
    assert builders(job, 64, BASE_MEMORY) == 1
    for budget in (1 << 30, 300 << 20, 340 << 20):
        need = need_of(job, 64, budget)
        assert need.memory <= budget or builders(job, 64, budget) == 1


def test_what_does_not_fit_even_alone_is_refused_with_the_figure(config: Path) -> None:
    config.write_text(CONFIG.replace("up: 8", "up: 16"))
    with pytest.raises(TooLarge, match=r"config.yaml: tiles: 1024 x 16777216 pixels would need 1\.\d GiB"):
        needs(atlas.load(config), memory="1GiB")
    assert len(needs(atlas.load(config), memory="4GiB")) == 3


def test_building_one_column_at_a_time_makes_the_same_tile_set(
    config: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    config.write_text(CONFIG.replace("up: 8", "up: 1"))
    atlas.render(atlas.load(config), tmp_path / "many", only=["tiles"], workers=4)
    monkeypatch.setattr("atlas.output.batch.builders", lambda *given: 1)
    atlas.render(atlas.load(config), tmp_path / "one", only=["tiles"], workers=4)
    assert files(tmp_path / "one") == files(tmp_path / "many")


@pytest.mark.parametrize("at_once", [1, 3, 5, 9, None])
def test_the_schedule_keeps_no_more_tasks_under_way_than_asked(at_once: int | None) -> None:
    turn, running, most = threading.Lock(), [0], [0]
    together = threading.Barrier(min(at_once or 5, 5), timeout=10)

    def task(number: int) -> int:
        with turn:
            running[0] += 1
            most[0] = max(most[0], running[0])
        together.wait()
        with turn:
            running[0] -= 1
        return number

    seen: list[int] = []
    count = 3 * min(at_once or 5, 5)
    with schedule(5) as opened:
        opened.run((partial(task, number) for number in range(count)), seen.append, at_once=at_once)
    assert seen == list(range(count))
    assert most[0] == min(at_once or 5, 5)


@pytest.mark.parametrize(
    ("text", "size"),
    [(None, 2 << 30), ("1GiB", 1 << 30), ("1.5 GiB", 3 << 29), ("1500MB", 1_500_000_000), (2**31, 2**31)],
)
def test_amounts_of_memory(text: str | int | None, size: int) -> None:
    assert parse_memory(text) == size
