"""How colours are seen: simulated colour blindness, CIELAB, and the difference between two colours."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

# Machado, Oliveira & Fernandes (2009), IEEE Trans. Vis. Comput. Graphics 15, 1291-1298: full severity, for
# linear sRGB. Matrices cited from memory; a test checks that they leave greys unchanged.
MACHADO = {
    "protanopia": (
        (0.152286, 1.052583, -0.204868),
        (0.114503, 0.786281, 0.099216),
        (-0.003882, -0.048116, 1.051998),
    ),
    "deuteranopia": (
        (0.367322, 0.860646, -0.227968),
        (0.280085, 0.672501, 0.047413),
        (-0.011820, 0.042940, 0.968881),
    ),
    "tritanopia": (
        (1.255528, -0.076749, -0.178779),
        (-0.078411, 0.930809, 0.147602),
        (0.004733, 0.691367, 0.303900),
    ),
}
EYES = ("all cones", *MACHADO)
_TO_XYZ = np.array(  # IEC 61966-2-1, white D65
    [[0.4124564, 0.3575761, 0.1804375], [0.2126729, 0.7151522, 0.0721750], [0.0193339, 0.1191920, 0.9503041]]
)

Floats = NDArray[np.float64]


def linear(colours: ArrayLike) -> Floats:
    """Return sRGB colours of 0 to 255 in linear light, 0 to 1."""
    levels = np.asarray(colours, float) / 255
    return np.where(levels <= 0.04045, levels / 12.92, ((levels + 0.055) / 1.055) ** 2.4)


def seen_by(colours: ArrayLike, eyes: str) -> Floats:
    """Return colours of 0 to 255 in linear light as simulated for one of ``EYES``, shape (…, 3)."""
    light = linear(colours)
    return light if eyes == "all cones" else np.clip(light @ np.array(MACHADO[eyes]).T, 0, 1)


def lab(light: Floats) -> Floats:
    """Return CIELAB of linear sRGB light, shape (…, 3)."""
    ratio = light @ (_TO_XYZ / _TO_XYZ.sum(axis=1, keepdims=True)).T
    f = np.where(ratio > 216 / 24389, np.cbrt(ratio), (ratio * 24389 / 27 + 16) / 116)
    x, y, z = np.moveaxis(f, -1, 0)
    return np.stack([116 * y - 16, 500 * (x - y), 200 * (y - z)], axis=-1)


def difference(one: Floats, other: Floats) -> Floats:
    """Return the CIEDE2000 difference of colours in CIELAB.

    References
    ----------
    Sharma, Wu & Dalal (2005), Color Res. Appl. 30, 21-30: formula and pairs to test it with.
    """
    l1, a1, b1 = np.moveaxis(one, -1, 0)
    l2, a2, b2 = np.moveaxis(other, -1, 0)
    mean7 = (0.5 * (np.hypot(a1, b1) + np.hypot(a2, b2))) ** 7
    stretch = 1 + 0.5 * (1 - np.sqrt(mean7 / (mean7 + 25.0**7)))
    c1, c2 = np.hypot(stretch * a1, b1), np.hypot(stretch * a2, b2)
    h1 = np.degrees(np.arctan2(b1, stretch * a1)) % 360
    h2 = np.degrees(np.arctan2(b2, stretch * a2)) % 360
    grey = c1 * c2 == 0
    turn = np.where(grey, 0.0, (h2 - h1 + 180) % 360 - 180)
    turn = np.where((turn == -180) & (h2 > h1), 180.0, turn)
    far = np.abs(h1 - h2) > 180
    middle = np.where(far, 0.5 * (h1 + h2 + np.where(h1 + h2 < 360, 360, -360)), 0.5 * (h1 + h2))
    hue = np.where(grey, h1 + h2, middle)
    light, chroma = 0.5 * (l1 + l2), 0.5 * (c1 + c2)
    t = (
        1
        - 0.17 * np.cos(np.radians(hue - 30))
        + 0.24 * np.cos(np.radians(2 * hue))
        + 0.32 * np.cos(np.radians(3 * hue + 6))
        - 0.20 * np.cos(np.radians(4 * hue - 63))
    )
    s_l = 1 + 0.015 * (light - 50) ** 2 / np.sqrt(20 + (light - 50) ** 2)
    s_c, s_h = 1 + 0.045 * chroma, 1 + 0.015 * chroma * t
    blue = np.sin(np.radians(60 * np.exp(-(((hue - 275) / 25) ** 2))))
    r_t = -2 * np.sqrt(chroma**7 / (chroma**7 + 25.0**7)) * blue
    d_l, d_c = (l2 - l1) / s_l, (c2 - c1) / s_c
    d_h = 2 * np.sqrt(c1 * c2) * np.sin(np.radians(turn / 2)) / s_h
    return np.asarray(np.sqrt(d_l**2 + d_c**2 + d_h**2 + r_t * d_c * d_h))


def least_difference(colours: ArrayLike) -> float:
    """Return the least difference between any two of some colours, to whichever of ``EYES`` it is least."""
    first, second = np.triu_indices(len(np.asarray(colours)), 1)
    return min(
        float(difference(found[first], found[second]).min())
        for found in (lab(seen_by(colours, eyes)) for eyes in EYES)
    )
