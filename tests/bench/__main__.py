"""Benchmarks: every figure is a ratio of two times taken in this run. ``python -m tests.bench [PART…]``."""

from __future__ import annotations

import sys

from tests.bench import commands, kernels, planes, plates, tile_sets

PARTS = {"kernels": kernels.run, "plates": plates.run, "tiles": tile_sets.run, "commands": commands.run}
PARTS |= {"planes": planes.run, "wide": planes.memory}


def main(chosen: list[str]) -> int:
    """Run the parts named, or all."""
    for name in chosen:
        if name not in PARTS:
            print(f"there is no part '{name}'; there are {', '.join(PARTS)}", file=sys.stderr)
            return 2
    for name, run in PARTS.items():
        if not chosen or name in chosen:
            print(f"\n{name}")
            run()
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
