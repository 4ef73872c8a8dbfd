"""The folder of a site while it grows: going on with one that an interrupted run left, and its final name."""

from __future__ import annotations

import json
import os
import shutil
from pathlib import Path
from typing import Any


def begin(site: Path, made_from: dict[str, Any]) -> None:
    """Keep an unfinished folder that was made from the same counts and colours, else start a new one."""
    stamp, text = site / ".made-from", json.dumps(made_from, sort_keys=True)
    if not stamp.is_file() or stamp.read_text("ascii") != text:
        if site.exists():
            shutil.rmtree(site)
        site.mkdir(parents=True)
        stamp.write_text(text, "ascii")


def name(site: Path, out_dir: Path) -> None:
    """Give a complete folder its name; the folder that had it before goes."""
    (site / ".made-from").unlink()
    out_dir.parent.mkdir(parents=True, exist_ok=True)
    old = site.with_name(f"{site.name}.old")
    if old.exists():
        shutil.rmtree(old)
    if out_dir.exists():
        os.replace(out_dir, old)
    os.replace(site, out_dir)
    shutil.rmtree(old, ignore_errors=True)
