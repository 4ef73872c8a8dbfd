"""Texts of a figure: axis labels with italic symbols, numbers as print sets them, and their widths."""

from __future__ import annotations

import re
from fractions import Fraction

MM_PER_POINT = 25.4 / 72
# Advance widths of the font DejaVu Sans, in units of the font size (from its own metrics).
_WIDTHS = {
    **dict.fromkeys("0123456789", 0.636),
    **dict.fromkeys(".,; ", 0.318),
    **dict.fromkeys("−+×=", 0.838),
    **dict.fromkeys("⁰¹²³⁴⁵⁶⁷⁸⁹", 0.401),
    **dict.fromkeys("()", 0.390),
    **{"⁻": 0.528, "π": 0.602, "/": 0.337, "-": 0.361, "…": 1.0, "%": 0.950, "±": 0.838, ":": 0.337},
    **dict.fromkeys("ijl", 0.278),
    **{"f": 0.352, "t": 0.392, "r": 0.411, "_": 0.5, "s": 0.521, "z": 0.525, "c": 0.550, "k": 0.579},
    **dict.fromkeys("vxy", 0.592),
    **dict.fromkeys("oaebdgpqhnu", 0.635),
    **{"w": 0.818, "m": 0.974},
}
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_GREEK = {
    *("alpha", "beta", "gamma", "delta", "epsilon", "zeta", "eta", "theta", "iota", "kappa", "lambda", "mu"),
    *("nu", "xi", "pi", "rho", "sigma", "tau", "upsilon", "phi", "chi", "psi", "omega"),
    *("Gamma", "Delta", "Theta", "Lambda", "Xi", "Pi", "Sigma", "Upsilon", "Phi", "Psi", "Omega"),
}


def text_width(text: str, points: float) -> float:
    """Return how wide a text is set, in millimetres, without any drawing library.

    Parameters
    ----------
    text : str
        Digits, signs and small letters have the font's own widths, others count 0.65 of the font size.
    points : float
        Font size.
    """
    return sum(_WIDTHS.get(character, 0.65) for character in text) * points * MM_PER_POINT


def decimal_text(value: Fraction, places: int) -> str:
    """Return a number with a fixed count of decimals and a true minus sign; zero is a bare ``0``.

    Parameters
    ----------
    value : Fraction
        A multiple of ``10**-places``, so that the text is exact.
    places : int
        Decimals, at least 0.
    """
    scaled = value * 10**places
    if scaled.denominator != 1:
        raise ValueError(f"{value} has more than {places} decimals")
    if scaled == 0:
        return "0"
    digits = str(abs(scaled.numerator)).rjust(places + 1, "0")
    sign = "−" if scaled < 0 else ""
    return sign + (f"{digits[:-places]}.{digits[-places:]}" if places else digits)


def power_text(exponent: int) -> str:
    """Return a power of ten as print sets it: ``10⁻⁹``."""
    return "10" + str(exponent).translate(_RAISED)


def pi_text(ratio: Fraction) -> str:
    """Return a multiple of pi as print sets it: ``3π/2``, ``−π``, ``0``."""
    if ratio == 0:
        return "0"
    top, bottom = abs(ratio.numerator), ratio.denominator
    sign = "−" if ratio < 0 else ""
    return f"{sign}{'' if top == 1 else top}π{'' if bottom == 1 else f'/{bottom}'}"


def plain(text: str) -> str:
    """Return a text of the user's in one line, safe from being read as mathematics."""
    return " ".join(text.split()).replace("$", r"\$")


def symbol(name: str) -> str:
    """Return a variable's name as mathematical type: italic letter, Greek letter, subscript.

    Examples
    --------
    >>> symbol("r"), symbol("beta"), symbol("x0"), symbol("n_max")
    ('$r$', '$\\\\beta$', '$x_{0}$', '$n_{\\\\mathrm{max}}$')
    """
    parts = re.fullmatch(r"([A-Za-z]+?)(?:_(\w+)|(\d+))?", name)
    if parts is None:
        return plain(name)
    letters, word, number = parts.groups()
    base = letters if len(letters) == 1 else rf"\mathit{{{letters}}}"
    if letters in _GREEK:
        base = rf"\{letters}"
    if word and not word.isdigit():
        return rf"${base}_{{\mathrm{{{word.replace('_', ' ')}}}}}$"
    low = word or number
    return f"${base}_{{{low}}}$" if low else f"${base}$"


def axis_text(name: str, label: str | None = None, unit: str | None = None) -> str:
    """Return an axis label: what the quantity is, its italic symbol, its unit in brackets.

    Parameters
    ----------
    name : str
        Name of the parameter or the state variable in the formulas.
    label, unit : str, optional
        The family's words, empty where it has none; a label that only repeats the name is said once.

    Examples
    --------
    >>> axis_text("n", "stock", "kt")
    'stock $n$ (kt)'
    """
    words = plain(label or "")
    if words.casefold() == name.casefold():
        parts = [symbol(name) if len(name) == 1 or name in _GREEK else words]
    else:
        parts = [words, symbol(name)] if words else [symbol(name)]
    if unit and unit.strip():
        parts.append(f"({plain(unit)})")
    return " ".join(parts)
