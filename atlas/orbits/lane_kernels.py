"""Source of the kernels that advance and count many orbits together, in lanes.

Words in capitals are expanded by `atlas.orbits.kernel_source` for the state variables, the coefficients, the
patterns and the axes of a view. Every lane follows its own orbit, so the result does not depend on which
orbits share a group. Numbers of steps are those of the map; where only every so many-th state is recorded,
SKIP runs those between.
"""

CHUNK = 16
"""Steps between two escape tests, counted from the start of a stage."""

PART = 8
"""Recorded states between two visits to the histogram; a divisor of CHUNK."""

ADVANCE = '''
@compiled
def advance(x, c, word, key, order, before, steps, bound, outcome):
    """Advance the orbits of order; outcome becomes GONE where a test finds one outside the bound."""
    lx = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lg = np.empty(LANES, np.bool_)
    lk = np.empty(LANES, np.uint64)
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
            for k in range(ROWS):
                lc[k, l] = c[k, m]
            lg[l] = False
            lk[l] = key[m]
        n = before
        done = 0
        while done < steps:
            now = min(CHUNK, steps - done)
            for part in range(now // UNROLL):
                PHASE n
                for l in range(LANES):
                    LOAD
                    REPEAT
                    STEP n + KTH + 1
                    END_REPEAT
                    STORE
                n += UNROLL
            BEGIN_REST
            for part in range(now % UNROLL):
                PHASE n
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
def returns(x, c, word, order, before, longest, window, repeat, period, gap, size):
    """Look ahead from each orbit's state: the first exact repeat, and the nearest return up to a period."""
    lx = np.empty((NX, LANES))
    rx = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
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
            for k in range(ROWS):
                lc[k, l] = c[k, m]
            lr[l] = 0.0
            lp[l] = 0.0
            lg[l] = np.inf
        t = before
        for n in range(1, window + 1):
            number = float(n)
            beyond = 0.0 if n <= longest else np.inf
            FAR n
            SKIP t
            PHASE t + EVERY - 1
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
            t += EVERY
        for l in range(lanes):
            m = order[first + l]
            repeat[m] = int(lr[l])
            period[m] = int(lp[l])
            gap[m] = lg[l]
            size[m] = ls[l]
'''


SAMPLE = '''
@compiled
def sample(x, c, word, key, order, before, steps, bound, outcome, hit, base, trash, AXES, counts):
    """Record and count states of the orbits of order; note the first return to where each stood."""
    low0, inverse0, slack0 = axis0
    top0 = float(edges0.size - 1)
    SECOND low1, inverse1, slack1 = axis1
    SECOND top1 = float(edges1.size - 1)
    SECOND stride = np.int32(edges0.size + 1)
    lx = np.empty((NX, LANES))
    rx = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lg = np.empty(LANES, np.bool_)
    lh = np.empty(LANES)
    lb = np.empty(LANES, np.int32)
    lk = np.empty(LANES, np.uint64)
    seen0 = np.empty((PART, LANES))
    SECOND seen1 = np.empty((PART, LANES))
    cell = np.empty((PART, LANES), np.int32)
    flat = cell.reshape(-1)
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
                rx[k, l] = x[k, m]
            for k in range(ROWS):
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
                SKIP n
                PHASE n + EVERY - 1
                for l in range(LANES):
                    LOAD
                    h = lh[l]
                    REPEAT
                    STEP n + KTH + EVERY
                    seen0[at + KTH, l] = SHOWN0
                    SECOND seen1[at + KTH, l] = SHOWN1
                    NUMBER done + at + KTH + 1
                    number = number if SAME else np.inf
                    h = number if number < h else h
                    END_REPEAT
                    STORE
                    lh[l] = h
                n += UNROLL * EVERY
            BEGIN_REST
            for k in range(now - now % UNROLL, now):
                PHASE n
                for l in range(LANES):
                    LOAD
                    STEP n + 1
                    STORE
                    seen0[k, l] = SHOWN0
                    SECOND seen1[k, l] = SHOWN1
                    NUMBER done + k + 1
                    number = number if SAME else np.inf
                    lh[l] = number if number < lh[l] else lh[l]
                n += 1
            END_REST
            near = False
            for k in range(now):
                for l in range(LANES):
                    t = (SCALED0(seen0[k, l]) - low0) * inverse0
                    q = np.floor(t)
                    f = t - q
                    near = near | (f < slack0) | (f > 1.0 - slack0)
                    q = q if q > -1.0 else -1.0
                    q = q if q < top0 else top0
                    cell[k, l] = lb[l] + np.int32(q)
            BEGIN_SECOND
            for k in range(now):
                for l in range(LANES):
                    t = (SCALED1(seen1[k, l]) - low1) * inverse1
                    q = np.floor(t)
                    f = t - q
                    near = near | (f < slack1) | (f > 1.0 - slack1)
                    q = q if q > -1.0 else -1.0
                    q = q if q < top1 else top1
                    cell[k, l] += stride * (np.int32(q) + np.int32(1))
            END_SECOND
            if near:
                for k in range(now):
                    for l in range(LANES):
                        cell[k, l] = lb[l] - np.int32(1) + np.int32(CELL_SEEN)
            for j in range(now * LANES):
                counts[np.uint32(flat[j])] += np.uint32(1)
            done += now
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
