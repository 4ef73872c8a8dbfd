"""Source of the orbit kernels: lanes of neighbouring orbits, advanced and counted together.

A line that reads ``LOAD``, ``STEP``, ``STORE`` or ``LOAD_ORBIT`` is expanded for the number of state
variables and coefficients of the family. Every decision is made per orbit from the orbit's own step
numbers, so the result does not depend on which orbits share a group. ``tests/reference/orbits.py`` holds
the slow twin.
"""

from __future__ import annotations

import re

from atlas.orbits.step import StepSource

CHUNK = 16
"""Steps between two escape tests, counted from the start of a stage."""

PART = 8
"""Steps between two visits to the histogram; a divisor of CHUNK."""

ADVANCE = '''
@compiled
def advance(x, c, key, order, before, steps, bound, outcome):
    """Advance the orbits of order; outcome becomes GONE where a test finds one outside the bound."""
    lx = np.empty((NX, LANES))
    lc = np.empty((NC, LANES))
    lg = np.empty(LANES, np.bool_)
    lk = np.empty(LANES, np.uint64)
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
            for k in range(NC):
                lc[k, l] = c[k, m]
            lg[l] = False
            lk[l] = key[m]
        n = before
        done = 0
        while done < steps:
            now = min(CHUNK, steps - done)
            for part in range(now // UNROLL):
                for l in range(LANES):
                    LOAD
                    for k in range(UNROLL):
                        STEP n + k + 1
                    STORE
                n += UNROLL
            BEGIN_REST
            for part in range(now % UNROLL):
                for l in range(LANES):
                    LOAD
                    STEP n + 1
                    STORE
                n += 1
            END_REST
            for l in range(LANES):
                LOAD
                lg[l] = lg[l] | OUTSIDE
            done += now
        for l in range(lanes):
            LOAD
            m = order[first + l]
            if lg[l] or OUTSIDE:
                outcome[m] = GONE
            for k in range(NX):
                x[k, m] = lx[k, l]
'''

RETURNS = '''
@compiled
def returns(x, c, order, longest, window, repeat, period, gap, size):
    """Look ahead from each orbit's state: the first exact repeat, and the nearest return up to a period."""
    lx = np.empty((NX, LANES))
    rx = np.empty((NX, LANES))
    lc = np.empty((NC, LANES))
    lr = np.empty(LANES)
    lp = np.empty(LANES)
    lg = np.empty(LANES)
    ls = np.empty(LANES)
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            ls[l] = 0.0
            for k in range(NX):
                lx[k, l] = x[k, m]
                rx[k, l] = x[k, m]
                ls[l] = max(ls[l], abs(x[k, m]))
            for k in range(NC):
                lc[k, l] = c[k, m]
            lr[l] = 0.0
            lp[l] = 0.0
            lg[l] = np.inf
        for n in range(1, window + 1):
            number = float(n)
            beyond = 0.0 if n <= longest else np.inf
            for l in range(LANES):
                LOAD
                STEP 0
                STORE
                d = DISTANCE
                lr[l] = number if (d == 0.0) & (lr[l] == 0.0) else lr[l]
                nearer = d + beyond < lg[l]
                lg[l] = d if nearer else lg[l]
                lp[l] = number if nearer else lp[l]
                largest = LARGEST
                ls[l] = largest if largest - beyond > ls[l] else ls[l]
        for l in range(lanes):
            m = order[first + l]
            repeat[m] = int(lr[l])
            period[m] = int(lp[l])
            gap[m] = lg[l]
            size[m] = ls[l]
'''

