"""Every failure the program reports: one sentence that names the place, what was found and the remedy."""

from __future__ import annotations

import difflib
from collections.abc import Iterable


class Failure(Exception):
    """Something failed at run time; the message is one sentence for the user.

    Attributes
    ----------
    exit_code : int
        What a command that ends with this failure returns to the shell.
    """

    exit_code = 1


class Refusal(Failure):
    """The request is wrong: nothing was computed, nothing was written."""

    exit_code = 2


class NumberRefused(Refusal):
    """A text that should be a number is none that the program accepts."""


class WindowRefused(Refusal):
    """An axis or a view that cannot be drawn."""


class IndexRefused(Refusal):
    """A file that is not a tile index of a version this program reads."""


class TooLarge(Refusal):
    """A request that would exceed the memory budget or the address space."""


class OutputFailed(Failure):
    """A file could not be written: the disk is full or the folder is closed."""


def nearest(word: str, choices: Iterable[str]) -> str:
    """Return a hint ``; did you mean 'x'?`` for a mistyped word, or the list of what is allowed.

    Parameters
    ----------
    word : str
        What was found.
    choices : iterable of str
        What is allowed.

    Returns
    -------
    str
        A clause to be appended to a sentence, without its full stop.
    """
    known = sorted(choices)
    close = difflib.get_close_matches(word, known, n=1, cutoff=0.6)
    if close:
        return f"; did you mean '{close[0]}'?"
    return f"; allowed: {', '.join(known)}" if known else ""
