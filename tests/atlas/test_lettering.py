"""Widths and texts that figures are lettered with."""

from __future__ import annotations

from fractions import Fraction

import pytest

from atlas.figure.lettering import (
    MM_PER_POINT,
    axis_text,
    decimal_text,
    pi_text,
    plain,
    power_text,
    symbol,
    text_width,
)


@pytest.mark.parametrize(
    "text", ["0123456789", "−12.5", "3.5699456 + … × 10⁻⁹", "(0.10 + … × 10⁻³) π", "3π/2"]
)
def test_widths_are_those_of_the_font(text: str) -> None:
    from fontTools.ttLib import TTFont
    from matplotlib.font_manager import findfont

    font = TTFont(findfont("DejaVu Sans"))
    names, widths = font.getBestCmap(), font["hmtx"]
    units = sum(widths[names[ord(character)]][0] for character in text) / font["head"].unitsPerEm
    assert text_width(text, 10.0) == pytest.approx(units * 10 * MM_PER_POINT, rel=0.002)


def test_decimals_are_exact_or_refused() -> None:
    assert decimal_text(Fraction(-1, 4), 3) == "−0.250"
    assert decimal_text(Fraction(0), 3) == "0"
    assert decimal_text(Fraction(1200), 0) == "1200"
    assert decimal_text(Fraction("1e-30"), 30) == "0." + "0" * 29 + "1"
    with pytest.raises(ValueError, match="decimals"):
        decimal_text(Fraction(1, 4), 1)


def test_powers_and_multiples_of_pi() -> None:
    assert power_text(-12) == "10⁻¹²"
    assert [pi_text(Fraction(n, 2)) for n in (-3, -2, 0, 1, 4)] == ["−3π/2", "−π", "0", "π/2", "2π"]


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("r", "$r$"),
        ("beta", r"$\beta$"),
        ("Omega", r"$\Omega$"),
        ("x0", "$x_{0}$"),
        ("n_max", r"$n_{\mathrm{max}}$"),
        ("beta_2", r"$\beta_{2}$"),
        ("growth", r"$\mathit{growth}$"),
    ],
)
def test_symbols(name: str, expected: str) -> None:
    assert symbol(name) == expected


def test_axis_labels() -> None:
    assert axis_text("r", "intrinsic growth rate") == "intrinsic growth rate $r$"
    assert axis_text("n", "stock", "kt") == "stock $n$ (kt)"
    assert axis_text("growth", "growth") == "growth"
    assert axis_text("x") == "$x$"
    assert axis_text("r", "r") == "$r$"
    assert axis_text("beta", "beta", "1/a") == r"$\beta$ (1/a)"
    assert axis_text("p", "price in $", "$/t") == r"price in \$ $p$ (\$/t)"
    assert plain("two\nlines") == "two lines"
