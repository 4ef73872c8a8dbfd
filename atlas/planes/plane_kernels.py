"""Source of the kernels that find the fates of many orbits together.

Words in capitals are expanded by `atlas.planes.plane_source`; `atlas.planes.fates` says how fates are
decided.
"""

OPEN, GONE, DEAD, MET, NEAR, AGAIN = range(6)
"""What is known of an orbit: nothing yet, escaped, extinct, on a cycle, approaching one, collapsed."""

START = """
    lx = np.empty((NX, LANES))
    ls = np.empty((NX, LANES))
    lz = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lg = np.empty(LANES, np.int64)
    lt = np.empty(LANES, np.int64)
    lf = np.zeros(LANES, np.bool_)
    lk = np.empty(LANES, np.uint64)
"""

PART_GONE = '''
@compiled
def part_gone(lx, ls, lz, lf, bound, began, lg, lt):
    """Note which lanes a test finds gone for the first time, and where the test before left them.

    Their states are put to 0, so that they need not be found again and again.
    """
    for l in range(LANES):
        LOAD_STATE
        out = OUTSIDE
        if lg[l] == OPEN and FOUND:
            lg[l] = GONE if out else DEAD
            lt[l] = began
            for k in range(NX):
                lz[k, l] = ls[k, l]
        if lg[l] != OPEN:
            for k in range(NX):
                lx[k, l] = 0.0
'''

FLEE = f'''
@compiled
def flee(x, c, word, key, order, before, steps, bound, low, outcome, since):
    """Advance the orbits of order; one that a test finds gone is left where the test before stood."""
{START}
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
            for k in range(ROWS):
                lc[k, l] = c[k, m]
            lg[l] = OPEN
            lk[l] = key[m]
        n = before
        done = 0
        while done < steps:
            now = min(CHUNK, steps - done)
            began = n
            for k in range(NX):
                for l in range(LANES):
                    ls[k, l] = lx[k, l]
            MORTAL for l in range(LANES):
                MORTAL lf[l] = False
            for part in range(now // UNROLL):
                PHASE n
                for l in range(LANES):
                    LOAD
                    REPEAT
                    STEP n + KTH + 1
                    DYING
                    END_REPEAT
                    STORE
                n += UNROLL
            BEGIN_REST
            for part in range(now % UNROLL):
                PHASE n
                for l in range(LANES):
                    LOAD
                    STEP n + 1
                    DYING
                    STORE
                n += 1
            END_REST
            some = False
            for l in range(LANES):
                LOAD
                some = some | FOUND
            if some:
                part_gone(lx, ls, lz, lf, bound, began, lg, lt)
            done += now
        for l in range(lanes):
            m = order[first + l]
            outcome[m] = lg[l]
            if lg[l] != OPEN:
                since[m] = lt[l]
                for k in range(NX):
                    x[k, m] = lz[k, l]
            else:
                for k in range(NX):
                    x[k, m] = lx[k, l]
'''

