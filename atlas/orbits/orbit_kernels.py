"""Source of the kernels that follow one orbit, and of those that decide what becomes of orbits.

Words in capitals are expanded by `atlas.orbits.kernel_source`. Cycles and periods are counted in recorded
states.
"""

READY, AGAIN, FILLED, SLOW, GONE = range(5)
"""Outcomes of an orbit, as the kernels write them."""

CELL_OF = '''
@compiled
def cell_ofAXIS(y, axis, edges):
    """Return 0 below the window, 1 + the cell inside, 1 + the number of cells above; cells are half-open."""
    low, inverse, slack = axis
    rows = edges.size - 1
    t = (SCALEDAXIS(y) - low) * inverse
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
'''

REPLAY = '''
@compiled
def replay(x, c, word, key, m, before, steps, base, AXES, counts):
    """Take back the counts of an orbit's first records, from the state where its sampling began."""
    LOAD_ORBIT
    lk = key[m : m + 1]
    l = 0
    n = before
    for record in range(steps):
        for skipped in range(EVERY):
            AT n
            STEP n + 1
            n += 1
        counts[base[m] + CELL] -= np.uint32(1)
'''


LOOK = '''
@compiled
def growth(x, c, word, m, before, cycle):
    """Return the size of the largest multiplier of the exact cycle that an orbit is on."""
    LOAD_ORBIT
    BEGIN_SINGLE
    product = 1.0
    for n in range(cycle * EVERY):
        AT before + n
        product *= SLOPE
        STEP 0
    return abs(product)
    END_SINGLE
    BEGIN_SEVERAL
    logs = np.empty(NX)
    volumes(x, c, word, m, before, cycle, logs)
    return exp(logs[0] * cycle * EVERY)
    END_SEVERAL


@compiled
def distance_left(x, c, word, m, before, period, size, half, relative, work):
    """Estimate how far an orbit still is from the cycle it approaches, in half cells; -1 where from none.

    With the gaps d1, d2, d3 between states one period apart and their ratio r it is 4 d1 r / (1 - r); on a
    logarithmic axis it is divided by the state. With several state variables the gaps of a turning orbit rise
    and fall, so r is taken between the largest of the first four and of the next four.
    """
    LOAD_ORBIT
    gaps = work[AXIS_COUNT]
    n = before
    for turn in range(TURNS):
        AT n
        REMEMBER
        for step_number in range(period * EVERY):
            AT n
            STEP 0
            n += 1
        gaps[turn] = GAP
        COMPARE
    if gaps[0] <= 1e-15 * size:
        return 0.0
    BEGIN_SINGLE
    ratio = max(gaps[1] / gaps[0], gaps[2] / gaps[1] if gaps[1] > 0.0 else 0.0)
    END_SINGLE
    BEGIN_SEVERAL
    late, early = max(gaps[4:]), max(gaps[:4])
    ratio = np.sqrt(np.sqrt(late / early))
    END_SEVERAL
    if not ratio < 1.0:
        return -1.0
    most = 0.0
    now = SHOWN
    for a in range(AXIS_COUNT):
        BEGIN_SINGLE
        left = 4.0 * work[a, 0] * ratio / (1.0 - ratio)
        END_SINGLE
        BEGIN_SEVERAL
        left = 4.0 * max(work[a]) * ratio / (1.0 - ratio)
        END_SEVERAL
        left = left / abs(now[a]) if relative[a] else left
        most = max(most, left / half[a])
    return most
'''

FILL = '''
@compiled
def fill(x, c, word, m, before, cycle, steps, base, AXES, counts):
    """Count the next records of an orbit that repeats exactly after a cycle, without running them."""
    LOAD_ORBIT
    whole = steps // cycle
    more = steps % cycle
    n = before
    for record in range(min(cycle, steps)):
        for skipped in range(EVERY):
            AT n
            STEP 0
            n += 1
        counts[base[m] + CELL] += np.uint32(whole + (1 if record < more else 0))


@compiled
def on_cycle(x, c, word, start, m, before, cycle):
    """Return whether an orbit's initial condition is itself a point of the exact cycle it is on."""
    LOAD_ORBIT
    for n in range(cycle * EVERY):
        same = True
        for k in range(NX):
            same = same and STATE[k] == start[k, m]
        if same:
            return True
        AT before + n
        STEP 0
    return False
'''

