"""Write ``tiles/colour_tables.py`` after a palette changed: ``python -m tests.tiles.make_colour_tables``."""

from pathlib import Path

import tiles
from tiles.palette import PALETTES
from tiles.shading import shades_by_datashader

HEAD = '''"""Shades of the built-in palettes as datashader makes them: hexadecimal, lowest density first.

Written by ``python -m tests.tiles.make_colour_tables``; a test compares every byte with datashader's answer.
"""

'''
PATH = Path(tiles.__file__).with_name("colour_tables.py")


def text() -> str:
    """Return the whole module."""
    lines = [HEAD, "SHADES = {\n"]
    for name, row in PALETTES.items():
        if row.kind == "categorical":
            continue
        digits = shades_by_datashader(row).tobytes().hex()
        lines.append(f'    "{name}": (\n')
        lines.extend(f'        "{digits[at : at + 96]}"\n' for at in range(0, len(digits), 96))
        lines.append("    ),\n")
    return "".join([*lines, "}\n"])


if __name__ == "__main__":
    PATH.write_text(text(), encoding="ascii")
