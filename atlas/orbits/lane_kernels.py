"""Source of the kernels that advance and count many orbits together, in lanes.

Words in capitals are expanded by `atlas.orbits.kernel_source` for the state variables and coefficients of a
family. Every lane follows its own orbit, so the result does not depend on which orbits share a group.
"""

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