SAMPLE = '''
@compiled
def sample(x, c, key, order, before, steps, bound, outcome, hit, base, trash, axis, edges, counts):
    """Advance the orbits of order and count every state; note the first return to where each stood."""
    low, inverse, slack = axis
    top = float(edges.size - 1)
    lx = np.empty((NX, LANES))
    rx = np.empty((NX, LANES))
    lc = np.empty((NC, LANES))
    lg = np.empty(LANES, np.bool_)
    lh = np.empty(LANES)
    lb = np.empty(LANES, np.int32)
    lk = np.empty(LANES, np.uint64)
    seen = np.empty((PART, LANES))
    cell = np.empty((PART, LANES), np.int32)
    flat = cell.reshape(-1)
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
                rx[k, l] = x[k, m]
            for k in range(NC):
                lc[k, l] = c[k, m]
            lg[l] = False
            lh[l] = np.inf
            lb[l] = base[m] + 1 if l < lanes else trash + 1
            lk[l] = key[m]
        n = before
        done = 0
        while done < steps:
            now = min(PART, steps - done)
            for part in range(now // UNROLL):
                at = part * UNROLL
                for l in range(LANES):
                    LOAD
                    h = lh[l]
                    for k in range(UNROLL):
                        STEP n + at + k + 1
                        seen[at + k, l] = UP
                        number = float(done + at + k + 1)
                        number = number if SAME else np.inf
                        h = number if number < h else h
                    STORE
                    lh[l] = h
            BEGIN_REST
            for k in range(now - now % UNROLL, now):
                for l in range(LANES):
                    LOAD
                    STEP n + k + 1
                    STORE
                    seen[k, l] = UP
                    number = float(done + k + 1)
                    number = number if SAME else np.inf
                    lh[l] = number if number < lh[l] else lh[l]
            END_REST
            near = False
            for k in range(now):
                for l in range(LANES):
                    t = (SCALED(seen[k, l]) - low) * inverse
                    q = np.floor(t)
                    f = t - q
                    near = near | (f < slack) | (f > 1.0 - slack)
                    q = q if q > -1.0 else -1.0
                    q = q if q < top else top
                    cell[k, l] = lb[l] + np.int32(q)
            if near:
                for k in range(now):
                    for l in range(LANES):
                        cell[k, l] = lb[l] + np.int32(cell_of(seen[k, l], axis, edges) - 1)
            for j in range(now * LANES):
                counts[np.uint32(flat[j])] += np.uint32(1)
            done += now
            n += now
            if done % CHUNK == 0 or done == steps:
                for l in range(LANES):
                    LOAD
                    lg[l] = lg[l] | OUTSIDE
        for l in range(lanes):
            m = order[first + l]
            if lg[l]:
                outcome[m] = GONE
            hit[m] = int(lh[l]) if lh[l] < np.inf else 0
            for k in range(NX):
                x[k, m] = lx[k, l]
'''

REPLAY = '''
@compiled
def replay(x, c, key, m, before, steps, base, axis, edges, counts):
    """Take back the counts of an orbit's first samples, from the state where its sampling began."""
    LOAD_ORBIT
    lk = key[m : m + 1]
    l = 0
    for n in range(steps):
        STEP before + n + 1
        counts[base[m] + cell_of(UP, axis, edges)] -= np.uint32(1)
'''

ONE_ORBIT = '''
@compiled
def cell_of(y, axis, edges):
    """Return 0 below the window, 1 + the cell inside, 1 + the number of cells above; cells are half-open."""
    low, inverse, slack = axis
    rows = edges.size - 1
    t = (SCALED(y) - low) * inverse
    q = np.floor(t)
    f = t - q
    if f >= slack and f <= 1.0 - slack:
        return int(min(max(q, -1.0), float(rows))) + 1
    if not y >= edges[0]:
        return 0
    if y > edges[rows]:
        return rows + 1
    cell = int(min(max(q, 0.0), rows - 1.0))
    while cell > 0 and y < edges[cell]:
        cell -= 1
    while cell < rows - 1 and y >= edges[cell + 1]:
        cell += 1
    return cell + 1


@compiled
def fill(x, c, m, cycle, steps, base, axis, edges, counts):
    """Count the next samples of an orbit that repeats exactly after a cycle, without running them."""
    LOAD_ORBIT
    whole = steps // cycle
    more = steps % cycle
    for n in range(min(cycle, steps)):
        STEP 0
        counts[base[m] + cell_of(UP, axis, edges)] += np.uint32(whole + (1 if n < more else 0))


@compiled
def growth(x, c, m, cycle):
    """Return the size of the multiplier of the exact cycle that an orbit is on."""
    LOAD_ORBIT
    product = 1.0
    for n in range(cycle):
        product *= SLOPE
        STEP 0
    return abs(product)


@compiled
def on_cycle(x, c, start, m, cycle):
    """Return whether an orbit's initial condition is itself a point of the exact cycle it is on."""
    LOAD_ORBIT
    for n in range(cycle):
        same = True
        for k in range(NX):
            same = same and STATE[k] == start[k, m]
        if same:
            return True
        STEP 0
    return False


@compiled
def distance_left(x, c, m, period, size, relative):
    """Estimate how far an orbit still is from the cycle it approaches; -1 where it approaches none.

    With the gaps d1, d2, d3 between states one period apart and their ratio r it is 4 d1 r / (1 - r); on a
    logarithmic axis it is divided by the state.
    """
    LOAD_ORBIT
    gaps = np.empty(3)
    for turn in range(3):
        before = np.array(STATE)
        for n in range(period):
            STEP 0
        gaps[turn] = 0.0
        for k in range(NX):
            gaps[turn] = max(gaps[turn], abs(STATE[k] - before[k]))
    if gaps[0] <= 1e-15 * size:
        return 0.0
    ratio = max(gaps[1] / gaps[0], gaps[2] / gaps[1] if gaps[1] > 0.0 else 0.0)
    if not ratio < 1.0:
        return -1.0
    left = 4.0 * gaps[0] * ratio / (1.0 - ratio)
    return left / abs(UP) if relative else left
'''

