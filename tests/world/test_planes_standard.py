"""The standard map: what its portraits show of area, rotational curves and the elliptic fixed point.

Exponents of the chaotic sea stand in ``test_spectrum.py``.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

import atlas
from tests.reference.published import published

TURN = "2*pi"
OWN = atlas.family("standard")


def portrait(kick: str, size: tuple[int, int], samples: int, **more: Any) -> Any:
    view = atlas.View(("theta", 0, TURN), ("p", 0, TURN))
    return atlas.phase_portrait(OWN, view, size=size, set={"K": kick}, samples=samples, **more)


def momenta(kick: str, samples: int) -> np.ndarray:
    """Return how often each of 100 equal ranges of the momentum is met from the hyperbolic fixed point."""
    beside = [{"theta": "0.001", "p": "0.001"}]
    made = portrait(kick, (4, 100), samples, starts=beside)
    return np.asarray(made.counts.sum("theta"))


def test_chaos_crosses_all_momenta_above_the_critical_kick_and_not_below() -> None:
    """std.Kc: J. M. Greene 1979, J. Math. Phys. 20, 1183.

    The last rotational curves, of the golden rotation numbers 0.382 and 0.618, separate the chaos about p = 0
    from that about p = pi. At K = 1.05 it takes some 10**5 steps to pass their remains (the time grows like
    the inverse third power of K - Kc: R. S. MacKay, J. D. Meiss and I. C. Percival 1984, citation from
    memory), so that 2 * 10**7 steps pass often.
    """
    critical = float(published("std.Kc").number())
    assert 0.9 < critical < 1.05
    confined = momenta("0.9", 4_000_000)
    assert confined[[0, 10, 89, 99]].min() > 1000
    assert confined[45:55].sum() == 0
    assert momenta("1.05", 20_000_000).min() > 1000


def test_a_rotational_curve_is_one_line_across_all_angles() -> None:
    """Near the golden rotation number, at K = 0.5, one orbit has one momentum at each angle."""
    golden = (3 - math.sqrt(5)) / 2 * 2 * math.pi
    made = portrait("0.5", (200, 1000), 400_000, starts=[{"theta": "pi", "p": f"{golden:.6f}"}])
    rows = (made.counts.values > 0).sum(axis=0)
    assert rows.min() >= 1
    assert rows.max() <= 4


def test_chaos_at_a_strong_kick_is_uniform_in_area() -> None:
    """The invariant density of a map that preserves area is that of the area."""
    made = portrait("20", (20, 20), 4_000_000)
    share = made.counts.values / int(made.exposure)
    deviation = (share - 1 / 400) * math.sqrt(int(made.exposure) * 400)
    assert int(made.counts.sum()) == int(made.exposure)
    assert abs(deviation).max() < 6
    assert 0.7 < (deviation**2).mean() < 1.5


def test_the_fixed_point_at_pi_is_elliptic_until_a_kick_of_4() -> None:
    """std.fp: trace 2 - K. Orbits beside it stay there below K = 4 and leave above."""
    assert published("std.fp").value == "K=4"
    beside = [{"theta": "3.1417", "p": "0.0001"}]
    across, rows = ("K", "3.75", "4.25"), 6284
    made = atlas.orbit_counts(
        OWN,
        atlas.View(across, ("theta", 0, TURN)),
        size=(20, rows),
        starts=beside,
        samples=20_000,
        values_per_column=1,
    )
    occupied = (made.counts.values > 0).sum(axis=0)
    assert occupied[:10].max() <= 5
    assert occupied[10:].min() > 100
    middle = made.theta.values[made.counts.values[:, :10].any(axis=1)]
    assert abs(middle - math.pi).max() < 3e-3
