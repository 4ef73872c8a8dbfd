"""What `atlas check` says of planes, portraits, basins and followed attractors; a prompt end by Ctrl-C."""

from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

import atlas
from atlas.output.batch import needs
from atlas.output.forecast import builders, need_of
from atlas.plan import BASE_MEMORY
from tests.atlas.kinds import config
from tests.atlas.rendered import command, files, render
from tests.atlas.test_forecast import PEAK
from tests.atlas.test_interrupt import interrupted, started
from tiles.errors import TooLarge

CONFIG = """
defaults: {transient: 64, transient_limit: 64, steps: 64, longest_period: 8, dpi: 100, formats: [png]}
plates:
  plane: {family: forced_logistic, across: [a, 2.5, 4], up: [b, 2.5, 4.2], size: 2000x1500px}
  exponents: {family: forced_logistic, across: [a, 2, 4], up: [b, 2, 4], draw: lyapunov, size: 1800x1800px}
  fine: {family: forced_logistic, across: [a, 2.5, 4], up: [b, 2.5, 4.2], supersampling: 4, size: 700x500px}
  portrait: {family: henon, across: [x, -1.5, 1.5], up: [y, -0.5, 0.5], size: 4000x3000px, samples: 1000000}
  both: {family: henon, across: [a, 1, 1.1], up: [x, -1, 1], size: 1000x6000px, samples: 100, follow: both}
tile_sets:
  tiles: {family: forced_logistic, across: [a, 2.5, 4], up: [b, 2.5, 4.2], levels: 2}
  basins: {family: henon, across: [x, -1, 1], up: [y, -1, 1], draw: basin, set: {a: 0.5}, levels: 2}
  following:
    family: henon
    across: [a, 1, 1.1]
    up: [x, -1.5, 1.5]
    levels: {across: 1, up: 5}
    samples: 100
    follow: down
"""
ENDLESS = """
defaults: {transient: 100000000000, dpi: 100, size: 320x200px}
plates:
  plane: {family: forced_logistic, across: [a, 3.9, 4], up: [b, 3.9, 4]}
  measured: {family: forced_logistic, across: [a, 3.9, 4], up: [b, 3.9, 4], transient: 0, steps: 1000000000}
  basin: {family: henon, across: [x, -0.1, 0.1], up: [y, -0.1, 0.1], draw: basin}
  following: {family: henon, across: [a, 1.3, 1.4], up: [x, -1, 1], follow: both, samples: 100}
  portrait: {family: henon, across: [x, -1, 1], up: [y, -1, 1], samples: 100000}
tile_sets:
  tiles: {family: forced_logistic, across: [a, 3.9, 4], up: [b, 3.9, 4], levels: 1}
"""


@pytest.fixture
def path(tmp_path: Path) -> Path:
    found = tmp_path / "config.yaml"
    found.write_text(CONFIG)
    return found


NAMES = ("plane", "exponents", "fine", "portrait", "both", "tiles", "basins", "following")


@pytest.mark.parametrize("name", NAMES)
def test_the_peak_memory_is_the_predicted_one_within_a_quarter(path: Path, name: str) -> None:
    if not Path("/proc/self/status").exists():
        pytest.skip("only Linux tells the peak of a process that has ended")
    words = ["render", str(path), "--out", str(path.parent / "out"), "--only", name, "--workers", "2"]
    ran = subprocess.run([sys.executable, "-c", PEAK, *words], capture_output=True, text=True, check=True)
    peak = 1024 * int(ran.stderr.split()[-1])
    predicted = {record.name: need.memory for record, need in needs(atlas.load(path), workers=2)}[name]
    assert 0.75 * peak < predicted < 1.25 * peak


def test_what_is_computed_is_what_was_foretold(tmp_path: Path) -> None:
    found = {record.name: need for record, need in needs(config(), workers=2)}
    only = ["fine_fates", "basins", "portrait", "both_ways", "escape_tiles", "portrait_tiles", "rising_tiles"]
    made = render(tmp_path, config(), only=only)
    assert {name: found[name].samples for name in only} == {name: made[name].samples for name in only}
    assert all(need.seconds > 0 for need in found.values())
    assert found["fate_tiles"].pixels == (512, 1024)