DECIDE = '''
@compiled
def settle(x, c, start, order, seen, rules, axis, edges, base, counts, outcome, on_repelling):
    """Decide after a transient about the orbits of order; seen is what returns() wrote.

    outcome[m] becomes READY for sampling, AGAIN (collapsed), FILLED (and counted) or SLOW (to be run on);
    an orbit that is GONE stays so.
    """
    repeat, period, gap, size = seen
    samples, half_cell, relative = rules
    for m in order:
        if outcome[m] == GONE:
            continue
        outcome[m] = READY
        reach = size[m]
        for k in range(NX):
            reach = max(reach, abs(start[k, m]))
        if repeat[m] > 0:
            repelling = growth(x, c, m, repeat[m]) > 1.0 + 1e-6
            if repelling and not on_cycle(x, c, start, m, repeat[m]):
                outcome[m] = AGAIN
            else:
                on_repelling[0] += 1 if repelling else 0
                fill(x, c, m, repeat[m], samples, base, axis, edges, counts)
                outcome[m] = FILLED
        elif period[m] > 0 and gap[m] < reach / 1024.0:
            if distance_left(x, c, m, period[m], size[m], relative) > half_cell:
                outcome[m] = SLOW


@compiled
def finish(x, c, begin, key, order, hit, rules, axis, edges, base, counts, outcome, filled):
    """Decide after a round of sampling: take back what escaped or collapsed, fill the rest of a repeat."""
    samples, done = rules
    for m in order:
        if outcome[m] == GONE:
            replay(begin, c, key, m, 0, done, base, axis, edges, counts)
        elif hit[m] > 0:
            if growth(x, c, m, hit[m]) > 1.0 + 1e-6:
                replay(begin, c, key, m, 0, done, base, axis, edges, counts)
                outcome[m] = AGAIN
            else:
                fill(x, c, m, hit[m], samples - done, base, axis, edges, counts)
                filled[m] = samples - done
                outcome[m] = FILLED


@compiled
def take_back(begin, c, key, order, before, steps, axis, edges, base, counts, outcome):
    """Take back the disturbed orbits that escaped while they were sampled."""
    for m in order:
        if outcome[m] == GONE:
            replay_disturbed(begin, c, key, m, before, steps, base, axis, edges, counts)
'''

READY, AGAIN, FILLED, SLOW, GONE = range(5)
"""Outcomes of an orbit, as the kernels write them."""

DISTURB = (
    "z = lk[l] + np.uint64({number}) * np.uint64(0x9E3779B97F4A7C15)",
    "z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)",
    "z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)",
    "z = z ^ (z >> np.uint64(31))",
    "factor = 1.0 - float(z >> np.uint64(11)) * 2.0 ** -93",
)
"""Multiplies a state by 1 - u * 2**-40 with u hashed from orbit and step by the finaliser of SplitMix64
(Steele, Lea & Flood 2014, OOPSLA; constants from memory)."""


