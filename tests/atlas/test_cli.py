"""The command line: what it prints where, its exit codes, and one sentence for everything that is wrong."""

from __future__ import annotations

import contextlib
import io
import json
import os
import pty
import re
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, NamedTuple

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from atlas.cli import COMMANDS, main
from atlas.config.jobs import Plate
from atlas.families.catalogue import NAMES
from atlas.output.certificate import read
from atlas.output.printing import Made
from atlas.reading.orbit_kinds import Record
from tests.atlas.rendered import SMALL, command, files
from tiles.number import exact
from tiles.palette import PALETTES
from tiles.shading import SHADINGS

DRAWN = ("--size", "200x150px", "--dpi", "72", "--samples", "50", "--transient", "50")
BUILT = [name for name in COMMANDS if (Path("atlas/cli") / f"{name}.py").is_file()]


class Ran(NamedTuple):
    """What a command did."""

    code: object
    out: str
    err: str


def run(*words: object) -> Ran:
    """Run a command in this process."""
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err), pytest.raises(SystemExit) as end:
        main([str(word) for word in words])
    return Ran(end.value.code, out.getvalue(), err.getvalue())


def done(*words: object) -> str:
    """Run a command that succeeds quietly; return what it printed."""
    ran = run(*words)
    assert (ran.code, ran.err) == (0, "")
    return ran.out


def sentence_of(ran: Ran, code: int = 2) -> str:
    """Return the one sentence of a command that failed."""
    assert ran.code == code
    assert ran.out == ""
    assert ran.err.startswith("atlas: ")
    assert ran.err.count("\n") == 1
    assert ran.err.endswith("\n")
    return ran.err.removeprefix("atlas: ").rstrip("\n")


def refused(*words: object) -> str:
    """Run a command whose request is wrong; return its one sentence."""
    return sentence_of(run(*words))


