"""Source of the kernels that follow one orbit, and of those that decide what becomes of orbits.

Words in capitals are expanded by `atlas.orbits.kernel_source`.
"""

READY, AGAIN, FILLED, SLOW, GONE = range(5)
"""Outcomes of an orbit, as the kernels write them."""

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
