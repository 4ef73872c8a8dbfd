"""Refusals of the application: each names the place, what was found and what is allowed."""

from __future__ import annotations

from tiles.errors import Refusal

INTERRUPTED = 130
"""What a command returns to the shell after Ctrl-C."""


class FormulaRefused(Refusal):
    """A text that is no formula of the closed language, or a formula beyond its bounds."""


class FamilyRefused(Refusal):
    """A map family that is incomplete, contradicts itself or does not exist."""


class ConfigRefused(Refusal):
    """A config file that cannot be read or asks for something that does not exist."""


class PlanRefused(Refusal):
    """A job that is well written and cannot be carried out, with the figure it would need."""


class CertificateRefused(Refusal):
    """A file that carries no record of how it was made."""


class PointsRefused(Refusal):
    """A table of points that cannot be binned."""


def shown(found: object, length: int = 60) -> str:
    """Return a value as it is quoted in a sentence: on one line, in ASCII, shortened.

    Parameters
    ----------
    found : object
        What stood in the request.
    length : int
        Longest text returned.

    Returns
    -------
    str

    Examples
    --------
    >>> shown("a\\nb")
    "'a\\\\nb'"
    """
    if isinstance(found, str):
        text = ascii(found if len(found) <= length else found[:length] + "...")
        return text if len(text) <= 2 * length else text[: 2 * length] + "...'"
    if isinstance(found, dict):
        return "a mapping"
    if isinstance(found, list | tuple):
        return "a list"
    if found is None:
        return "nothing"
    text = ascii(found)
    return text if len(text) <= length else text[:length] + "..."