@pytest.fixture(scope="module")
def out(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The small config rendered by the command."""
    folder = tmp_path_factory.mktemp("cli") / "out"
    printed = done("render", SMALL, "--out", folder, "--workers", 2, "--memory", "1GiB")
    assert "4 made, 0 skipped, 0 failed" in printed
    return folder


# What is printed


@pytest.mark.parametrize("word", ["--help", "-h"])
def test_help_lists_every_command(word: str) -> None:
    printed = done(word)
    for name, summary in COMMANDS.items():
        assert re.search(rf"^  {name} +{re.escape(summary)}$", printed, re.MULTILINE)


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_explains_itself(name: str) -> None:
    printed = done(name, "--help")
    assert f"atlas {name}" in printed
    assert len(printed.splitlines()) > 5


@pytest.mark.parametrize("name", ["draw", "bin", "site"])
def test_help_lists_shadings_and_palettes_and_which_are_safe(name: str) -> None:
    printed = " ".join(done(name, "--help").split()).replace("- ", "-")
    assert f"How density becomes shade: {', '.join(SHADINGS)}" in printed
    shown = [row for row in PALETTES.values() if name != "bin" or row.kind == "sequential"]
    densities = [row.name for row in shown if row.kind == "sequential"]
    assert f"Colours of densities and steps: {', '.join(densities)}" in printed
    assert all(re.search(rf"Colours .*\b{row.name}\b.*Safe for", printed) for row in shown)
    assert ("of exponents" in printed) == (name != "bin" and len(shown) > len(densities))
    kinds = {row.name: len(row.safe_for) for row in shown}
    safe, half = ([name for name, count in kinds.items() if count == wanted] for wanted in (3, 2))
    assert f"Safe for colour-blind readers: {', '.join(safe)}; for those blind" in printed
    assert f"blind to red or green also: {', '.join(half)}." in printed


def test_version() -> None:
    assert re.fullmatch(r"atlas, version \d+\.\d+\.\d+\n", done("--version"))


def test_render_says_at_the_end_what_became_of_every_output(out: Path) -> None:
    again = done("render", SMALL, "--out", out, "--only", "rise", "--only", "tiles", "--force").splitlines()
    assert again[0].split() == ["output", "kind", "seconds", "samples"]
    assert re.fullmatch(r"rise +plate +made +\d+\.\d +\d+", again[1])
    assert re.fullmatch(r"tiles +tile set +made +\d+\.\d +819200", again[2])
    assert again[3] == "2 made, 0 skipped, 0 failed"
    skipped = done("render", SMALL, "--out", out).splitlines()
    assert [line.split()[-1] for line in skipped[1:-1]] == ["skipped"] * 4
    assert skipped[-1] == "0 made, 4 skipped, 0 failed"


def test_render_writes_to_out_by_default(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    done("render", SMALL, "--only", "rise")
    assert (tmp_path / "out/rise.png").is_file()


def test_a_failing_output_is_told_on_standard_error(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(path: Path, data: bytes) -> int:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "write_bytes", full)
    ran = run("render", SMALL, "--out", tmp_path, "--only", "rise")
    assert ran.code == 1
    assert "0 made, 0 skipped, 1 failed" in ran.out
    assert ran.err == (
        f"atlas: '{tmp_path}/rise.png' could not be written (No space left on device); "
        "free some space or choose another output folder\n"
    )


def test_check_prints_what_each_output_needs_and_writes_nothing(tmp_path: Path) -> None:
    before = set(SMALL.parent.iterdir())
    lines = done("check", SMALL).splitlines()
    assert lines[0].split() == ["output", "kind", "pixels", "samples", "seconds", "memory"]
    assert [line.split()[0] for line in lines[1:]] == ["growth", "rise", "tiles", "both"]
    assert re.fullmatch(r"tiles +tile set +1024 x 512 +819200 +\d+\.\d +\d+\.\d MiB", lines[3])
    assert set(SMALL.parent.iterdir()) == before


def test_families_lists_the_catalogue() -> None:
    lines = done("families").splitlines()
    assert [line.split()[0] for line in lines[1:]] == list(NAMES)


@pytest.mark.parametrize("name", NAMES)
def test_families_shows_formula_parameters_domain_and_source(name: str) -> None:
    printed = done("families", name)
    assert printed.startswith(f"{name}: ")
    for word in ("parameters\n", "state\n", "escape\n", "source\n", "view\n", " starts at "):
        assert word in printed


def test_schema_is_json() -> None:
    assert json.loads(done("schema"))["type"] == "object"


@pytest.mark.parametrize(
    "file", ["growth.png", "growth.tif", "growth.pdf", "growth.svg", "both.png", "tiles/index.sqlite"]
)
def test_show_prints_the_record_inside_a_file(out: Path, file: str) -> None:
    record = json.loads(done("show", out / file))
    assert record == read(out / file)
    assert record["name"] in ("growth", "both", "tiles")


def test_site_rebuilds_the_folder_of_an_index(out: Path, tmp_path: Path) -> None:
    site = tmp_path / "deep/site"
    assert done("site", out / "tiles/index.sqlite", "--out", site) == f"{site}/index.html\n"
    assert files(site) == files(out / "tiles/site")
    done("site", out / "tiles/index.sqlite", "--out", site, "--palette", "grey", "--background", "#ffeedd")
    assert files(site).keys() == files(out / "tiles/site").keys()
    assert "#ffeedd" in (site / "meta.js").read_text()
    assert {path.name for path in site.parent.iterdir()} == {"site"}


# Drawing without a config


def test_draw_writes_each_format_that_a_suffix_names(tmp_path: Path) -> None:
    names = ["a.png", "b.TIFF", "c.pdf", "sub/d.svg"]
    outs = [word for name in names for word in ("--out", tmp_path / name)]
    words = ["--across", "r=3.5:4", "--up", "x=0:1", "--start", "x=0.3", "--start", "x=1/3"]
    words += ["--shading", "logarithmic", "--palette", "grey", "--title", "Rise", "--key", "--workers", "2"]
    printed = done("draw", "logistic", *words, *DRAWN, "--memory", "1GiB", *outs)
    assert printed.splitlines() == [str(tmp_path / name) for name in names]
    records = [read(tmp_path / name) for name in names]
    assert all(record["counts_digest"] == records[0]["counts_digest"] for record in records)
    made = records[0]["config"]["settings"]
    assert made["starts"] == [{"x": "0.3"}, {"x": "1/3"}]
    assert (made["samples"], made["transient"], made["dpi"], made["key"]) == (50, 50, 72, True)
    assert (made["shading"], made["palette"], made["title"]) == ("logarithmic", "grey", "Rise")
    assert not (tmp_path / ".parts").exists()


def test_draw_sets_parameters(tmp_path: Path) -> None:
    words = ("--across", "r=1.6:4.2", "--up", "n=0:3.5", "--set", "h=1/3", *DRAWN)
    done("draw", SMALL, *words, "--out", tmp_path / "a.png")
    assert read(tmp_path / "a.png")["config"]["settings"]["set"] == {"h": "1/3"}


def test_draw_takes_the_familys_own_view(tmp_path: Path) -> None:
    done("draw", "logistic", *DRAWN, "--out", tmp_path / "a.png")
    made = read(tmp_path / "a.png")["config"]["settings"]
    assert (made["across"]["name"], made["across"]["high"], made["up"]["name"]) == ("r", "4", "x")


def test_draw_takes_the_only_family_of_a_config(tmp_path: Path) -> None:
    words = ("--across", "r=1.6:4.2", "--up", "n=0:3.5", *DRAWN, "--out", tmp_path / "a.png")
    done("draw", SMALL, *words)
    assert read(tmp_path / "a.png")["config"]["family"]["name"] == "sound"
    none = tmp_path / "none.yml"
    none.write_text("plates: {rise: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1]}}")
    assert "defines 0 families; atlas draw needs a config with exactly one" in refused("draw", none, *words)


def asked(monkeypatch: pytest.MonkeyPatch, *words: object) -> Plate:
    """Return the plate that a command would draw."""
    drawn: list[Plate] = []

    def drawing(plate: Plate, *given: Any, **more: Any) -> Made:
        drawn.append(plate)
        return Made(0, {})

    monkeypatch.setattr("atlas.output.printing.draw_plate", drawing)
    done("draw", *words, "--out", "a.png")
    return drawn[0]


def test_draw_asks_for_a_plane(monkeypatch: pytest.MonkeyPatch) -> None:
    words = ("--across", "b=0:40", "--up", "cpa=0:1", "--draw", "lyapunov", "--steps", "500")
    words += ("--extinct", "adults=1e-6", "--extinct", "pupae=1e-3", "--supersampling", "2")
    plate = asked(monkeypatch, "insect_stages", *words)
    assert (plate.kind, plate.draw, plate.palette) == ("plane", "lyapunov", "balance")
    assert (plate.steps, plate.supersampling) == (500, 2)
    assert plate.extinct == {"adults": exact("1e-6"), "pupae": exact("1e-3")}


def test_draw_sets_patterns(monkeypatch: pytest.MonkeyPatch) -> None:
    entries = [row["r"] for row in asked(monkeypatch, "forced_logistic").family.word()]
    assert entries == ["a", "b"]
    plate = asked(monkeypatch, "forced_logistic", "--set", "r=a, a ,b")
    assert (plate.kind, plate.draw) == ("plane", "fate")
    assert [row["r"] for row in plate.family.word()] == ["a", "a", "b"]
    one = asked(monkeypatch, "forced_logistic", "--across", "a=3:4", "--up", "x=0:1", "--set", "r=a,")
    assert [row["r"] for row in one.family.word()] == ["a"]
    numbers = asked(monkeypatch, "forced_logistic", "--set", "r=a,7/2")
    assert [row["r"] for row in numbers.family.word()] == ["a", exact("3.5")]


def test_draw_starts_several_variables(monkeypatch: pytest.MonkeyPatch) -> None:
    words = ("--start", "larvae=10, pupae=2", "--start", "adults=5", "--by-attractor")
    plate = asked(monkeypatch, "insect_stages", "--across", "b=0:40", "--up", "adults=0:9", *words)
    assert plate.starts[0]["larvae"] == exact(10)
    assert plate.starts[0]["pupae"] == exact(2)
    assert plate.starts[1]["adults"] == exact(5)
    assert plate.by_attractor


def test_draw_records_and_follows(monkeypatch: pytest.MonkeyPatch) -> None:
    assert asked(monkeypatch, "logistic", "--record", "every=12, phase=3").record == Record(12, 3)
    assert asked(monkeypatch, "logistic", "--follow", "both").kind == "follow"
    plate = asked(monkeypatch, "henon", "--across", "x=-1:1", "--up", "y=-1:1", "--draw", "basin")
    assert plate.kind == "basin"
    plate = asked(monkeypatch, "henon", "--across", "x=-1:1", "--up", "y=-1:1")
    assert (plate.kind, plate.by_attractor, plate.record) == ("portrait", False, None)


# Wrong command lines

TO = ("--out", "{tmp}/a.png")
WRONG_WORDS: list[tuple[tuple[str, ...], str]] = [
    ((), "a command is missing; write one of render, draw, check"),
    (("rendr",), "there is no command 'rendr'; did you mean 'render'?"),
    (("re\nnder\x1b",), r"there is no command 're\nnder\x1b'; did you mean 'render'?"),
    (("--hlp",), "atlas has no option '--hlp'; did you mean '--help'?"),
    (("render",), "CONFIG is missing; write atlas render CONFIG"),
    (("render", "{small}", "more"), "unexpected extra argument (more); atlas render --help shows"),
    (("render", "{small}", "--frce"), "atlas render has no option '--frce'; did you mean '--force'?"),
    (("render", "{small}", "--force=1"), "--force: it takes no value; write it alone"),
    (("render", "{small}", "--out"), "--out: the value is missing; write --out DIR"),
    (("render", "{small}", "--only", "ries"), "--only: {small} has no output 'ries'; did you mean 'rise'?"),
    (("render", "{small}", "--workers", "0"), "--workers: '0' is not a whole number from 1 to 1024"),
    (("render", "{small}", "--workers", "1e3"), "--workers: '1e3' is not a whole number from 1 to 1024"),
    (("render", "{small}", "--workers", "²"), r"--workers: '\xb2' is not a whole number from 1 to 1024"),
    (("render", "{small}", "--memory", "lots"), "--memory: 'lots' is no amount of memory; write for example"),
    (("render", "{small}", "--memory", "512MiB"), "--memory: 512MiB is too little; this program needs 1GiB"),
    (("render", "nowhere.yaml"), "nowhere.yaml: there is no such file"),
    (("render", "{tmp}"), "this is a folder; name a YAML file"),
    (("render", "{small}", "--out", "{small}"), "--out: the folder '{small}' cannot be written to (it is"),
    (("render", "{small}", "--out", "{small}/a/b"), "cannot be written to (Not a directory); choose another"),
    (("check",), "CONFIG is missing; write atlas check CONFIG"),
    (("check", "nowhere.yaml"), "nowhere.yaml: there is no such file"),
    (("families", "logistik"), "there is no family 'logistik' in the catalogue; did you mean 'logistic'?"),
    (("show",), "FILE is missing; write atlas show FILE"),
    (("show", "{tmp}/none.png"), "none.png' cannot be read (No such file or directory)"),
    (("show", "{tmp}/no\nsuch\tfile"), r"/no\nsuch\tfile' cannot be read"),
    (("site", "no\nsuch", "--out", "{tmp}/s"), r"no\nsuch: there is no such index"),
    (("show", "{tmp}"), "cannot be read (Is a directory)"),
    (("show", "{small}"), "is no PNG, TIFF, PDF, SVG, tile index or NetCDF file"),
    (("site",), "INDEX is missing; write atlas site INDEX"),
    (("site", "{tmp}/none.sqlite"), "--out is missing; write --out DIR"),
    (("site", "{tmp}/none.sqlite", "--out", "{tmp}/s"), "none.sqlite: there is no such index"),
    (("site", "{small}", "--out", "{tmp}/s"), "is not a tile index"),
    (("draw",), "FAMILY is missing; write atlas draw FAMILY"),
    (("draw", "logistic"), "--out is missing; write --out FILE"),
    (("draw", "logistik", *TO), "there is no family 'logistik' in the catalogue; did you mean 'logistic'?"),
    (("draw", "nowhere.yml", *TO), "nowhere.yml: there is no such file"),
    (("draw", "logistic", "--acros", "r=1:2", *TO), "atlas draw has no option '--acros'; did you mean"),
    (("draw", "logistic", "--across", "r=1", *TO), "--across: 'r=1' is no axis; write NAME=LOW:HIGH"),
    (("draw", "logistic", "--across", "r=4:2", *TO), "from 4 to 2 is empty or reversed"),
    (("draw", "logistic", "--across", "r=nan:2", *TO), "--across.low: 'nan' is not a number"),
    (("draw", "logistic", "--across", "r=1:inf", *TO), "--across.high: 'inf' is not a number"),
    (("draw", "logistic", "--across", "q=1:2", *TO), "no parameter or state variable 'q'; allowed: r, x"),
    (("draw", "logistic", "--up", "r=1:2", *TO), "'r' stands on both axes"),
    (
        ("draw", "logistic", "--across", "x=0:1", "--up", "r=1:2", *TO),
        "(r) up cannot be drawn; swap the axes",
    ),
    (("draw", "{small}", *TO), "--across and --up: the family 'sound' has no view of its own; write for"),
    (("draw", "{small}", *TO), "write for instance --across h=LOW:HIGH --up n=LOW:HIGH"),
    (("draw", "{small}", "--across", "r=1:2", *TO), "of its own; write for instance --up n=LOW:HIGH"),
    (("draw", "hassell", "--set", "beta", *TO), "'beta' sets nothing; write NAME=VALUE, for instance beta=6"),
    (("draw", "tent", "--start", "0.3", *TO), "'0.3' sets nothing; write NAME=VALUE, for instance x=0.3"),
    (("draw", "hassell", "--set", "bета=1", *TO), "has no parameter"),
    (("draw", "hassell", "--set", "beta=x", *TO), "--set.beta: 'x' is not a number"),
    (("draw", "hassell", "--set", "beta=1", "--set", "beta=2", *TO), "--set: 'beta' is given twice"),
    (("draw", "logistic", "--set", "r=3", *TO), "--set.r: 'r' already runs along an axis; remove it here"),
    (("draw", "logistic", "--start", "y=1", *TO), "--start[1]: the family 'logistic' has no state variable"),
    (("draw", "logistic", "--start", "x=1e9", *TO), "--start[1].x: the start 1000000000 lies beyond"),
    (("draw", "logistic", "--samples", "many", *TO), "--samples: 'many' is not auto, or a whole number"),
    (("draw", "logistic", "--samples", "0", *TO), "--samples: '0' is out of range"),
    (("draw", "logistic", "--samples", "4294967296", *TO), "samples a column are more than a count can hold"),
    (("draw", "logistic", "--transient", "-1", *TO), "--transient: '-1' is out of range; write a whole"),
    (("draw", "logistic", "--dpi", "1e9", *TO), "--dpi: '1e9' is out of range"),
    (
        ("draw", "logistic", "--draw", "fate", *TO),
        "--draw: 'fate' cannot be drawn of a parameter (r) across and",
    ),
    (("draw", "logistic", "--draw", "fates", *TO), "--draw: 'fates' is unknown; did you mean 'fate'?"),
    (("draw", "hassell", "--up", "beta=2:9", "--draw", "density", *TO), "(beta) up; allowed: fate, period"),
    (
        ("draw", "logistic", "--steps", "500", *TO),
        "--steps: '500' belongs to a parameter plane or a basin chart",
    ),
    (("draw", "logistic", "--follow", "left", *TO), "--follow: 'left' is unknown; allowed: both, down, up"),
    (
        ("draw", "hassell", "--up", "beta=2:9", "--follow", "up", *TO),
        "and this is a parameter plane; leave it",
    ),
    (
        ("draw", "logistic", "--record", "12", *TO),
        "--record: '12' sets nothing; write NAME=VALUE, for instance",
    ),
    (
        ("draw", "logistic", "--record", "every=2,every=3", *TO),
        "--record: 'every' is given twice; give it once",
    ),
    (("draw", "logistic", "--record", "evry=2", *TO), "--record: the key 'evry' is unknown; did you mean"),
    (
        ("draw", "logistic", "--record", "every=2,phase=2", *TO),
        "--record.phase: the phase 2 is not below the",
    ),
    (
        ("draw", "logistic", "--extinct", "x=1e-6", *TO),
        "--extinct: 'x: 0.000001' belongs to a parameter plane",
    ),
    (("draw", "logistic", "--extinct", "x", *TO), "--extinct: 'x' sets nothing; write NAME=VALUE, for inst"),
    (
        ("draw", "forced_logistic", "--extinct", "y=1", *TO),
        "--extinct: the family 'forced_logistic' has no sta",
    ),
    (
        ("draw", "forced_logistic", "--across", "r=3:4", *TO),
        "--across: 'r' is a pattern in time, which cannot",
    ),
    (
        ("draw", "forced_logistic", "--set", "r=a,q", *TO),
        "--set.r.pattern[2]: there is no parameter 'q'; all",
    ),
    (("draw", "forced_logistic", "--set", "r=a,,b", *TO), "--set.r.pattern[2]: '' is not a number"),
    (
        ("draw", "forced_logistic", "--set", "r=3", *TO),
        "--set.r: 'r' is the pattern [a, b], which no number can",
    ),
    (
        ("draw", "hassell", "--set", "beta=1,5", *TO),
        "--set.beta: 'beta' is a plain parameter, no pattern; write",
    ),
    (
        ("draw", "logistic", "--by-attractor", "--follow", "up", *TO),
        "--by-attractor: 'true' belongs to an orbit",
    ),
    (("draw", "logistic", "--supersampling", "3", *TO), "--supersampling: '3' is not one of 1, 2, 4"),
    (
        ("draw", "logistic", "--supersampling", "2", *TO),
        "--supersampling: '2' belongs to a parameter plane or",
    ),
    (
        ("draw", "logistic", "--palette", "wheel", *TO),
        "--palette: 'wheel' is a cyclic palette and density needs",
    ),
    (("draw", "logistic", "--start", "x=0.3,x=0.4", *TO), "--start: 'x' is given twice; give it once"),
    (("draw", "logistic", "--start", "x=0.3,", *TO), "--start: '' sets nothing; write NAME=VALUE"),
    (
        ("draw", "standard", "--across", "K=0:1", "--up", "theta=0:7", *TO),
        "reaches beyond 0 to 2*pi, to which",
    ),
    (("draw", "logistic", "--size", "a4", *TO), "--size: 'a4' cannot be used: a size is written 180x110"),
    (("draw", "logistic", "--size", "0x10", *TO), "--size: '0x10' cannot be used"),
    (("draw", "logistic", "--size", "5x5px", *TO), "leaves no room"),
    (("draw", "logistic", "--size", "90000x90000px", *TO), "90000 x 90000 pixels would need"),
    (("draw", "logistic", "--size", "180x110", "--dpi", "90000", *TO), "pixels would need"),
    (("draw", "logistic", "--shading", "equalized", *TO), "did you mean 'equalised'?"),
    (("draw", "logistic", "--palette", "gray", *TO), "--palette: 'gray' is unknown; did you mean 'grey'?"),
    (("draw", "logistic", "--title", "漁業", *TO), "U+6F01, which the font DejaVu Sans lacks"),
    (("draw", "logistic", "--out", "{tmp}/a.gif"), "a.gif' has no suffix of a picture; did you mean"),
    (("draw", "logistic", "--out", "{tmp}/a.png", "--out", "b.png"), "are both png; give each format once"),
    (("draw", "logistic", "--out", "{small}/a.png"), "{small}' cannot be written to (it is a file); choose"),
    (("draw", "logistic", "--out", "/proc/a.png"), "--out: the folder '/proc' cannot be written to"),
    (("draw", "logistic", "--across", "r=3:3.0000000000000001", *TO), "finer than float64 can resolve"),
]


@pytest.mark.parametrize(("words", "sentence"), WRONG_WORDS)
def test_a_wrong_command_line_gets_one_sentence(
    tmp_path: Path, words: tuple[str, ...], sentence: str
) -> None:
    places = {"tmp": str(tmp_path), "small": str(SMALL)}
    assert sentence.format(**places) in refused(*(word.format(**places) for word in words))
    assert list(tmp_path.iterdir()) == []


def test_site_refuses_other_colours_and_folders_with_other_files(out: Path, tmp_path: Path) -> None:
    index = out / "tiles/index.sqlite"
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine/notes.txt").write_text("mine")
    for words, sentence in (
        (("--palette", "bleu"), "--palette: 'bleu' is unknown; did you mean 'blue'?"),
        (("--shading", "liner"), "--shading: 'liner' is unknown; did you mean 'linear'?"),
        (("--background", "red"), "--background: 'red' is not white, black or a colour"),
    ):
        assert sentence in refused("site", index, "--out", tmp_path / "site", *words)
    assert "holds other files, which a site would replace" in refused(
        "site", index, "--out", tmp_path / "mine"
    )
    assert ", such as 'notes.txt'; name a new folder" in refused("site", index, "--out", tmp_path / "mine")
    assert "cannot be used (Not a directory)" in refused("site", index, "--out", SMALL)
    assert "cannot be written to (it is a file)" in refused("site", index, "--out", SMALL / "site")
    assert {str(path.relative_to(tmp_path)) for path in tmp_path.rglob("*")} == {"mine", "mine/notes.txt"}


@pytest.mark.parametrize(
    ("held", "foreign"),
    [
        ({"page.js": "", "note.txt": "mine"}, "note.txt"),
        ({"meta.js": "window.ATLAS_META = {};", "page.js": "", "thesis.tex": "mine"}, "thesis.tex"),
        ({"meta.js": "mine", "page.js": ""}, "meta.js"),
        ({"index.html": "mine", "page.js": ""}, "index.html"),
    ],
)
def test_site_replaces_no_folder_that_holds_anything_else(
    out: Path, tmp_path: Path, held: dict[str, str], foreign: str
) -> None:
    site = tmp_path / "mine"
    site.mkdir()
    for name, text in held.items():
        (site / name).write_text(text)
    told = refused("site", out / "tiles/index.sqlite", "--out", site)
    assert f"which a site would replace, such as '{foreign}'; name a new folder" in told
    assert {str(path.relative_to(tmp_path)) for path in tmp_path.rglob("*")} == {
        "mine",
        *(f"mine/{name}" for name in held),
    }
    assert {path.name: path.read_text() for path in site.iterdir()} == held


# Wrong configs

RISE = "  rise: {family: logistic, across: [r, 2.8, 4], up: [x, 0, 1], key: true}"
STEP = "step: {n: s * exp(r * (1 - s))}"


def rise(**keys: str) -> tuple[str, str]:
    """Return the plate named rise, and the same with keys changed, added or (empty) left out."""
    kept = {"family": "logistic", "across": "[r, 2.8, 4]", "up": "[x, 0, 1]", **keys}
    return RISE, "  rise: {" + ", ".join(f"{key}: {text}" for key, text in kept.items() if text) + "}"


def step(formula: str) -> tuple[str, str]:
    """Return the step of the family named sound, and another one in its place."""
    return STEP, "step: {n: '" + formula + "'}"


SOUND = "families.sound.step.n"
WRONG_CONFIGS: dict[str, tuple[tuple[str, str], str]] = {
    "unknown section": (("plates:", "plate:"), "the section 'plate' is unknown; did you mean 'plates'?"),
    "unknown key": (
        rise(pallete="grey"),
        "plates.rise: the key 'pallete' is unknown; did you mean",
    ),
    "missing key": (rise(up=""), "plates.rise: the key 'up' is missing"),
    "wrong type": (rise(dpi="high"), "plates.rise.dpi: 'high' is not a whole number from 10 to 100000"),
    "list for text": (rise(title="[a]"), "plates.rise.title: a list is not a line of text"),
    "text for mapping": (rise(set="r"), "plates.rise.set: 'r' stands where a mapping"),
    "reversed": (
        rise(across="[r, 4, 2.8]"),
        "plates.rise.across: axis 'r': the interval from 4 to 2.8",
    ),
    "empty": (rise(up="[x, 1, 1]"), "plates.rise.up: axis 'x': the interval from 1 to 1 is empty"),
    "nan": (rise(across="[r, .nan, 4]"), "plates.rise.across.low: '.nan' is not a number"),
    "inf": (rise(across="[r, 2, inf]"), "plates.rise.across.high: 'inf' is not a number"),
    "huge number": (rise(up="[x, 0, 1e400]"), "plates.rise.up.high: a number of more than 390 digits"),
    "unknown family": (rise(family="logistics"), "there is no family 'logistics'; did you mean 'logistic'?"),
    "both axes": (rise(up="[r, 0, 1]"), "plates.rise.up: 'r' stands on both axes"),
    "two plates of one name": ((RISE, f"{RISE}\n{RISE}"), "the key 'rise' is given twice, first in line"),
    "two outputs of one name": (("  tiles:", "  Rise:"), "plates.rise has this name already"),
    "slash": (("  rise:", "  a/rise:"), "plates.a/rise: 'a/rise' cannot name an output"),
    "backslash": (("  rise:", "  a\\rise:"), "cannot name an output; use letters"),
    "parent": (("  rise:", "  ..:"), "plates...: '..' cannot name an output"),
    "too large": (rise(size="90000x90000px"), "rise: 90000 x 90000 pixels would need "),
    "too fine": (
        rise(size="180x110", dpi="90000"),
        "the budget is 2.0 GiB; make it smaller",
    ),
    "many tiles": (("levels: {across: 2, up: 1}", "levels: 40"), "tiles: "),
    "unknown name": (step("s * exp(q)"), f"{SOUND}: the name 'q' is unknown at character 9; allowed: abs"),
    "attribute": (step("s.real"), f"{SOUND}: "),
    "call": (step("open(s)"), f"{SOUND}: "),
    "import": (step('__import__("os")'), f"{SOUND}: "),
    "lambda": (step("(lambda: 1)()"), f"{SOUND}: "),
    "comprehension": (step("[s for s in s]"), f"{SOUND}: "),
    "dunder": (step("s.__class__"), f"{SOUND}: "),
    "power": (step("s ** 999999999"), f"{SOUND}: "),
    "towers": (step("9**9**9**9"), f"{SOUND}: "),
    "ten kilobytes": (step("s + " * 2500 + "s"), f"{SOUND}: "),
    "nesting": (step("(" * 500 + "s" + ")" * 500), f"{SOUND}: "),
    "many signs": (step("-" * 1500 + "s"), f"{SOUND}: "),
    "two states": (("state: {n: {label", "state: {m: 1, n: {label"), "families.sound"),
    "not yaml": (("plates:", "plates: ["), "this is not YAML: "),
    "tab": (("\nplates:", "\n\tplates:"), "this is not YAML: "),
    "tag": (
        rise(title="!!python/object/apply:os.system [ls]"),
        "is not allowed; a config holds plain",
    ),
    "binary": (("title: Harrow", "title: \0Harrow"), "this is not YAML: "),
}


@pytest.mark.parametrize("wrong", WRONG_CONFIGS)
@pytest.mark.parametrize("words", [("check",), ("render", "--out", "out")])
def test_a_wrong_config_gets_one_sentence_and_nothing_is_lost(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, wrong: str, words: tuple[str, ...]
) -> None:
    (old, new), sentence = WRONG_CONFIGS[wrong]
    text = SMALL.read_text("utf-8")
    assert old in text
    monkeypatch.chdir(tmp_path)
    Path("wrong.yaml").write_text(text.replace(old, new, 1), "utf-8")
    kept = Path("out/rise.png")
    kept.parent.mkdir()
    kept.write_bytes(b"made before")
    said = refused(*words, "wrong.yaml")
    assert said.startswith("wrong.yaml: ")
    assert sentence in said
    assert len(said) < 400
    assert kept.read_bytes() == b"made before"
    assert sorted(str(path) for path in Path().rglob("*")) == ["out", "out/rise.png", "wrong.yaml"]


ANCHORS = "\n".join(
    ["a0: &a0 [" + ", ".join(["x"] * 9) + "]"]
    + [f"a{k}: &a{k} [" + ", ".join([f"*a{k - 1}"] * 9) + "]" for k in range(1, 12)]
)
NO_CONFIGS: dict[str, tuple[bytes, str]] = {
    "anchors": (ANCHORS.encode(), "with aliases expanded the file holds more than 100000 values"),
    "endless": (b"a: &a [*a]", "refers to the value that holds it"),
    "empty": (b"", "the file is empty"),
    "text": (b"just words", "'just words' stands where a mapping"),
    "latin": ("title: Größe".encode("latin-1"), "byte 10 is not UTF-8"),
    "picture": (b"\x89PNG\r\n\x1a\n\0\0\0", "byte 1 is not UTF-8"),
    "large": (b"# " + b"x" * (1 << 20), "the file is larger than 1 MiB"),
    "nothing to make": (b"title: nothing", "there is nothing to make here"),
    "families only": (
        b"families: {own: {state: {x: {start: 0.3}}, parameters: {r: {default: 3}}, step: {x: r*x*(1-x)}}}",
        "there is nothing to render; add a plate under plates:",
    ),
    "nested": (b"[" * 100_000, "nested deeper than 24 levels"),
}


@pytest.mark.parametrize("wrong", NO_CONFIGS)
@pytest.mark.parametrize("name", ["check", "render"])
def test_a_file_that_is_no_config_gets_one_sentence(tmp_path: Path, wrong: str, name: str) -> None:
    content, sentence = NO_CONFIGS[wrong]
    path = tmp_path / "wrong.yaml"
    path.write_bytes(content)
    said = refused(name, path, *(("--out", tmp_path / "out") if name == "render" else ()))
    assert said.startswith(f"{path}: ")
    assert sentence in said
    assert list(tmp_path.iterdir()) == [path]


# Any words at all

OF_DRAW = (
    *("--across", "--up", "--set", "--start", "--transient", "--samples", "--size", "--dpi", "--shading"),
    *("--palette", "--title", "--key", "--workers", "--memory", "--out", "--draw", "--follow", "--steps"),
    *("--record", "--extinct", "--by-attractor", "--supersampling"),
)
OPTIONS = (*OF_DRAW, "--only", "--force", "--background")
PIECES = st.sampled_from([*"rxn=:.-+*/0123456789e", "pi", "nan", "inf", "px", "GiB", "auto", ",", "[", "\n"])
TEXTS = st.text(max_size=12) | st.lists(PIECES, max_size=10).map("".join)
VALUES = TEXTS | st.sampled_from(
    ["r=2.8:4", "x=0:1", "x=0.3", "200x150px", "100", "grey", "a.png", "2GiB", "fate", "every=2", "r=a,b,b"]
)


def said_one_sentence(words: list[str]) -> Ran:
    ran = run(*words)
    assert ran.code in (0, 2), ran
    if ran.code == 2:
        sentence_of(ran)
        assert ran.err[:-1].isprintable()
    else:
        assert ran.err == ""
    return ran


@settings(max_examples=300)
@given(st.lists(st.tuples(st.sampled_from(OF_DRAW), VALUES), max_size=5), st.sampled_from(NAMES) | TEXTS)
@example([("--across", "r=2.8:4"), ("--out", "a.png")], "logistic")
@example([("--title", "\u200b"), ("--out", "a.png")], "logistic")
def test_no_words_of_draw_end_in_a_traceback(options: list[tuple[str, str]], family: str) -> None:
    drawn: list[Any] = []

    def drawing(*given: Any, **more: Any) -> Made:
        drawn.append(given)
        return Made(0, {})

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("atlas.output.printing.draw_plate", drawing)
        ran = said_one_sentence(["draw", family, *(word for option in options for word in option)])
    assert bool(drawn) <= (ran.code == 0)


@settings(max_examples=200)
@given(st.lists(st.sampled_from([*BUILT, *OPTIONS]) | VALUES, max_size=6))
def test_no_words_at_all_end_in_a_traceback(words: list[str]) -> None:
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("atlas.output.printing.draw_plate", lambda *given, **more: Made(0, {}))
        said_one_sentence([word for word in words if word not in ("--help", "-h")])


# Streams


def test_exit_codes_and_streams_of_a_real_process(tmp_path: Path) -> None:
    ran = command("draw", "logistic", *DRAWN, "--out", tmp_path / "a.png")
    assert (ran.returncode, ran.stdout, ran.stderr) == (0, f"{tmp_path}/a.png\n", "")
    wrong = command("draw", "logistic", *DRAWN, "--out", tmp_path / "a.bmp")
    assert (wrong.returncode, wrong.stdout) == (2, "")
    assert wrong.stderr.startswith("atlas: --out: ")
    assert wrong.stderr.count("\n") == 1


def test_progress_is_shown_on_a_terminal_and_results_are_not_mixed_with_it(tmp_path: Path) -> None:
    ours, theirs = pty.openpty()
    start = [sys.executable, "-c", "from atlas.cli import main; main()", "render", str(SMALL)]
    environment = {**os.environ, "TERM": "xterm", "COLUMNS": "120"}
    with subprocess.Popen(
        [*start, "--out", str(tmp_path), "--only", "rise"],
        stdout=subprocess.PIPE,
        stderr=theirs,
        env=environment,
    ) as process:
        os.close(theirs)
        shown = b""
        with contextlib.suppress(OSError):
            while piece := os.read(ours, 4096):
                shown += piece
        printed = process.stdout.read() if process.stdout else b""
    os.close(ours)
    assert process.returncode == 0
    assert b"rise" in shown
    assert b"counting" in shown
    assert printed.splitlines()[-1] == b"1 made, 0 skipped, 0 failed"
    assert b"\x1b" not in printed


def _closed() -> int:
    reader, writer = os.pipe()
    os.close(reader)
    return writer


@pytest.mark.parametrize("target", [_closed, lambda: os.open("/dev/full", os.O_WRONLY)])
def test_a_reader_that_went_away_and_a_full_disk_are_no_traceback(target: Callable[[], int]) -> None:
    handle = target()
    start = [sys.executable, "-c", "from atlas.cli import main; main()", "schema"]
    ran = subprocess.run(start, stdout=handle, stderr=subprocess.PIPE, text=True, check=False)
    os.close(handle)
    assert ran.returncode == 1
    assert "Traceback" not in ran.stderr
    assert "Exception" not in ran.stderr
    assert len(ran.stderr.splitlines()) <= 1


def test_names_of_files_need_not_be_text(tmp_path: Path) -> None:
    name = os.fsdecode(os.fsencode(tmp_path) + b"/\xff.png")
    ran = command("draw", "logistic", *DRAWN, "--out", name)
    assert (ran.returncode, ran.stderr) == (0, "")
    assert ran.stdout == f"{tmp_path}/\\udcff.png\n"
    shown = command("show", name, env={**os.environ, "PYTHONIOENCODING": "ascii"})
    assert shown.returncode == 0
    assert json.loads(shown.stdout)["kind"] == "plate"
    gone = command("show", name + "x")
    assert (gone.returncode, gone.stderr.count("\n")) == (2, 1)
