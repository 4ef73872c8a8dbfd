"""Source of the kernels that count the turns of many orbits together, for rotation numbers.

Words in capitals are expanded by `atlas.planes.plane_source`.
"""

TURN = '''
@compiled
def mean_state(x, c, word, order, before, steps, mean):
    """Write the mean state of the next steps."""
    lx = np.empty((NX, LANES))
    lm = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
                lm[k, l] = 0.0
            for k in range(ROWS):
                lc[k, l] = c[k, m]
        for n in range(steps):
            PHASE before + n
            for l in range(LANES):
                LOAD
                STEP 0
                STORE
                for k in range(NX):
                    lm[k, l] += lx[k, l]
        for l in range(lanes):
            for k in range(NX):
                mean[k, order[first + l]] = lm[k, l] / steps


@compiled
def turning(x, c, word, order, before, weights, mean, total):
    """Write the weighted sum of the turns that each step makes."""
    lx = np.empty((NX, LANES))
    lm = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lw = np.empty(LANES)
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            lw[l] = 0.0
            for k in range(NX):
                lx[k, l] = x[k, m]
                lm[k, l] = mean[k, m]
            for k in range(ROWS):
                lc[k, l] = c[k, m]
        for n in range(weights.size):
            weight = weights[n]
            PHASE before + n
            for l in range(LANES):
                LOAD
                TURNED
                STORE
                lw[l] += weight * turned
        for l in range(lanes):
            total[order[first + l]] = lw[l]
'''
