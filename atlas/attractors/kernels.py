"""Source of the kernels that tell attractors apart, and the module that has them for a family.

Words in capitals are expanded by `atlas.orbits.kernel_source`. States are looked at where a pattern begins
only, because states are the same only at the same place in the pattern.
"""

from __future__ import annotations

from types import ModuleType

from atlas.orbits.kernel_source import Writer
from atlas.orbits.step import StepSource, load_module

GATHER = '''
@compiled
def gather(x, end, c, word, order, group, period, turn, near, wide, reach, own, points, sizes, firsts):
    """Give the orbits of order on cycles numbers from 0 within their group: the same on the same cycle.

    A cycle is the same where one period divides the other and a point of one lies within near times the
    largest of reach and the cycle's own size of a point of the other. own[m] is -1 where there is no room for
    another cycle. Orbits of period 0 come last in their group: they are given a cycle where their end state
    is near one of its points, with wide in the place of near, else -1. Returns the number of cycles of the
    last group; the points of each, their number, and an orbit of the least period stand in the arrays then.
    """
    scales = np.empty(sizes.size)
    later = np.empty((points.shape[1], NX))
    known = 0
    last = -1
    for m in order:
        if group[m] != last:
            known = 0
            last = group[m]
        if period[m] == 0:
            for k in range(NX):
                later[0, k] = end[k, m]
            own[m] = same_cycle(later[:1], 0, period, wide, known, points, sizes, firsts, scales)
            continue
        for k in range(NX):
            later[0, k] = x[k, m]
        number = same_cycle(later[:1], int(period[m]), period, near, known, points, sizes, firsts, scales)
        if number < 0:
            size = follow(x, c, word, m, turn[m] // word.size, later)
            some = later[: turn[m] // word.size]
            number = same_cycle(some, int(period[m]), period, near, known, points, sizes, firsts, scales)
            if number < 0 and known < sizes.size:
                number = known
                known += 1
                firsts[number] = m
                sizes[number] = some.shape[0]
                scales[number] = max(reach, size)
                points[number, : some.shape[0]] = some
        if number >= 0 and period[m] < period[firsts[number]]:
            firsts[number] = m
            sizes[number] = turn[m] // word.size
            scales[number] = max(reach, follow(x, c, word, m, sizes[number], points[number]))
        own[m] = number
    return known


@compiled
def same_cycle(some, own_period, period, near, known, points, sizes, firsts, scales):
    """Return the first known cycle that has a point near one of some points; -1 without one."""
    for a in range(known):
        other = int(period[firsts[a]])
        if own_period % other != 0 and other % own_period != 0:
            continue
        for n in range(some.shape[0]):
            for q in range(sizes[a]):
                distance = 0.0
                for k in range(NX):
                    d = abs(points[a, q, k] - some[n, k])
                    distance = max(distance, min(d, abs(WIDTHS[k] - d)))
                if distance <= near * scales[a]:
                    return a
    return -1


@compiled
def follow(x, c, word, m, turns, out):
    """Write the states of an orbit where the next patterns begin, from its own on; return their size."""
    LOAD_ORBIT
    size = 0.0
    for q in range(turns):
        for k in range(NX):
            out[q, k] = STATE[k]
            size = max(size, abs(STATE[k]))
        for n in range(word.size):
            AT n
            STEP 0
    return size


@compiled
def root_of(parent, cell):
    """Return the lowest cell that a cell is joined to."""
    while parent[cell] != cell:
        parent[cell] = parent[parent[cell]]
        cell = parent[cell]
    return cell


@compiled
def lowest(parent, order, entered):
    """Replace the cells where orbits entered by the lowest that they are joined to."""
    for m in order:
        entered[m] = root_of(parent, entered[m])


@compiled
def unite(parent, left, right):
    """Join cells pair by pair."""
    for i in range(left.size):
        a = root_of(parent, left[i])
        b = root_of(parent, right[i])
        if a != b:
            parent[max(a, b)] = min(a, b)
'''

