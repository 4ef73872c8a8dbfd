"""Elementary functions in float64: branch-free, vectorisable, the same bits on every machine.

Range reduction and reconstruction follow published practice (Cody & Waite 1980, *Software Manual for the
Elementary Functions*; Muller 2016, *Elementary Functions*, 3rd ed.; both cited from memory). The polynomials
are interpolants at Chebyshev nodes; ``tests/reference/polynomials.py`` recomputes them at 60 digits. Errors
stay within 1.5 units in the last place for exp, log, sin and cos, within 3 for tan, tanh and atan2 (tests);
those of angles for arguments up to 1e6 in size.
"""

from __future__ import annotations

import struct
from fractions import Fraction
from typing import Any

import numpy as np
from numba import config, njit, types
from numba.extending import intrinsic

EXP = (
    0.5,
    0.1666666666666667,
    0.04166666666666667,
    0.008333333333326136,
    0.0013888888888883748,
    0.00019841269874820627,
    2.4801587325547743e-05,
    2.7557255400206422e-06,
    2.75572736431103e-07,
    2.5105217004720745e-08,
    2.0914686968086876e-09,
)
LOG = (
    0.666666666666667,
    0.39999999999899505,
    0.28571428625975487,
    0.2222221113479508,
    0.18182889125261723,
    0.15331721600556042,
    0.14616449685043406,
)
SIN = (
    -0.16666666666666666,
    0.008333333333330946,
    -0.0001984126983675497,
    2.755731610068303e-06,
    -2.5051131455427946e-08,
    1.591810123027412e-10,
)
COS = (
    0.041666666666666664,
    -0.0013888888888887395,
    2.4801587298763433e-05,
    -2.7557317270560326e-07,
    2.0876146024689747e-09,
    -1.1382614868556325e-11,
)
ATAN = (
    -0.3333333333333333,
    0.1999999999999552,
    -0.14285714284666542,
    0.11111111015256361,
    -0.09090904578123903,
    0.07692183190826087,
    -0.06664511447381948,
    0.0585814891280221,
    -0.0508544973794026,
    0.03923165829558719,
    -0.01917688711906226,
)
TANH = (
    -0.3333333333333333,
    0.13333333333329433,
    -0.05396825395915208,
    0.02186948772571052,
    -0.00886320002499424,
    0.0035912807603255066,
    -0.0014445662421400337,
    0.0005108443491350508,
)

ROUNDER = 6755399441055744.0
LOG2_E = 1.4426950408889634
LN2_HIGH, LN2_LOW = 0.6931471803691238, 1.9082149292705877e-10
TWO_OVER_PI = 0.6366197723675814
HALF_PI, HALF_PI_LOW, HALF_PI_REST = 1.5707963267948966, 6.123233995736766e-17, -1.4973849048591698e-33
TAN_EIGHTH = 0.41421356237309503
ONE_BITS = 4607182418800017408
ROOT_HALF_BITS = 4604544271217802189
SMALLEST_NORMAL = 2.2250738585072014e-308


if config.DISABLE_JIT:

    def bits_of(x: float) -> int:
        """Return the 64 bits of a float64 as a signed integer."""
        return int(struct.unpack("<q", struct.pack("<d", x))[0])

    def float_from(bits: int) -> float:
        """Return the float64 that has these 64 bits."""
        wrapped = (int(bits) + (1 << 63)) % (1 << 64) - (1 << 63)
        return float(struct.unpack("<d", struct.pack("<q", wrapped))[0])

    def fma(a: float, b: float, c: float) -> float:
        """Return ``a * b + c``, rounded once."""
        if not (np.isfinite(a) and np.isfinite(b) and np.isfinite(c)):
            return a * b + c
        total = Fraction(float(a)) * Fraction(float(b)) + Fraction(float(c))
        if total == 0:
            return a * b + c
        try:
            return float(total)
        except OverflowError:
            return np.inf if total > 0 else -np.inf

else:

    @intrinsic
    def bits_of(typing: Any, x: Any) -> Any:
        """Return the 64 bits of a float64 as a signed integer."""

        def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            return builder.bitcast(arguments[0], context.get_value_type(types.int64))

        return types.int64(types.float64), emit

    @intrinsic
    def float_from(typing: Any, bits: Any) -> Any:
        """Return the float64 that has these 64 bits."""

        def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            return builder.bitcast(arguments[0], context.get_value_type(types.float64))

        return types.float64(types.int64), emit

    @intrinsic
    def fma(typing: Any, a: Any, b: Any, c: Any) -> Any:
        """Return ``a * b + c``, rounded once."""

        def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            return builder.fma(*arguments)

        return types.float64(types.float64, types.float64, types.float64), emit


inlined = njit(inline="always", error_model="numpy")


@inlined
def exp(x):  # type: ignore[no-untyped-def]
    """Return e to the x; results below the smallest normal number become 0."""
    shifted = fma(x, LOG2_E, ROUNDER)
    k = shifted - ROUNDER
    r = fma(k, -LN2_LOW, fma(k, -LN2_HIGH, x))
    s = r * r
    a = fma(EXP[1], r, EXP[0])
    b = fma(EXP[3], r, EXP[2])
    c = fma(EXP[5], r, EXP[4])
    d = fma(EXP[7], r, EXP[6])
    e = fma(EXP[9], r, EXP[8])
    low = fma(b, s, a)
    middle = fma(d, s, c)
    high = fma(EXP[10], s, e)
    w = s * s
    tail = fma(fma(high, w, middle), w, low)
    value = (1.0 + fma(tail, s, r)) * float_from((bits_of(shifted) << 52) + ONE_BITS)
    value = 0.0 if x < -708.39 else value
    return np.inf if x > 709.78 else value