VOLUMES = '''
@compiled
def volumes(x, c, word, m, before, cycle, logs):
    """Write the Lyapunov exponents of the exact cycle that an orbit is on, largest first.

    The product of the k-th compound matrices along the cycle has the product of the k largest multipliers as
    its spectral radius.
    """
    LOAD_ORBIT
    products = np.zeros((NX, NV, NV))
    powers = np.zeros(NX)
    steps = cycle * EVERY
    for g in range(NX):
        for k in range(NV):
            products[g, k, k] = 1.0
    spare = np.empty((NV, NV))
    for n in range(steps):
        AT before + n
        entries = np.array(MINORS)
        at = 0
        for g in range(NX):
            side = SIDES[g]
            multiply(entries[at : at + side * side].reshape(side, side), products[g], spare, side)
            powers[g] += rescale(products[g], side)
            at += side * side
        STEP 0
    sums = np.empty(NX)
    for g in range(NX):
        sums[g] = log_radius(products[g], spare, SIDES[g]) + powers[g] * 0.6931471805599453
    for g in range(NX):
        lower = sums[g - 1] if g > 0 else 0.0
        logs[g] = (sums[g] - lower) / steps if sums[g] > -np.inf else -np.inf


@compiled
def multiply(left, right, spare, side):
    """Replace the right matrix by the product of both."""
    for i in range(side):
        for j in range(side):
            entry = 0.0
            for k in range(side):
                entry += left[i, k] * right[k, j]
            spare[i, j] = entry
    for i in range(side):
        for j in range(side):
            right[i, j] = spare[i, j]


@compiled
def rescale(matrix, side):
    """Divide a matrix by the power of two near its largest entry; return the exponent."""
    most = 0.0
    for i in range(side):
        for j in range(side):
            most = max(most, abs(matrix[i, j]))
    if not (most > 0.0 and most < np.inf):
        return 0.0
    exponent = min(max(exponent_of(most), -1000.0), 1000.0)
    factor = two_to(-exponent)
    for i in range(side):
        for j in range(side):
            matrix[i, j] *= factor
    return exponent


@compiled
def log_radius(matrix, spare, side):
    """Return the logarithm of a matrix's spectral radius, by squaring it again and again (Gelfand)."""
    if side == 1:
        return log(abs(matrix[0, 0]))
    if side == 2:
        half = 0.5 * (matrix[0, 0] + matrix[1, 1])
        other = 0.5 * (matrix[0, 0] - matrix[1, 1])
        under = other * other + matrix[0, 1] * matrix[1, 0]
        if under >= 0.0:
            return log(abs(half) + np.sqrt(under))
        return 0.5 * log(half * half - under)
    total = 0.0
    weight = 1.0
    for turn in range(64):
        total += weight * rescale(matrix, side)
        if np.all(matrix[:side, :side] == 0.0):
            return -np.inf
        multiply(matrix.copy(), matrix, spare, side)
        weight *= 0.5
    return total * 0.6931471805599453
'''


DECIDE = '''
@compiled
def settle(x, c, word, start, order, before, seen, rules, AXES, base, counts, outcome, on_repelling):
    """Decide after a transient about the orbits of order; seen is what returns() wrote.

    outcome[m] becomes READY for sampling, AGAIN (collapsed), FILLED (and counted) or SLOW (to be run on);
    an orbit that is GONE stays so.
    """
    repeat, period, gap, size = seen
    samples, half, relative = rules
    work = np.empty((AXIS_COUNT + 1, TURNS))
    for m in order:
        if outcome[m] == GONE:
            continue
        outcome[m] = READY
        reach = size[m]
        for k in range(NX):
            reach = max(reach, abs(start[k, m]))
        if repeat[m] > 0:
            repelling = growth(x, c, word, m, before, repeat[m]) > 1.0 + 1e-6
            if repelling and not on_cycle(x, c, word, start, m, before, repeat[m]):
                outcome[m] = AGAIN
            else:
                on_repelling[m] = repelling
                fill(x, c, word, m, before, repeat[m], samples, base, AXES, counts)
                outcome[m] = FILLED
        elif period[m] > 0 and gap[m] < reach / 1024.0:
            if distance_left(x, c, word, m, before, period[m], size[m], half, relative, work) > 1.0:
                outcome[m] = SLOW


@compiled
def finish(x, c, word, begin, key, order, hit, rules, AXES, base, counts, outcome, filled):
    """Decide after a round of sampling: take back what escaped or collapsed, fill the rest of a repeat."""
    before, samples, done = rules
    for m in order:
        if outcome[m] == GONE:
            replay(begin, c, word, key, m, before, done, base, AXES, counts)
        elif hit[m] > 0:
            now = before + done * EVERY
            if growth(x, c, word, m, now, hit[m]) > 1.0 + 1e-6:
                replay(begin, c, word, key, m, before, done, base, AXES, counts)
                outcome[m] = AGAIN
            else:
                fill(x, c, word, m, now, hit[m], samples - done, base, AXES, counts)
                filled[m] = samples - done
                outcome[m] = FILLED


@compiled
def take_back(begin, c, word, key, order, before, steps, AXES, base, counts, outcome):
    """Take back the disturbed orbits that escaped while they were sampled."""
    for m in order:
        if outcome[m] == GONE:
            replay_disturbed(begin, c, word, key, m, before, steps, base, AXES, counts)
'''