MEASURE = f'''
@compiled
def measure(x, v, c, word, key, order, before, steps, bound, low, outcome, since, logs):
    """Advance the orbits of order as flee() does, with tangent volumes; logs gets the growth of each."""
{START}
    lv = np.empty((NV_ALL, LANES))
    le = np.empty((NX, LANES))
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
                le[k, l] = 0.0
            for k in range(NV_ALL):
                lv[k, l] = v[k, m]
            for k in range(ROWS):
                lc[k, l] = c[k, m]
            lg[l] = OPEN
            lk[l] = key[m]
        n = before
        done = 0
        while done < steps:
            now = min(CHUNK, steps - done)
            began = n
            for k in range(NX):
                for l in range(LANES):
                    ls[k, l] = lx[k, l]
            MORTAL for l in range(LANES):
                MORTAL lf[l] = False
            for part in range(now // UNROLL):
                PHASE n
                for l in range(LANES):
                    LOAD
                    LOAD_VECTORS
                    REPEAT
                    CARRY n + KTH + 1
                    DYING
                    END_REPEAT
                    STORE_VECTORS
                    STORE
                n += UNROLL
            BEGIN_REST
            for part in range(now % UNROLL):
                PHASE n
                for l in range(LANES):
                    LOAD
                    LOAD_VECTORS
                    CARRY n + 1
                    DYING
                    STORE_VECTORS
                    STORE
                n += 1
            END_REST
            some = False
            for l in range(LANES):
                LOAD
                some = some | FOUND
            if some:
                part_gone(lx, ls, lz, lf, bound, began, lg, lt)
            done += now
            if done % RESCALED == 0 or done == steps:
                for l in range(LANES):
                    LOAD_VECTORS
                    RESCALE
                    STORE_VECTORS
        for l in range(lanes):
            m = order[first + l]
            outcome[m] = lg[l]
            if lg[l] != OPEN:
                since[m] = lt[l]
            for k in range(NX):
                x[k, m] = lx[k, l] if lg[l] == OPEN else lz[k, l]
            at = 0
            for g in range(NX):
                side = SIDES[g]
                most = 0.0
                for k in range(at, at + side):
                    most = max(most, abs(lv[k, l]))
                logs[g, m] = le[g, l] * 0.6931471805599453 + log(most)
                for k in range(at, at + side):
                    v[k, m] = lv[k, l] / most if most > 0.0 and most < np.inf else 1.0
                at += side
'''