def test_the_command_tells_what_each_kind_needs(path: Path) -> None:
    ran = command("check", path)
    assert (ran.returncode, ran.stderr) == (0, "")
    rows = {line.split()[0]: line for line in ran.stdout.splitlines()}
    assert set(NAMES) < set(rows)
    assert "2000 x 1500" in rows["plane"]


def plane(**options: Any) -> Any:
    given = {"size": "600x400px", "dpi": 100} | options
    return atlas.plate("forced_logistic", ("a", 2, 4), ("b", 2, 4), **given)


def memory(workers: int = 2, **options: Any) -> int:
    return need_of(plane(**options), workers).memory


def test_finer_pictures_values_and_workers_need_more() -> None:
    vast = "6000x4000px"
    assert (
        memory() < memory(size=vast) < memory(size=vast, supersampling=2) < memory(size=vast, supersampling=4)
    )
    assert memory(size=vast) < memory(size=vast, draw="lyapunov")
    assert memory(1) < memory(2) < memory(16)
    assert memory(draw="fate") < memory(draw="attractors")
    assert need_of(plane(steps=4000), 1).seconds > need_of(plane(steps=2000), 1).seconds
    assert need_of(plane(supersampling=2), 1).seconds > 3 * need_of(plane(), 1).seconds


def test_a_plane_of_twenty_thousand_pixels_a_side_takes_a_gibibyte_at_most() -> None:
    assert memory(size="20000x20000px", transient=100, steps=100) <= 1 << 30


def test_a_short_budget_builds_fewer_tiles_of_a_plane_at_once(path: Path) -> None:
    job = atlas.load(path).tile_sets["tiles"]
    assert builders(job, 64, 64 << 30) == 16  # as many tiles as there are
    assert builders(job, 3, 64 << 30) == 3
    assert builders(job, 64, BASE_MEMORY) == 1
    for budget in (1 << 30, 300 << 20, 280 << 20):
        need = need_of(job, 64, budget)
        assert need.memory <= budget or builders(job, 64, budget) == 1


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        (
            "size: 2000x1500px",
            "size: 30000x20000px",
            "config.yaml: plane: 30000 x 20000 pixels would need 1.",
        ),
        (
            "supersampling: 4, size: 700x500px",
            "supersampling: 4, size: 9000x7000px",
            "config.yaml: fine: 9000 x 7000",
        ),
        ("0.5}, levels: 2}", "0.5}, levels: 6}", "config.yaml: basins: 16384 x 16384 pixels would need 2."),
        (
            "levels: {across: 1, up: 5}",
            "levels: 6",
            "config.yaml: following: 16384 x 16384 pixels would need 1.",
        ),
    ],
)
def test_what_does_not_fit_is_refused_with_the_figure(path: Path, old: str, new: str, told: str) -> None:
    text = CONFIG.replace(old, new)
    assert text != CONFIG
    path.write_text(text)
    with pytest.raises(TooLarge) as caught:
        needs(atlas.load(path), memory="1GiB", workers=1)
    assert told in str(caught.value)
    assert len(needs(atlas.load(path), memory="8GiB", workers=1)) == len(NAMES)


STAGES = {
    "plane": "finding fates",
    "measured": "finding fates",
    "basin": "finding basins",
    "following": "following",
    "portrait": "counting",
    "tiles": "finding fates",
}


@pytest.mark.parametrize("name", STAGES)
def test_an_interrupt_ends_long_orbits_at_once(tmp_path: Path, name: str) -> None:
    endless, out = tmp_path / "endless.yaml", tmp_path / "out"
    endless.write_text(ENDLESS)
    with started("", f"{name} {STAGES[name]}", endless, out, name) as process:
        time.sleep(0.5)  # the kernels are at work
        begin = time.monotonic()
        interrupted(process)
    assert time.monotonic() - begin < 5.0
    assert files(out) == {}
