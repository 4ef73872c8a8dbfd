"""Batches: what is made, skipped and made again; one failing output; results that depend on nothing else."""

from __future__ import annotations

import errno
import json
import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

import atlas
from atlas.output import ledger
from atlas.output.certificate import read
from tests.atlas.rendered import SMALL, command, config, files, render, statuses
from tiles.errors import Refusal

NAMES = ("growth", "rise", "tiles", "both")
PLATE = {"family": "logistic", "across": ["r", "3.5", 4], "up": ["x", 0, 1]}
ALL_MADE = dict.fromkeys(NAMES, "made")


@pytest.fixture(scope="module")
def first(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The small config rendered by one worker."""
    out = tmp_path_factory.mktemp("first")
    assert statuses(render(out, workers=1)) == ALL_MADE
    return out


@pytest.fixture
def out(first: Path, tmp_path: Path) -> Path:
    """A finished folder to be changed."""
    return Path(shutil.copytree(first, tmp_path / "out"))


def test_every_output_has_its_contracted_names_and_nothing_else_is_left(first: Path) -> None:
    top = {path.name for path in first.iterdir()}
    growth = {f"growth.{suffix}" for suffix in ("png", "tif", "pdf", "svg")}
    assert top == {*growth, "rise.png", "both.png", "tiles", ".parts"}
    assert {path.name for path in (first / "tiles").iterdir()} == {"index.sqlite", "site"}
    assert (first / "tiles/site/index.html").is_file()
    assert (first / "tiles/site/meta.js").is_file()
    assert (first / "tiles/site/tiles/density/2/1/3/1.png").is_file()
    assert [path.name for path in (first / ".parts").iterdir()] == ["finished.json"]


@pytest.mark.parametrize(("workers", "memory"), [(2, None), (7, "1GiB"), (None, "16GiB")])
def test_files_depend_neither_on_workers_nor_on_memory(
    first: Path, tmp_path: Path, workers: int | None, memory: str | None
) -> None:
    assert statuses(render(tmp_path, workers=workers, memory=memory)) == ALL_MADE
    expected, found = files(first), files(tmp_path)
    assert found.keys() == expected.keys()
    assert [name for name in expected if found[name] != expected[name]] == []


def test_files_do_not_depend_on_blocks_and_strips(
    first: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("atlas.orbits.histogram.BLOCK_BYTES", 1)
    monkeypatch.setattr("atlas.output.tileset.CELLS_PER_STRIP", 1 << 13)
    render(tmp_path, workers=3)
    assert files(tmp_path) == files(first)


def test_every_file_carries_its_record(first: Path) -> None:
    digests: dict[str, set[str]] = {}
    for path in (*first.glob("[!.]*.*"), first / "tiles/index.sqlite"):
        record = read(path)
        assert record["kind"] == {"both": "figure", "index": "tile set"}.get(path.stem, "plate")
        digests.setdefault(record["name"], set()).add(record["counts_digest"])
    assert digests.keys() == set(NAMES)
    assert all(len(found) == 1 for found in digests.values())


def test_unchanged_outputs_are_skipped_and_not_touched(out: Path) -> None:
    before = {path: path.stat().st_mtime_ns for path in out.rglob("*")}
    again = render(out)
    assert statuses(again) == dict.fromkeys(NAMES, "skipped")
    assert all(outcome.samples == 0 for outcome in again.values())
    assert {path: path.stat().st_mtime_ns for path in out.rglob("*")} == before


def _append(path: Path) -> None:
    with path.open("ab") as file:
        file.write(b"\0")


def _flip(path: Path) -> None:
    content = bytearray(path.read_bytes())
    content[-5] ^= 1
    path.write_bytes(content)


@pytest.mark.parametrize(
    ("name", "file", "damage"),
    [
        ("rise", "rise.png", _append),
        ("growth", "growth.svg", _flip),
        ("growth", "growth.pdf", Path.unlink),
        ("both", "both.png", _flip),
        ("tiles", "tiles/index.sqlite", Path.unlink),
        ("tiles", "tiles/site/tiles/density/2/1/0/1.png", _flip),
        ("tiles", "tiles/site/meta.js", Path.unlink),
    ],
)
def test_an_output_is_made_again_when_one_of_its_files_changed(
    first: Path, out: Path, name: str, file: str, damage: Any
) -> None:
    damage(out / file)
    assert statuses(render(out)) == {**dict.fromkeys(NAMES, "skipped"), name: "made"}
    assert files(out) == files(first)


def test_an_output_is_made_again_when_its_config_changed(out: Path) -> None:
    changed = config(plates={"growth": {**PLATE, "size": "320x200px"}, "rise": PLATE}, figures={})
    assert statuses(render(out, changed)) == {"growth": "made", "rise": "made", "tiles": "skipped"}
    assert statuses(render(out, changed)) == dict.fromkeys(("growth", "rise", "tiles"), "skipped")


def test_force_makes_everything_again(first: Path, out: Path) -> None:
    assert statuses(render(out, force=True, only=["rise", "tiles"])) == {"rise": "made", "tiles": "made"}
    assert files(out) == files(first)


@pytest.mark.parametrize(
    "text",
    ["", "{", "[]", '"text"', '{"rise": 1}', '{"rise": {}}', '{"rise": {"request": 0, "files": []}}', "\0"],
)
def test_a_damaged_list_of_finished_outputs_costs_work_and_nothing_else(out: Path, text: str) -> None:
    (out / ".parts/finished.json").write_text(text)
    assert statuses(render(out, only=["rise"])) == {"rise": "made"}
    assert "rise" in json.loads((out / ".parts/finished.json").read_text())
    assert statuses(render(out, only=["rise"])) == {"rise": "skipped"}


def test_only_takes_names_in_the_order_of_the_config(tmp_path: Path) -> None:
    assert list(render(tmp_path, only=["both", "rise"])) == ["rise", "both"]
    assert {path.name for path in tmp_path.glob("*.png")} == {"rise.png", "both.png"}


def test_only_refuses_a_name_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(Refusal, match=r"--only: .* has no output 'ries'; did you mean 'rise'\?"):
        render(tmp_path / "out", only=["rise", "ries"])
    assert not (tmp_path / "out").exists()


def test_samples_and_seconds_are_reported(tmp_path: Path) -> None:
    outcomes = render(tmp_path, only=["rise", "tiles"])
    record = read(tmp_path / "rise.png")["samples"]["rise"]
    assert outcomes["rise"].samples == record["columns"] * record["of_each_column"] > 0
    assert outcomes["tiles"].samples == 1024 * 4 * 200
    assert all(outcome.seconds > 0 for outcome in outcomes.values())


def _full(path: Path, data: bytes) -> int:
    if path.name in ("growth.tif", "rise.png"):
        with path.open("wb") as file:
            file.write(data[: len(data) // 2])
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    with path.open("wb") as file:
        return file.write(data)


def test_one_failing_output_does_not_stop_the_others(
    first: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(Path, "write_bytes", _full)
    old = tmp_path / "rise.png"
    old.touch()
    outcomes = render(tmp_path)
    assert statuses(outcomes) == {"growth": "failed", "rise": "failed", "tiles": "made", "both": "made"}
    for name in ("growth", "rise"):
        assert "No space left on device" in outcomes[name].message
        assert "free some space" in outcomes[name].message
        assert outcomes[name].samples == 0
    assert old.read_bytes() == b""
    assert not (tmp_path / "growth.tif").exists()
    monkeypatch.undo()
    assert statuses(render(tmp_path)) == {**dict.fromkeys(NAMES, "skipped"), "growth": "made", "rise": "made"}
    assert files(tmp_path) == files(first)


def test_memory_that_runs_out_fails_one_output(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from atlas.figure import plate

    draw = plate.draw

    def greedy(layout: Any, *others: Any) -> None:
        if layout.panels[0].name == "rise":
            raise MemoryError
        draw(layout, *others)

    monkeypatch.setattr(plate, "draw", greedy)
    outcomes = render(tmp_path)
    assert statuses(outcomes) == {**ALL_MADE, "rise": "failed"}
    assert outcomes["rise"].message == "rise: memory ran out; make it smaller or close other programs"


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A file system of 300 kB."""
    disk = tmp_path / "disk"
    disk.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", "size=300k", "none", str(disk)]
    if subprocess.run(mount, capture_output=True, check=False).returncode:
        pytest.skip("a file system of 300 kB can only be mounted by root")
    yield disk
    subprocess.run(["umount", str(disk)], check=True)


def test_a_full_disk_fails_what_does_not_fit(first: Path, small_disk: Path) -> None:
    ran = command("render", SMALL, "--out", small_disk / "out")
    assert ran.returncode == 1
    assert "Traceback" not in ran.stderr
    failed = {line.split()[0] for line in ran.stdout.splitlines() if " failed " in line}
    made = {line.split()[0] for line in ran.stdout.splitlines() if " made " in line}
    assert "tiles" in failed
    assert "rise" in made
    assert failed | made == set(NAMES)
    assert len(ran.stderr.splitlines()) == len(failed)
    for line in ran.stderr.splitlines():
        assert line.startswith("atlas: ")
    whole = files(first)
    assert all(whole[name] == content for name, content in files(small_disk / "out").items())


def test_a_fingerprint_tells_names_files_and_places_apart(tmp_path: Path) -> None:
    seen = set()
    for number, names in enumerate((["a"], ["b"], ["a", "b"], ["ab"], ["c/a"], ["c/d/a"], ["c/a", "c/b"])):
        folder = tmp_path / str(number)
        for name in names:
            (folder / name).parent.mkdir(parents=True, exist_ok=True)
            (folder / name).write_text("x")
        seen.add(ledger.fingerprint(folder))
    assert len(seen) == 7
    assert None not in seen
    assert ledger.fingerprint(tmp_path / "missing") is None
    assert ledger.fingerprint(tmp_path / "0/a") == ledger.fingerprint(tmp_path / "1/b") is not None


def test_what_cannot_be_read_counts_as_changed(tmp_path: Path) -> None:
    book = ledger.Ledger(tmp_path)
    book.note("rise", "request", [tmp_path / "rise.png"])
    assert not ledger.Ledger(tmp_path).unchanged("rise", "request", [tmp_path / "rise.png"])


REFUSED = [
    ({"plates": {"vast": {**PLATE, "size": "100000x100000px"}}}, "small.yaml: vast: 100000 x 100000 pixels"),
    ({"plates": {"fine": {**PLATE, "size": "180x110", "dpi": 20000}}}, "pixels would need"),
    ({"plates": {"tiny": {**PLATE, "size": "9x9px"}}}, "tiny"),
    ({"plates": {"odd": {**PLATE, "title": "漁業"}}}, "U+6F01"),
    ({"plates": {"many": {**PLATE, "samples": 4_000_000_000}}}, "use at most 1073741823 samples"),
    ({"plates": {"deep": {**PLATE, "across": ["r", "3", "3.00000000000000001"]}}}, "finer than float64"),
    ({"tile_sets": {"deep": {**PLATE, "levels": 60}}}, "finer than float64"),
    (
        {"tile_sets": {"high": {**PLATE, "levels": {"across": 2, "up": 24}}}},
        "the budget is 2.0 GiB",
    ),
]


@pytest.mark.parametrize(("sections", "sentence"), REFUSED)
def test_what_cannot_be_made_is_refused_before_anything_is(
    tmp_path: Path, sections: dict[str, Any], sentence: str
) -> None:
    given = config(figures={}, **{"tile_sets": {}, **sections})
    object.__setattr__(given, "path", Path("small.yaml"))
    with pytest.raises(Refusal) as caught:
        render(tmp_path / "out", given)
    assert sentence in str(caught.value)
    assert str(caught.value).startswith("small.yaml: ")
    assert "\n" not in str(caught.value)
    assert not (tmp_path / "out").exists()


def test_a_folder_in_the_place_of_a_file_is_refused(out: Path) -> None:
    (out / "rise.png").unlink()
    (out / "rise.png").mkdir()
    with pytest.raises(Refusal, match=r"rise\.png' is a folder; choose another name"):
        render(out)


def test_a_site_never_replaces_a_folder_of_other_files(out: Path) -> None:
    shutil.rmtree(out / "tiles/site")
    (out / "tiles/site").mkdir()
    (out / "tiles/site/notes.txt").write_text("mine")
    with pytest.raises(Refusal, match="holds other files"):
        render(out)
    assert (out / "tiles/site/notes.txt").read_text() == "mine"


def test_what_is_not_drawn_is_said(tmp_path: Path) -> None:
    """Blank windows, starts on a repelling cycle and too few counts in a zoom do not pass in silence."""
    plates: dict[str, dict[str, Any]] = {
        "gone": {"across": ["r", "5", "6"], "up": ["x", "0", "1"]},
        "aside": {"across": ["r", "2", "3"], "up": ["x", "2", "3"]},
        "extinct": {"across": ["r", "2.5", "4"], "up": ["x", "0", "1"], "starts": [{"x": "0"}]},
        "deep": {"across": ["r", "3.9", "4"], "up": ["x", "0.5", "0.50005"]},
        "good": {"across": ["r", "3.6", "4"], "up": ["x", "0", "1"]},
    }
    config = {
        "plates": {
            name: {"family": "logistic", "size": "300x200px", "dpi": "100", **plate}
            for name, plate in plates.items()
        }
    }
    outcomes = {one.name: one.remarks for one in atlas.render(atlas.parse_config(config), tmp_path)}
    assert [len(outcomes[name]) for name in plates] == [1, 1, 1, 1, 0]
    assert "nothing is drawn: 100.000% of the samples escaped" in outcomes["gone"][0]
    assert "lie below the window" in outcomes["aside"][0]
    assert "start exactly on a repelling cycle" in outcomes["extinct"][0]
    assert "counts a cell" in outcomes["deep"][0]


def test_a_step_without_a_derivative_is_refused_with_its_place(tmp_path: Path) -> None:
    bad = {"state": {"x": {"start": 0.3}}, "parameters": {"r": {"default": 1}}, "step": {"x": "r / (x - x)"}}
    plate = {"family": "bad", "across": ["r", 1, 2], "up": ["x", 0, 1], "size": "300x200px"}
    given = config(families={"bad": bad}, plates={"bad": plate}, tile_sets={}, figures={})
    object.__setattr__(given, "path", Path("small.yaml"))
    for call in (lambda: render(tmp_path / "out", given), lambda: atlas.needs(given)):
        with pytest.raises(Refusal, match=r"^small\.yaml: families\.bad\.step: the formula divides by"):
            call()
    assert not (tmp_path / "out").exists()


def test_a_render_that_skips_everything_reads_no_derivative(out: Path) -> None:
    script = f"import atlas, sys\natlas.render({str(SMALL)!r}, {str(out)!r})\nprint('sympy' in sys.modules)"
    ran = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert ran.stdout == "False\n"
