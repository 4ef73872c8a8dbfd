"""What must not go unsaid of a picture, one sentence each."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

NOT_DRAWN = {
    "below": "lie below the window",
    "above": "lie above it",
    "escaped": "escaped",
    "unsettled": "had not settled",
}
LEAST_TOLD = 0.005
FEWEST_COUNTS = 8.0


def remarks_on(name: str, shares: Mapping[str, float | int]) -> list[str]:
    """Return what must not go unsaid of a picture: samples that are not drawn, and why, one sentence each."""
    lost = {kind: float(shares[kind]) for kind in ("below", "above", "escaped", "unsettled")}
    if sum(lost.values()) >= 1.0 - 1e-12:
        parts = [f"{share:.3%} of the samples {NOT_DRAWN[kind]}" for kind, share in lost.items() if share > 0]
        return [f"{name}: nothing is drawn: {', '.join(parts)}"]
    found = []
    if lost["escaped"] >= LEAST_TOLD:
        found.append(f"{name}: {lost['escaped']:.2%} of the samples escaped and are not drawn")
    if lost["unsettled"] >= LEAST_TOLD:
        found.append(
            f"{name}: {lost['unsettled']:.2%} of the samples had not settled and are not drawn; their "
            "columns are marked at the frame, a higher transient_limit would settle more"
        )
    if shares.get("orbits_on_repelling_start"):
        found.append(
            f"{name}: {shares['orbits_on_repelling_start']} orbits start exactly on a repelling cycle and "
            "stay there; move the start to see the attractor"
        )
    return found


def remark_on_samples(name: str, samples: int, reached: float) -> list[str]:
    """Return a sentence where ``samples: auto`` gave fewer counts a cell than it aims at.

    Parameters
    ----------
    name : str
    samples : int
        Of each orbit.
    reached : float
        Mean counts a cell, see `atlas.orbits.sampling.counts_reached`.
    """
    if reached >= FEWEST_COUNTS:
        return []
    wanted = math.ceil(samples * FEWEST_COUNTS / max(reached, 1e-3))
    return [
        f"{name}: samples: auto took {samples} of each orbit and gave about {reached:.2g} counts a cell, "
        f"because so few fall inside the window; samples: {wanted} would give {FEWEST_COUNTS:.0f}"
    ]


def remarks_on_fates(name: str, shares: Mapping[str, float | int]) -> list[str]:
    """Return what must not go unsaid of a plane or a basin chart, one sentence each."""
    found = []
    if float(shares["escaped"]) >= 1.0 - 1e-12:
        found.append(f"{name}: every orbit escapes; choose other intervals or another start")
    if float(shares["unsettled"]) >= LEAST_TOLD:
        found.append(
            f"{name}: {shares['unsettled']:.2%} of the pixels had not settled; more steps or a higher "
            "transient_limit would settle more"
        )
    if shares.get("orbits_on_repelling_start"):
        found.append(
            f"{name}: {shares['orbits_on_repelling_start']} orbits start exactly on a repelling cycle and "
            "stay there; move the start to see the attractor"
        )
    return found


def remarks_on_portrait(name: str, shares: Mapping[str, float | int]) -> list[str]:
    """Return what must not go unsaid of a phase portrait, one sentence each."""
    beside = float(shares.get("left", 0)) + float(shares.get("right", 0))
    found = remarks_on(name, {**shares, "below": float(shares["below"]) + beside})
    return [sentence.replace("their columns are marked at the frame, ", "") for sentence in found]


def remarks_on_basins(name: str, shares: Mapping[str, float | int], told: Sequence[str]) -> list[str]:
    """Return the shares of the basins and what must not go unsaid of the chart, one sentence each.

    Parameters
    ----------
    name : str
    shares : mapping of str to number
        Of the starts that reach no attractor.
    told : sequence of str
        About each attractor.
    """
    rest = [
        f"{what} {float(shares[what]):.2g}" for what in ("escaped", "extinct", "unsettled") if shares[what]
    ]
    parts = ", ".join([*told, *rest])
    found = [f"{name}: shares of the box: {parts} (standard errors binomial)"] if told else []
    if shares.get("further_attractors"):
        found.append(
            f"{name}: {shares['further_attractors']:.2%} of the starts reach attractors that are not told "
            "apart; choose a smaller box"
        )
    if shares.get("volume_preserving_orbits"):
        found.append(
            f"{name}: {shares['volume_preserving_orbits']} orbits preserve volumes; what they visit is no "
            "attractor, and a basin chart says little of such maps"
        )
    return found + remarks_on_fates(name, shares)