LOADED = """
        lanes = min(LANES, order.size - first)
        for l in range(LANES):
            m = order[first + min(l, lanes - 1)]
            for k in range(NX):
                lx[k, l] = x[k, m]
            for k in range(ROWS):
                lc[k, l] = c[k, m]
            lk[l] = key[m]
"""

ONWARD = """
            for n in range(word.size):
                PHASE n
                for l in range(LANES):
                    LOAD
                    STEP before + record * word.size + n + 1
                    STORE
"""

VISIT = f'''
@compiled
def visit(x, c, word, key, order, before, records, bound, least, most, total, end, gone):
    """Look at the next states of orbits: the box, sum and last of each, and whether it left the bound."""
    lx = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lk = np.empty(LANES, np.uint64)
    lg = np.empty(LANES, np.bool_)
    low = np.empty((NX, LANES))
    high = np.empty((NX, LANES))
    sums = np.empty((NX, LANES))
    for first in range(0, order.size, LANES):
{LOADED}
        low[:] = np.inf
        high[:] = -np.inf
        sums[:] = 0.0
        lg[:] = False
        for record in range(records):
{ONWARD}
            for k in range(NX):
                for l in range(LANES):
                    y = lx[k, l]
                    low[k, l] = y if y < low[k, l] else low[k, l]
                    high[k, l] = y if y > high[k, l] else high[k, l]
                    sums[k, l] += y
            for l in range(LANES):
                LOAD
                lg[l] = lg[l] | OUTSIDE
        for l in range(lanes):
            m = order[first + l]
            gone[m] = lg[l]
            for k in range(NX):
                least[k, m] = low[k, l]
                most[k, m] = high[k, l]
                total[k, m] = sums[k, l]
                end[k, m] = lx[k, l]
'''

JOIN = f'''
@compiled
def join(x, c, word, key, order, before, records, low, inverse, side, group, parent, entered):
    """Join all cells that an orbit visits; entered gets the first of them.

    Group g = group[m] has side ** NX cells, side of them along each axis, from low[k, g] on, their
    inverse size inverse[k, g]; what lies outside counts as in the cells at the edge.
    """
    lx = np.empty((NX, LANES))
    lc = np.empty((ROWS, LANES))
    lk = np.empty(LANES, np.uint64)
    ll = np.empty((NX, LANES))
    li = np.empty((NX, LANES))
    cells = np.empty(LANES, np.int32)
    roots = np.empty(LANES, np.int64)
    lb = np.empty(LANES, np.int64)
    top = float(side - 1)
    for first in range(0, order.size, LANES):
{LOADED}
            for k in range(NX):
                ll[k, l] = low[k, group[m]]
                li[k, l] = inverse[k, group[m]]
            lb[l] = group[m] * side ** NX
        for record in range(records):
{ONWARD}
            cells[:] = 0
            for k in range(NX):
                for l in range(LANES):
                    q = (lx[k, l] - ll[k, l]) * li[k, l]
                    q = q if q > 0.0 else 0.0
                    q = q if q < top else top
                    cells[l] = cells[l] * np.int32(side) + np.int32(q)
            if record == 0:
                for l in range(lanes):
                    roots[l] = lb[l] + cells[l]
                    entered[order[first + l]] = roots[l]
            for l in range(lanes):
                cell = lb[l] + cells[l]
                if parent[cell] != roots[l]:
                    a = root_of(parent, cell)
                    b = root_of(parent, roots[l])
                    if a != b:
                        parent[max(a, b)] = min(a, b)
                    roots[l] = min(a, b)
'''


def attractor_module(source: StepSource, lanes: int) -> ModuleType:
    """Return the compiled kernels that tell the attractors of a family apart.

    Parameters
    ----------
    source : StepSource
        That draws its own state variables, in their order.
    lanes : int
        Orbits in a group.
    """
    writer = Writer(source, source.states)
    parts = [source.text, writer.single_steps(), writer.written(GATHER, step="one_step")]
    for name, text in (("visit", VISIT), ("join", JOIN)):
        parts.append(writer.written(text))
        again = text.replace(f"def {name}(", f"def {name}_disturbed(")
        parts.append(writer.written(again, disturb=True))
    return load_module(writer.named("\n".join(parts), {"LANES": str(lanes)}))
