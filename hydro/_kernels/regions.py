"""Branches of the merge tree of a field: each maximum grown until it meets what ends it."""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def maxima(triangles, inside, values, stands_for):
    """Bool (n,): nodes (walls: the node that stands for them) with no higher neighbour."""
    n = values.size
    top = np.zeros(n, np.bool_)
    beaten = np.zeros(n, np.bool_)
    for t in range(triangles.shape[0]):
        if inside[t]:
            a = stands_for[triangles[t, 0]]
            b = stands_for[triangles[t, 1]]
            c = stands_for[triangles[t, 2]]
            high = max(values[a], values[b], values[c])
            top[a] = top[b] = top[c] = True
            if values[a] < high:
                beaten[a] = True
            if values[b] < high:
                beaten[b] = True
            if values[c] < high:
                beaten[c] = True
    return top & ~beaten


@njit(cache=True, nogil=True)
def _push(heap, size, values, i):
    heap[size] = i
    k = size
    while k > 0:
        up = (k - 1) // 2
        if values[heap[up]] >= values[heap[k]]:
            break
        heap[up], heap[k] = heap[k], heap[up]
        k = up
    return size + 1


@njit(cache=True, nogil=True)
def _pop(heap, size, values):
    first = heap[0]
    size -= 1
    heap[0] = heap[size]
    k = 0
    while True:
        down = 2 * k + 1
        if down >= size:
            break
        if down + 1 < size and values[heap[down + 1]] > values[heap[down]]:
            down += 1
        if values[heap[k]] >= values[heap[down]]:
            break
        heap[k], heap[down] = heap[down], heap[k]
        k = down
    return first, size


@njit(cache=True, nogil=True)
def grow(triangles, inside, start, around, values, stands_for, wall_start, wall_nodes, wall_of_node, ends, seeds, past_ends):
    """Grow each seed over ever lower values until it meets what ends it.

    Parameters
    ----------
    values : (n,) the field; a wall's nodes share one value.
    stands_for : (n,) the node that stands for each node: itself, or the first of its wall.
    wall_start, wall_nodes, wall_of_node : compressed lists of the nodes of walls.
    ends : (n,) bool, by standing node: meeting it ends a region.
    seeds : maxima, by standing node.
    past_ends : for seeds that are ends themselves: a region then ends at its first saddle.

    Returns
    -------
    first : (r + 1,), members : standing nodes of each region, all above its level
    level : (r,) where it ended; meets : (r,) standing node at which that level was reached
    seed : (r,)

    A seed that an earlier region holds adds nothing: it is one of that region's cores. A region that
    has ended ends those that meet it, at the saddle between them. Values equal to the level are not in.
    """
    n = values.size
    owner = np.full(n, -1, np.int32)
    seen = np.full(n, -1, np.int32)
    spent = np.zeros(n, np.bool_)  # level ground that has no edge lower than itself
    heap = np.empty(n + 1, np.int32)
    order = np.empty(n + 1, np.int32)
    members = np.empty(n, np.int32)
    first = np.zeros(seeds.size + 1, np.int64)
    level = np.empty(seeds.size)
    meets = np.empty(seeds.size, np.int32)
    seed = np.empty(seeds.size, np.int32)
    n_regions = 0
    n_members = 0
    for s in range(seeds.size):
        origin = seeds[s]
        if owner[origin] >= 0 or spent[origin]:
            continue
        low = values[origin]
        size = _push(heap, 0, values, origin)
        seen[origin] = s
        count = 0
        cut = 0
        at = origin
        while size > 0:
            i, size = _pop(heap, size, values)
            if values[i] < low:
                low = values[i]
                cut = count
                at = i
            if past_ends:
                if values[i] > low or (ends[i] and wall_of_node[i] >= 0):
                    break
            elif ends[i] or owner[i] >= 0:
                break
            order[count] = i
            count += 1
            w = wall_of_node[i]
            lo = wall_start[w] if w >= 0 else 0
            hi = wall_start[w + 1] if w >= 0 else 1
            for k in range(lo, hi):
                node = wall_nodes[k] if w >= 0 else i
                for p in range(start[node], start[node + 1]):
                    t = around[p]
                    if inside[t]:
                        for c in range(3):
                            j = stands_for[triangles[t, c]]
                            if seen[j] != s:
                                seen[j] = s
                                size = _push(heap, size, values, j)
        if low == values[origin]:
            for k in range(count):
                spent[order[k]] |= values[order[k]] == low
            continue
        for k in range(cut):
            owner[order[k]] = n_regions
            members[n_members + k] = order[k]
        n_members += cut
        level[n_regions] = low
        meets[n_regions] = at
        seed[n_regions] = origin
        n_regions += 1
        first[n_regions] = n_members
    return first[: n_regions + 1], members[:n_members], level[:n_regions], meets[:n_regions], seed[:n_regions]


@njit(cache=True, nogil=True)
def ordered(a, b, side_from, n):
    """Order sides (a to b) into chains that follow each other, and the first place of each chain.

    ``side_from`` (n,) holds, for each node, one side that leaves it (-1 for none). A chain that comes back to
    its start is a ring; where a node has several sides leaving it, the others start chains of their own.
    """
    count = a.size
    order = np.empty(count, np.int32)
    first = np.zeros(count + 1, np.int32)
    used = np.zeros(count, np.bool_)
    entered = np.zeros(n, np.bool_)
    for s in range(count):
        entered[b[s]] = True
    chains = 0
    placed = 0
    for rings in range(2):
        for s0 in range(count):
            if used[s0] or (rings == 0 and entered[a[s0]]):
                continue
            s = s0
            while s >= 0 and not used[s]:
                used[s] = True
                order[placed] = s
                placed += 1
                s = side_from[b[s]]
            chains += 1
            first[chains] = placed
    return order, first[: chains + 1].copy()
