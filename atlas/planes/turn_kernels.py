"""Source of the kernels that count the turns of many orbits together, for rotation numbers.

Words in capitals are expanded by `atlas.planes.plane_source`.
"""

TURN = '''
@compiled
def state_sums(x, c, word, order, before, steps, sums):
    """Add the next states to sums, and leave the orbits where they then stand."""
    lx = np.empty((NX, LANES))
    lm = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
                lm[k, l] = sums[k, m]
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
                x[k, order[first + l]] = lx[k, l]
                sums[k, order[first + l]] = lm[k, l]


@compiled
def turning(x, c, word, order, before, steps, whole, mean, total, weights):
    """Add the turns of the next steps to total, and leave the orbits where they then stand.

    Turns have the weight 1 where whole is 0, else that of their time t in as many steps,
    exp(-1 / (t (1 - t))); weights[0] grows by these.
    """
    lx = np.empty((NX, LANES))
    lm = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lw = np.empty(LANES)
    sum_of_weights = weights[0]
    for first in range(0, order.size, LANES):
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            lw[l] = total[m]
            for k in range(NX):
                lx[k, l] = x[k, m]
                lm[k, l] = mean[k, m]
            for k in range(ROWS):
                lc[k, l] = c[k, m]
        sum_of_weights = weights[0]
        for n in range(steps):
            weight = 1.0
            if whole > 0:
                time = (before + n + 0.5) / whole
                weight = exp(-1.0 / (time * (1.0 - time)))
            sum_of_weights += weight
            PHASE before + n
            for l in range(LANES):
                LOAD
                TURNED
                STORE
                lw[l] += weight * turned
        for l in range(lanes):
            m = order[first + l]
            total[m] = lw[l]
            for k in range(NX):
                x[k, m] = lx[k, l]
    weights[0] = sum_of_weights
'''
