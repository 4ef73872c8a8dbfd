"""The kernels run as plain Python give the same counts, bit for bit, as compiled."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from tests.world.uncompiled import CASES, PLANE, STATES, counted, counted_states, plane

ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def uncompiled(tmp_path_factory: pytest.TempPathFactory) -> Any:
    """Return the cases counted by another process that compiles nothing."""
    folder = tmp_path_factory.mktemp("uncompiled")
    environment = {**os.environ, "NUMBA_DISABLE_JIT": "1", "ATLAS_CACHE": str(folder)}
    command = [sys.executable, "-W", "error", "-m", "tests.world.uncompiled"]
    run = subprocess.run(command, cwd=ROOT, env=environment, capture_output=True, text=True, check=False)
    assert run.returncode == 0, run.stderr
    return json.loads(run.stdout)


@pytest.mark.parametrize("case", CASES)
def test_compiled_and_plain_counts_are_equal(case: str, uncompiled: Any) -> None:
    assert counted(case) == uncompiled[case]


def test_counts_of_two_variables_are_equal(uncompiled: Any) -> None:
    assert counted_states() == uncompiled[STATES]
    assert sum(uncompiled[STATES]["escaped"])


def test_planes_are_equal(uncompiled: Any) -> None:
    assert plane() == uncompiled[PLANE]
    assert len(set(uncompiled[PLANE]["fate"])) > 3


def test_the_cases_meet_what_kernels_decide(uncompiled: Any) -> None:
    kinds = ("escaped", "unsettled", "collapsed")
    cases = [uncompiled[case] for case in CASES]
    assert all(any(sum(made[kind]) for made in cases) for kind in kinds)
    assert any(made["filled"] for made in cases)
    assert any(made["on_repelling"] for made in cases)