def kernel_source(source: StepSource, up: int, *, log: bool, lanes: int) -> str:
    """Write the module that counts the orbits of a family.

    Parameters
    ----------
    source : StepSource
        The compiled map.
    up : int
        Number of the state variable that is counted.
    log : bool
        Whether its axis is logarithmic.
    lanes : int
        Orbits in a group.

    Returns
    -------
    str
    """
    disturbed = [
        _expand(text.replace(f"def {name}(", f"def {name}_disturbed("), source, step=step, disturb=True)
        for name, text, step in (
            ("advance", ADVANCE, "step"),
            ("sample", SAMPLE, "step"),
            ("replay", REPLAY, "one_step"),
        )
    ]
    many = [_expand(text, source) for text in (ADVANCE, RETURNS, SAMPLE)]
    single = [_expand(text, source, step="one_step") for text in (ONE_ORBIT, REPLAY)]
    constants = {
        "NX": str(source.states),
        "NC": str(max(source.coefficients, 1)),
        "LANES": str(lanes),
        "CHUNK": str(CHUNK),
        "PART": str(PART),
        "UNROLL": "1" if source.slow_calls else "4",
        "SCALED": "log" if log else "",
        "UP": f"x{up}",
        "READY": str(READY),
        "AGAIN": str(AGAIN),
        "FILLED": str(FILLED),
        "SLOW": str(SLOW),
        "GONE": str(GONE),
    }
    text = "\n".join([source.text, _one_step(source), *single, *many, *disturbed, DECIDE])
    return re.sub(r"\b(" + "|".join(constants) + r")\b", lambda match: constants[match[0]], text)


def _arguments(source: StepSource) -> str:
    return f"({', '.join([*source.state_names, *source.coefficient_names])})"


def _one_step(source: StepSource) -> str:
    """Write step and slope as functions of their own, for code that follows one orbit: compiled only once."""
    call = _arguments(source)
    return "\n".join(
        f"@compiled\ndef one_{name}{call}:\n    return {name}{call}\n" for name in ("step", "slope")
    )


def _expand(text: str, source: StepSource, *, step: str = "step", disturb: bool = False) -> str:
    states, coefficients = source.state_names, source.coefficient_names
    call = _arguments(source)
    if source.slow_calls:
        text = re.sub(r" *BEGIN_REST\n.*?END_REST\n", "", text, flags=re.DOTALL)
    text = re.sub(r" *(BEGIN|END)_REST\n", "", text)
    every = {
        "OUTSIDE": "(not (" + " and ".join(f"abs({name}) < bound" for name in states) + "))",
        "SAME": "(" + " & ".join(f"({name} == rx[{k}, l])" for k, name in enumerate(states)) + ")",
        "DISTANCE": _largest([f"abs({name} - rx[{k}, l])" for k, name in enumerate(states)]),
        "LARGEST": _largest([f"abs({name})" for name in states]),
        "STATE": f"({', '.join(states)},)",
        "SLOPE": f"one_slope{call}",
    }
    blocks = {
        "LOAD": [f"{name} = lx[{k}, l]" for k, name in enumerate(states)]
        + [f"{name} = lc[{k}, l]" for k, name in enumerate(coefficients)],
        "LOAD_ORBIT": [f"{name} = x[{k}, m]" for k, name in enumerate(states)]
        + [f"{name} = c[{k}, m]" for k, name in enumerate(coefficients)],
        "STORE": [f"lx[{k}, l] = {name}" for k, name in enumerate(states)],
        "STEP": [f"{', '.join(states)} = {step}{call}"],
    }
    if disturb:
        blocks["STEP"] += [*DISTURB, *(f"{name} = {name} * factor" for name in states)]
    lines = []
    for line in text.splitlines():
        word, _, number = line.strip().partition(" ")
        indent = line[: len(line) - len(line.lstrip())]
        if word in blocks:
            lines += [indent + one.replace("{number}", number) for one in blocks[word]]
        else:
            lines.append(re.sub(r"\b(" + "|".join(every) + r")\b", lambda match: every[match[0]], line))
    return "\n".join(lines)


def _largest(terms: list[str]) -> str:
    return terms[0] if len(terms) == 1 else f"max({', '.join(terms)})"
