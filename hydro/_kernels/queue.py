"""A priority queue of numbered items that can be moved up: the least key is taken first.

``heap`` holds items, ``place`` the position of each item in it (-1: not in the queue), ``key`` the key of
each item, ``size`` (1,) how many are queued. Equal keys leave in the order of their numbers, so that
answers do not hang on the order of insertion.
"""

from __future__ import annotations

from numba import njit


@njit(cache=True, nogil=True)
def _before(a, b, key):
    return key[a] < key[b] or (key[a] == key[b] and a < b)


@njit(cache=True, nogil=True)
def push(item, new_key, heap, place, key, size):
    """Queue an item, or move it up when it is queued with a larger key."""
    key[item] = new_key
    i = place[item]
    if i < 0:
        i = size[0]
        size[0] += 1
    while i > 0:
        up = (i - 1) >> 2
        other = heap[up]
        if not _before(item, other, key):
            break
        heap[i] = other
        place[other] = i
        i = up
    heap[i] = item
    place[item] = i


@njit(cache=True, nogil=True)
def pop(heap, place, key, size):
    """Take the item with the least key."""
    top = heap[0]
    place[top] = -1
    size[0] -= 1
    n = size[0]
    if n == 0:
        return top
    item = heap[n]
    i = 0
    while True:
        first = 4 * i + 1
        if first >= n:
            break
        best = first
        for c in range(first + 1, min(first + 4, n)):
            if _before(heap[c], heap[best], key):
                best = c
        if not _before(heap[best], item, key):
            break
        heap[i] = heap[best]
        place[heap[i]] = i
        i = best
    heap[i] = item
    place[item] = i
    return top