@inlined
def log(x):  # type: ignore[no-untyped-def]
    """Return the natural logarithm; -inf at 0, nan below."""
    scaled = x * 18014398509481984.0 if x < SMALLEST_NORMAL else x
    shift = 54.0 if x < SMALLEST_NORMAL else 0.0
    bits = bits_of(scaled)
    exponent = (bits - ROOT_HALF_BITS) >> 52
    f = float_from(bits - (exponent << 52)) - 1.0
    k = float(exponent) - shift
    s = f / (2.0 + f)
    z = s * s
    w = z * z
    odd = fma(fma(fma(LOG[6], w, LOG[4]), w, LOG[2]), w, LOG[0])
    even = fma(fma(LOG[5], w, LOG[3]), w, LOG[1])
    series = z * fma(even, z, odd)
    half = 0.5 * f * f
    value = fma(k, LN2_HIGH, f - (half - (s * (half + series) + k * LN2_LOW)))
    value = value if x > 0.0 else (-np.inf if x == 0.0 else np.nan)
    return value if x < np.inf else x


@inlined
def _sine(r):  # type: ignore[no-untyped-def]
    z = r * r
    p = fma(fma(fma(fma(fma(SIN[5], z, SIN[4]), z, SIN[3]), z, SIN[2]), z, SIN[1]), z, SIN[0])
    return fma(z * r, p, r)


@inlined
def _cosine(r):  # type: ignore[no-untyped-def]
    z = r * r
    p = fma(fma(fma(fma(fma(COS[5], z, COS[4]), z, COS[3]), z, COS[2]), z, COS[1]), z, COS[0])
    half = 0.5 * z
    top = 1.0 - half
    return top + fma(z * z, p, (1.0 - top) - half)


@inlined
def sin(x):  # type: ignore[no-untyped-def]
    """Return the sine of an angle in radians."""
    shifted = fma(x, TWO_OVER_PI, ROUNDER)
    k = shifted - ROUNDER
    r = fma(k, -HALF_PI_REST, fma(k, -HALF_PI_LOW, fma(k, -HALF_PI, x)))
    quadrant = bits_of(shifted)
    value = _cosine(r) if quadrant & 1 else _sine(r)
    return -value if quadrant & 2 else value


@inlined
def cos(x):  # type: ignore[no-untyped-def]
    """Return the cosine of an angle in radians."""
    shifted = fma(x, TWO_OVER_PI, ROUNDER)
    k = shifted - ROUNDER
    r = fma(k, -HALF_PI_REST, fma(k, -HALF_PI_LOW, fma(k, -HALF_PI, x)))
    quadrant = bits_of(shifted)
    value = _sine(r) if quadrant & 1 else _cosine(r)
    return -value if (quadrant + 1) & 2 else value


@inlined
def tan(x):  # type: ignore[no-untyped-def]
    """Return the tangent of an angle in radians."""
    shifted = fma(x, TWO_OVER_PI, ROUNDER)
    k = shifted - ROUNDER
    r = fma(k, -HALF_PI_REST, fma(k, -HALF_PI_LOW, fma(k, -HALF_PI, x)))
    odd = bits_of(shifted) & 1
    s = _sine(r)
    c = _cosine(r)
    top = -c if odd else s
    bottom = s if odd else c
    return top / bottom


@inlined
def tanh(x):  # type: ignore[no-untyped-def]
    """Return the hyperbolic tangent."""
    size = abs(x)
    z = x * x
    p = fma(fma(fma(fma(TANH[7], z, TANH[6]), z, TANH[5]), z, TANH[4]), z, TANH[3])
    p = fma(fma(fma(p, z, TANH[2]), z, TANH[1]), z, TANH[0])
    near = fma(z * x, p, x)
    far = 1.0 - 2.0 / (exp(2.0 * size) + 1.0)
    far = -far if x < 0.0 else far
    return near if size < 0.3 else far


@inlined
def atan2(y, x):  # type: ignore[no-untyped-def]
    """Return the angle of the point (x, y), in radians from -pi to pi; 0 at the origin."""
    across = abs(x)
    up = abs(y)
    small = across if across < up else up
    large = up if across < up else across
    t = small / large if large > 0.0 else small * large
    shifted = (t - 1.0) / (t + 1.0)
    u = shifted if t > TAN_EIGHTH else t
    z = u * u
    p = fma(fma(fma(fma(ATAN[10], z, ATAN[9]), z, ATAN[8]), z, ATAN[7]), z, ATAN[6])
    p = fma(fma(fma(fma(p, z, ATAN[5]), z, ATAN[4]), z, ATAN[3]), z, ATAN[2])
    p = fma(fma(p, z, ATAN[1]), z, ATAN[0])
    angle = fma(z * u, p, u)
    angle = 0.5 * HALF_PI + (angle + 0.5 * HALF_PI_LOW) if t > TAN_EIGHTH else angle
    angle = HALF_PI - (angle - HALF_PI_LOW) if across < up else angle
    angle = 2.0 * HALF_PI - (angle - 2.0 * HALF_PI_LOW) if x < 0.0 else angle
    return -angle if y < 0.0 else angle


@inlined
def power(x, y):  # type: ignore[no-untyped-def]
    """Return x to the power y as exp(y log x); below 0, nan unless y is whole. Errors grow like |y log x|."""
    value = exp(y * log(abs(x)))
    half = 0.5 * y
    below = -value if np.floor(half) != half else value
    below = below if np.floor(y) == y else np.nan
    value = below if x < 0.0 else value
    return value if y != 0.0 else 1.0
