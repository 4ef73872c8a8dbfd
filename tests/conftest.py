"""Settings of the whole suite: property tests repeat exactly, compiled maps are kept between runs."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from hypothesis import settings

settings.register_profile("atlas", deadline=None, derandomize=True, print_blob=True, database=None)
settings.load_profile("atlas")
os.environ.setdefault(
    "ATLAS_CACHE", str(Path(tempfile.gettempdir()) / f"iterated-map-atlas-tests-{os.getuid()}")
)
