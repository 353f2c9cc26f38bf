"""Parent links as arrays: lookup, roots, cycles, order. Works on broken links too, so that they can be named.

Everywhere `parent` is (N,) rows, with -1 for a root and -2 for a parent that the file does not have; both
end a path. Jumps are doubled, so that a chain of any depth takes log2(N) steps and no recursion.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Mask = NDArray[np.bool_]
ROOT, MISSING = -1, -2


def parent_rows(ids: Ints, parent_ids: Ints) -> Ints:
    """(N,) row of each row's parent; of rows with one id the first counts."""
    by_id = np.argsort(ids, kind="stable")
    at = np.searchsorted(ids[by_id], parent_ids)
    found = by_id[np.minimum(at, len(ids) - 1)]
    rows = np.where(ids[found] == parent_ids, found, MISSING)
    return np.where(parent_ids < 0, ROOT, rows)


def _jumps(parent: Ints) -> Ints:
    return np.where(parent < 0, np.arange(len(parent)), parent)


def _rounds(n: int) -> range:
    return range(int(n).bit_length() + 1)


def top_rows(parent: Ints) -> Ints:
    """(N,) the row where each row's path upwards ends; for rows in or below a cycle some row of the cycle."""
    jump = _jumps(parent)
    for _ in _rounds(len(parent)):
        jump = jump[jump]
    return jump


def endless(parent: Ints) -> Mask:
    """(N,) whether a row lies in or below a cycle."""
    return parent[top_rows(parent)] >= 0


def cycle_through(parent: Ints, row: int) -> list[int]:
    """The rows of the cycle that the path upwards from `row` runs into, each child before its parent."""
    for _ in range(len(parent)):
        row = int(parent[row])
    ring = [row]
    while parent[ring[-1]] != row:
        ring.append(int(parent[ring[-1]]))
    return ring


def depths(parent: Ints) -> Ints:
    """(N,) number of links between each row and the end of its path (no cycles)."""
    total, jump = (parent >= 0).astype(np.int64), _jumps(parent)
    for _ in _rounds(len(parent)):
        total, jump = total + total[jump], jump[jump]
    return total


def has_ancestor(parent: Ints, flag: Mask) -> Mask:
    """(N,) whether a row or any row above it has `flag`."""
    flag, jump = flag.copy(), _jumps(parent)
    for _ in _rounds(len(parent)):
        flag, jump = flag | flag[jump], jump[jump]
    return flag


def parents_first(parent: Ints) -> Ints:
    """(N,) the rows in an order in which each parent stands before its children (no cycles).

    A row is brought forward only as far as its first descendant needs; a file in order stays as it is.
    """
    if (parent < np.arange(len(parent))).all():
        return np.arange(len(parent))
    depth = depths(parent)
    above = parent.tolist()
    first = list(range(len(above)))
    for row in np.argsort(-depth, kind="stable").tolist():
        up = above[row]
        if up >= 0 and first[row] < first[up]:
            first[up] = first[row]
    return np.lexsort((depth, np.array(first, dtype=np.int64)))


def child_counts(parent: Ints) -> Ints:
    """(N,) number of children of each row."""
    return np.bincount(parent[parent >= 0], minlength=len(parent)).astype(np.int64)


def edge_lengths(xyz_um: Floats, parent: Ints) -> Floats:
    """(N,) straight distance to the parent, µm; 0 where there is none."""
    length = np.linalg.norm(xyz_um - xyz_um[np.maximum(parent, 0)], axis=1)
    return np.where(parent >= 0, length, 0.0)
