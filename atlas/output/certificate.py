"""The certificate: how an output was made, completely enough to make it again; carried inside the file."""

from __future__ import annotations

import json
import platform
from collections.abc import Mapping
from importlib import metadata
from typing import Any

from atlas.config.jobs import COUNTING_VERSION
from atlas.output.certificate_reader import read

__all__ = ["as_text", "certificate", "read", "versions"]

RECORD_VERSION = 1
DISTRIBUTION = "iterated-map-atlas"
LIBRARIES = ("numpy", "numba", "sympy", "datashader", "matplotlib", "pillow")


def certificate(
    kind: str,
    name: str,
    config: Mapping[str, Any],
    counts_digest: str,
    shares: Mapping[str, Any],
    samples: Mapping[str, Any],
) -> dict[str, Any]:
    """Return the record of one output: no dates, no machine, no user, no paths.

    Parameters
    ----------
    kind : str
        ``plate``, ``figure`` or ``tile set``.
    name : str
        Name of the output in its config.
    config : mapping
        The normalised job and its family, numbers as text.
    counts_digest : str
        Digest of the counts that were drawn.
    shares : mapping
        Shares of samples: unsettled, escaped, collapsed and so on.
    samples : mapping
        How many samples were taken.

    Returns
    -------
    dict
        What JSON can hold; versions come from the installed distributions, nothing is imported.
    """
    return {
        "record": RECORD_VERSION,
        "kind": kind,
        "name": name,
        "config": dict(config),
        "counts_digest": counts_digest,
        "shares": dict(shares),
        "samples": dict(samples),
        "versions": versions(),
    }


def versions() -> dict[str, Any]:
    """Return the versions that bear on an output: ours, the counting rules', Python's and the libraries'."""
    found: dict[str, Any] = {"counting": COUNTING_VERSION, "python": platform.python_version()}
    for library in (DISTRIBUTION, *LIBRARIES):
        try:
            found["atlas" if library == DISTRIBUTION else library] = metadata.version(library)
        except metadata.PackageNotFoundError:
            continue
    return dict(sorted(found.items()))


def as_text(record: Mapping[str, Any]) -> str:
    """Return a record as one line of ASCII JSON with sorted keys.

    Raises
    ------
    ValueError
        When it holds a number that is not finite.

    Examples
    --------
    >>> as_text({"title": "Größe", "record": 1})
    '{"record":1,"title":"Gr\\\\u00f6\\\\u00dfe"}'
    """
    return json.dumps(record, ensure_ascii=True, sort_keys=True, separators=(",", ":"), allow_nan=False)
