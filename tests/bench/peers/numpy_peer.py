"""The same answer in NumPy: all pairs, no index, one thread.

Reads the problem that the benchmark wrote (the first argument): the reaches of the search area, of every landmark's box, of
every travel and every look, in the solver's 32 directions. Then, for each line "run" on standard input, solves it and
prints one line of JSON: seconds, and for each detection the numbers of cells and places and the spread. Plain binary64,
without outward rounding.

The recursion is the solver's: move every cell (add reaches), intersect it with every landmark's vantage (least reaches, then
tightened), drop what is empty and what lies inside another cell. All pairs of cells and landmarks are first compared by their
bounding boxes, in chunks, then those that are left by all their reaches.
"""

import json
import sys
import time

import numpy as np
import threadpoolctl

CHUNK = 4_000_000  # pairs looked at in one go: a few times the last-level cache is fastest
ROWS = 2_000  # cells tightened in one go

with open(sys.argv[1]) as file:
    problem = json.load(file)

D = np.array(problem["directions"])
COUNT = len(D)
HALF = COUNT // 2
EAST, NORTH = 0, COUNT // 4
WEST, SOUTH = EAST + HALF, NORTH + HALF
CROSS = D[:, None, 0] * D[None, :, 1] - D[:, None, 1] * D[None, :, 0]
BOXES = np.array(problem["box_reaches"])
AREA = np.array(problem["search_area"])[None, :]
STEPS = [
    (np.array(step["travel"]), None if step["look"] is None else np.array(step["look"]))
    for step in problem["steps"]
]
GAP = problem["fix_size_m"]


def implications():
    """For every direction t: pairs (a, b) around it, less than half a turn apart, and the two weights of their reaches."""
    rows = []
    for t in range(COUNT):
        pairs = [
            ((t - i) % COUNT, (t + j) % COUNT) for i in range(1, HALF) for j in range(1, HALF) if i + j < HALF
        ]
        a, b = np.array(pairs).T
        rows.append((a, b, CROSS[t, b] / CROSS[a, b], CROSS[a, t] / CROSS[a, b]))
    return rows


IMPLIED = implications()


def tightened(reach):
    """Every reach the least that the others imply; cells without a point are left out."""
    parts = []
    for begin in range(0, len(reach), ROWS):
        loose = reach[begin : begin + ROWS]
        tight = loose.copy()
        for t, (a, b, by_a, by_b) in enumerate(IMPLIED):
            np.minimum(tight[:, t], (loose[:, a] * by_a + loose[:, b] * by_b).min(axis=1), out=tight[:, t])
        parts.append(tight[(tight[:, :HALF] + tight[:, HALF:] >= 0).all(axis=1)])
    return np.concatenate(parts) if parts else reach


def near(a, b, gap):
    """All pairs (i, j) with the bounding boxes of a[i] and b[j] within `gap` of each other."""
    rows = max(1, CHUNK // max(1, len(b)))
    first, second = [np.empty(0, np.int64)], [np.empty(0, np.int64)]
    for begin in range(0, len(a), rows):
        part = a[begin : begin + rows, :, None]
        meets = part[:, EAST] + (gap + b[:, WEST]) >= 0
        meets &= part[:, WEST] + (gap + b[:, EAST]) >= 0
        meets &= part[:, NORTH] + (gap + b[:, SOUTH]) >= 0
        meets &= part[:, SOUTH] + (gap + b[:, NORTH]) >= 0
        i, j = np.divmod(np.flatnonzero(meets), len(b))
        first.append(i + begin)
        second.append(j)
    return np.concatenate(first), np.concatenate(second)


def without_covered(cells):
    order = np.lexsort((-cells[:, EAST], -cells[:, WEST]))
    cells = cells[order]
    i, j = near(cells, cells, 0.0)
    # Cell i comes earlier and holds cell j.
    earlier = i < j
    i, j = i[earlier], j[earlier]
    keeps = np.ones(len(cells), bool)
    keeps[j[(cells[j] <= cells[i]).all(axis=1)]] = False
    return cells[keeps]


def places(cells):
    i, j = near(cells, cells, GAP)
    label = np.arange(len(cells))
    while True:
        before = label.copy()
        np.minimum.at(label, i, label[j])
        label = label[label]
        if (label == before).all():
            return len(np.unique(label))


def spread(cells):
    hull = cells.max(axis=0)
    after = np.roll(hull, -1)
    turned = np.roll(D, -1, axis=0)
    det = D[:, 0] * turned[:, 1] - D[:, 1] * turned[:, 0]
    east = (hull * turned[:, 1] - after * D[:, 1]) / det
    north = (after * D[:, 0] - hull * turned[:, 0]) / det
    return float(np.hypot(east[:, None] - east, north[:, None] - north).max())


def solve():
    cells, events = AREA, []
    travel = np.zeros(COUNT)
    for more, look in STEPS:
        travel = travel + more
        if look is None:
            continue
        moved = cells + travel
        vantages = BOXES + look
        i, j = near(moved, vantages, 0.0)
        least = np.minimum(moved[i], vantages[j])
        # A vantage whole inside the moved cell, or the other way round, is tight as it is.
        is_tight = (least == vantages[j]).all(axis=1) | (least == moved[i]).all(axis=1)
        rest = least[~is_tight]
        rest = rest[(rest[:, :HALF] + rest[:, HALF:] >= 0).all(axis=1)]
        found = np.concatenate([least[is_tight], tightened(rest)])
        if len(cells) > 1 and len(found) > 1:
            found = without_covered(found)
        cells, travel = found, np.zeros(COUNT)
        events.append([len(cells), places(cells), spread(cells) if len(cells) else None])
        if len(cells) == 0:
            break
    return events


print(
    json.dumps({"numpy": np.__version__, "python": sys.version.split()[0], "blas": threadpoolctl.threadpool_info()}),
    flush=True,
)
for line in sys.stdin:
    if line.strip() != "run":
        break
    begin = time.perf_counter()
    events = solve()
    seconds = time.perf_counter() - begin
    print(json.dumps({"seconds": seconds, "events": events}), flush=True)