JUDGE = '''
@compiled
def judge(x, c, word, start, order, before, seen, rules, known, exponents):
    """Decide whether the orbits of order have met a cycle; seen is what returns() wrote.

    outcome[m] becomes MET (then period[m] is the least period, turn[m] the one that was confirmed, and
    exponents[:, m] are known), NEAR (approaching, with away[m] its widest gap), AGAIN (collapsed) or stays
    OPEN.
    """
    outcome, period, turn, repelling, away = known
    repeat, nearest, gap, size = seen
    half, relative, low = rules
    logs = np.empty(NX)
    work = np.empty((AXIS_COUNT + 1, TURNS))
    for m in order:
        if outcome[m] != OPEN:
            continue
        own = 0.0
        for k in range(NX):
            own = max(own, abs(start[k, m]))
        p = repeat[m] if repeat[m] > 0 else nearest[m]
        if p == 0 or (repeat[m] == 0 and not gap[m] < max(size[m], own) * 2.0 ** -10):
            continue
        largest = cycle_size(x, c, word, m, before, p)
        reach = max(largest, own)
        if repeat[m] == 0:
            if not gap[m] < reach * 2.0 ** -10:
                continue
            BEGIN_SINGLE
            left = distance_left(x, c, word, m, before, p, largest, half, relative, work)
            if left < 0.0:
                continue
            if gap[m] > 0.0 and left > 0.0:
                left *= widest_gap(x, c, word, m, before, p, p) / gap[m]
            END_SINGLE
            BEGIN_SEVERAL
            early, late = widest_gaps(x, c, word, m, before, p)
            left = 0.0
            if not early <= 1e-15 * largest:
                if not late <= 1.0625 * early:
                    continue
                multipliers(x, c, word, m, before, p, logs)
                rate = exp(logs[0] * p)
                if not rate < 1.0:
                    continue
                left = 4.0 * early * rate / (1.0 - rate)
                if not late < early and left > reach * 2.0 ** -20:
                    continue
            END_SEVERAL
            dying = False
            for k in range(NX):
                dying = dying or (low[k] > 0.0 and abs(x[k, m]) < reach * 2.0 ** -20)
            if left > reach * 2.0 ** -20 or dying:
                outcome[m] = NEAR
                away[m] = widest_gap(x, c, word, m, before, p, WINDOW)
                continue
        multipliers(x, c, word, m, before, p, logs)
        if logs[0] * p > 1e-6:
            if repeat[m] == 0:
                continue
            if not on_cycle(x, c, word, start, m, before, p):
                outcome[m] = AGAIN
                continue
            repelling[m] = True
        outcome[m] = MET
        turn[m] = p
        period[m] = least_period(x, c, word, m, before, p, reach * 2.0 ** -17)
        for g in range(NX):
            exponents[g, m] = logs[g]


@compiled
def cycle_size(x, c, word, m, before, cycle):
    """Return the largest size of a state variable on the way round a cycle, but not of what comes after."""
    LOAD_ORBIT
    most = LARGEST
    for n in range(cycle):
        AT before + n
        STEP 0
        most = max(most, LARGEST)
    return most


@compiled
def widest_gap(x, c, word, m, before, cycle, least):
    """Return the widest gap between states a period apart, over a period and at least some steps."""
    LOAD_ORBIT
    steps = max(cycle, least)
    states = np.empty((NX, steps + cycle))
    for n in range(steps + cycle):
        NOTE states
        AT before + n
        STEP 0
    most = 0.0
    for n in range(steps):
        for k in range(NX):
            d = abs(states[k, n + cycle] - states[k, n])
            most = max(most, min(d, abs(WIDTHS[k] - d)))
    return most


@compiled
def widest_gaps(x, c, word, m, before, cycle):
    """Return the widest gaps between states a period apart over two windows, one after the other.

    Each is of a period and of at least WINDOW steps: so long that the gaps of a spiral, which rise and fall
    as it turns, have been at their widest.
    """
    LOAD_ORBIT
    steps = max(cycle, WINDOW)
    states = np.empty((NX, 2 * steps + cycle))
    for n in range(2 * steps + cycle):
        NOTE states
        AT before + n
        STEP 0
    early = 0.0
    late = 0.0
    for n in range(steps):
        for k in range(NX):
            d = abs(states[k, n + cycle] - states[k, n])
            early = max(early, min(d, abs(WIDTHS[k] - d)))
            d = abs(states[k, n + steps + cycle] - states[k, n + steps])
            late = max(late, min(d, abs(WIDTHS[k] - d)))
    return early, late


@compiled
def multipliers(x, c, word, m, before, cycle, logs):
    """Write the Lyapunov exponents of a cycle, largest first."""
    BEGIN_SINGLE
    LOAD_ORBIT
    product = 1.0
    power = 0.0
    for n in range(cycle):
        AT before + n
        product *= SLOPE
        STEP 0
        size = abs(product)
        if not (size > 2.0 ** -500 and size < 2.0 ** 500):
            if size == 0.0:
                break
            exponent = min(max(exponent_of(size), -1000.0), 1000.0)
            product *= two_to(-exponent)
            power += exponent
    logs[0] = (log(abs(product)) + power * 0.6931471805599453) / cycle
    END_SINGLE
    BEGIN_SEVERAL
    volumes(x, c, word, m, before, cycle, logs)
    END_SEVERAL


@compiled
def least_period(x, c, word, m, before, cycle, near):
    """Return the least divisor of a period after which all states of the next round come back, nearly."""
    if cycle == 1:
        return 1
    LOAD_ORBIT
    states = np.empty((NX, cycle))
    for n in range(cycle):
        AT before + n
        STEP 0
    for n in range(cycle):
        NOTE states
        AT before + n
        STEP 0
    for period in range(1, cycle):
        if cycle % period == 0:
            same = True
            for n in range(cycle):
                for k in range(NX):
                    d = abs(states[k, (n + period) % cycle] - states[k, n])
                    same = same and min(d, abs(WIDTHS[k] - d)) <= near
                if not same:
                    break
            if same:
                return period
    return cycle


@compiled
def leaving(x, c, word, order, since, bound, left):
    """Write after how many steps orbits that are gone left the bound, smoothly between whole numbers.

    With s the largest size of a state variable before and t after the step n that passes the bound b it is
    n - ln(t / b) / ln(t / s).
    """
    for m in order:
        LOAD_ORBIT
        last = LARGEST
        left[m] = float(since[m] + CHUNK)
        for n in range(CHUNK):
            AT since[m] + n
            STEP 0
            size = LARGEST
            if OUTSIDE:
                left[m] = float(since[m] + n + 1)
                if bound <= size < np.inf and last > 0.0:
                    left[m] -= log(size / bound) / log(size / last)
                break
            last = size
'''
