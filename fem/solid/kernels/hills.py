"""Local maxima on a graph, and which of them are one hill, by joining nodes in falling order."""

from __future__ import annotations

from fem.solid.kernels.jit import kernel


@kernel
def _root(parent, i):  # type: ignore[no-untyped-def]
    while parent[i] != i:
        parent[i] = parent[parent[i]]
        i = parent[i]
    return i


@kernel
def maxima(indptr, indices, values, out):  # type: ignore[no-untyped-def]
    """Mark in out (n,) the nodes with a positive value that no neighbour exceeds."""
    for i in range(values.size):
        out[i] = values[i] > 0.0 and indptr[i + 1] > indptr[i]
        for k in range(indptr[i], indptr[i + 1]):
            if values[indices[k]] > values[i]:
                out[i] = False
                break


@kernel
def hills(indptr, indices, values, kind, order, candidates, saddle, enough, parent, accepted):  # type: ignore[no-untyped-def]
    """Write to `accepted` those candidates (greatest first) that are hills of their own, and return their number.

    A candidate belongs to an accepted one of the same kind (n,) when a path joins them on which the values stay at
    `saddle` of the candidate's or above. order (n,): nodes by falling value; parent (n,): all -1. Stops when `enough`
    are accepted and one of them has a negative kind.
    """
    count, placed, plain = 0, 0, False
    for candidate in candidates:
        level = saddle * values[candidate]
        while placed < order.size and values[order[placed]] >= level:
            i = order[placed]
            placed += 1
            parent[i] = i
            for k in range(indptr[i], indptr[i + 1]):
                j = indices[k]
                if parent[j] >= 0:
                    a, b = _root(parent, i), _root(parent, j)
                    if a != b:
                        parent[b] = a
        own, mine = True, _root(parent, candidate)
        for k in range(count):
            if kind[accepted[k]] == kind[candidate] and _root(parent, accepted[k]) == mine:
                own = False
                break
        if own:
            accepted[count] = candidate
            count += 1
            plain |= kind[candidate] < 0
            if count >= enough and plain:
                break
    return count
