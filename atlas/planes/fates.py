"""Fates of orbits: their codes, their names, and how the fate of an orbit is decided.

An orbit is run from its start at the exact centre of its pixel. Every decision is made from its own step
numbers:

1. *Escapes*, first of all: a test after every 16th step of a stage and at the end of each stage finds a state
   variable not below the escape bound in size; each batch of 4. counts as a stage. Where a threshold of
   extinction is given, the same test finds *extinct* an orbit that was below the threshold after any step
   since the last test, unless it escaped.
2. *Fixed point* or *periodic*: at the end of each stage the orbit is looked at ahead, up to the longest
   period, without being moved. The stages of the transient end after 64, 128, 256 … steps and at its end;
   those of the following ``steps``, in which the exponents are measured, at each quarter. A nearest return
   at period p (p a multiple of the length of the pattern) that is nearer than 2**-10 of its size, the
   largest of the next p states and of the start, is *confirmed* when the distance to its limit, estimated
   as 4 d r / (1 - r) from the widest of the gaps d between states p steps apart on a whole period and their
   ratio r (with several variables d is the widest of p and at least 64 steps, which must not have grown by
   more than 1/16 in the next as many, and r the largest multiplier, below 1), is not above 2**-20 of
   that size, and no multiplier of the cycle exceeds 1 + 1e-6 in size. A variable with a threshold of
   extinction that is nearer to 0 than 2**-20 of the size may still die out, so nothing is confirmed then.
   The period is the least divisor of p after which all states of the next p come back within 2**-17 of the
   size. The exponents of a cycle are those of its multipliers. A state that comes back bit for bit on a
   repelling cycle has collapsed there by rounding: the orbit is run again from its start, every step
   disturbed by a hashed factor 1 - u 2**-40, and not looked at; unless its start lies on that cycle itself.
3. An orbit that comes near its past and whose gaps shrink, but whose limit is still too far, is
   *approaching*. It is run on, as many steps again as it has done, up to the limit of the transient, and is
   then *unsettled*; each time the steps were doubled, the widest of the gaps between states p steps apart,
   over p and at least 64 steps, must have fallen below 4/5 of what it was (at a period doubling it falls to
   0.35, at a Neimark-Sacker bifurcation to 0.71). One whose gaps do not, as those of a quasi-periodic orbit
   which came near its past by chance, is measured anew as after the transient, and its exponents decide.
4. Else the exponents decide. Over N steps in 16 batches, tangent volumes give the exponents (Benettin,
   Galgani, Giorgilli & Strelcyn 1980, Meccanica 15, 9-20), rescaled by powers of two every 16 steps (every 32
   with one state variable); the standard error s is that of the means of the batches. With the tolerance
   3 s + ln(N) / N the orbit is *chaotic* when the largest exponent lies above it, *quasi-periodic* when it
   lies within it, and *unsettled* when it lies below the negative tolerance although no cycle was found, or
   is not finite: then the tests disagree.
"""

from __future__ import annotations

UNSETTLED, FIXED_POINT, PERIODIC, QUASI_PERIODIC, CHAOTIC, ESCAPES, EXTINCT = range(7)
FATES = ("unsettled", "fixed point", "periodic", "quasi-periodic", "chaotic", "escapes", "extinct")

CLASS_UNSETTLED, CLASS_QUASI_PERIODIC, CLASS_CHAOTIC, CLASS_ESCAPES, CLASS_EXTINCT, CLASS_NONE = range(
    60_000, 60_006
)
CLASS_OF_FATE = (
    CLASS_UNSETTLED,
    1,
    0,
    CLASS_QUASI_PERIODIC,
    CLASS_CHAOTIC,
    CLASS_ESCAPES,
    CLASS_EXTINCT,
)
"""The class of every fate in pictures and tiles; that of a cycle is its period."""

CLASS_NAMES = {
    1: "fixed point",
    CLASS_UNSETTLED: "unsettled",
    CLASS_QUASI_PERIODIC: "quasi-periodic",
    CLASS_CHAOTIC: "chaotic",
    CLASS_ESCAPES: "escapes",
    CLASS_EXTINCT: "extinct",
    CLASS_NONE: "none",
}


def class_name(number: int) -> str:
    """Return what a legend calls a class of a fate plane.

    Examples
    --------
    >>> class_name(3)
    'period 3'
    """
    return CLASS_NAMES.get(number, f"period {number}")
