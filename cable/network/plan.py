"""In which order the points of a tree are eliminated: rounds of points that do not touch one another.

A point with at most one child left can be eliminated and leaves a tree behind. In every round the plan takes
all such points whose depth in the tree that is left has one parity (whichever parity has more), so that no
two of them touch and at least half of what can go does go: a chain of n points takes log2(n) rounds. The
plan depends on the tree alone and serves all frequencies and inputs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

Ints = NDArray[np.int64]
LARGEST = 1600  # points in one round: its arrays stay in cache, and below the size that malloc maps anew each time


@dataclass(frozen=True, eq=False)
class Round:
    """One round of points that go together; the first of them have a child, the others are tips.

    Nodes and edges carry the plan's numbers. What a round uses of them is contiguous.

    Attributes:
        nodes: the points that go.
        to_parent: their edges towards the root.
        to_child: the edges to the children of those that have one.
        parent: (size,) the neighbour towards the root.
        child: (chain,) the neighbour away from it.
        bridge: (chain,) the edge that joins child and parent afterwards.
        parents: the different neighbours towards the root.
        gather: (parents, size) of ones; adds up what the points hand to each of `parents`.
    """

    nodes: slice
    to_parent: slice
    to_child: slice
    parent: Ints
    child: Ints
    bridge: Ints
    parents: Ints
    gather: sparse.csr_array


@dataclass(frozen=True, eq=False)
class Plan:
    """The whole order of elimination for one tree.

    Attributes:
        node: (n,) the plan's number of each node of the network; the root comes last.
        edge: (n - 1,) the plan's number of the edge between node i + 1 and its parent.
        edges: how many edge numbers there are, bridges included.
        rounds: the rounds, in order.
    """

    node: Ints
    edge: Ints
    edges: int
    rounds: tuple[Round, ...]


@dataclass(frozen=True, eq=False)
class _Pick:
    """The points of one round in the network's own numbers, with their neighbours and edges."""

    gone: Ints
    parent: Ints
    child: Ints
    up: Ints
    down: Ints
    bridge: Ints


def plan_elimination(parent: Ints) -> Plan:
    """The plan for a tree given by `parent` (n,), with -1 at node 0 and parent[i] < i."""
    n = len(parent)
    above = np.array(parent, dtype=np.int64)
    edge_above = np.arange(-1, n - 1)  # the edge from each node to the parent that is left
    children = np.bincount(above[1:], minlength=n)
    only_child = np.full(n, -1)
    alive = np.arange(n)
    found = []
    edge_count = n - 1
    while len(alive) > 1:
        odd = _odd_depth(alive, above)
        ready = (children[alive] <= 1) & (alive != 0)
        pick_odd = np.count_nonzero(ready & odd) * 2 >= np.count_nonzero(ready)
        chosen = ready & (odd == pick_odd)
        gone = alive[chosen]
        only_child[above[alive[1:]]] = alive[1:]
        tip = children[gone] == 0
        links, tips = gone[~tip], gone[tip]
        gone = np.r_[links, tips[np.argsort(above[tips], kind="stable")]]
        child = only_child[links]
        bridge = np.arange(edge_count, edge_count + len(links))
        edge_count += len(links)
        whole = _Pick(gone, above[gone], child, edge_above[gone], edge_above[child], bridge)
        found += _slices(whole)
        children -= np.bincount(above[tips], minlength=n)
        above[child], edge_above[child] = above[links], bridge
        alive = alive[~chosen]
    return _numbered(n, edge_count, found)


def _slices(pick: _Pick) -> list[_Pick]:
    """The same points in rounds of at most `LARGEST`."""
    chain = len(pick.child)
    slices = []
    for start in range(0, len(pick.gone), LARGEST):
        points, links = slice(start, start + LARGEST), slice(min(start, chain), min(start + LARGEST, chain))
        slices.append(
            _Pick(
                pick.gone[points],
                pick.parent[points],
                pick.child[links],
                pick.up[points],
                pick.down[links],
                pick.bridge[links],
            )
        )
    return slices


def _odd_depth(alive: Ints, above: Ints) -> NDArray[np.bool_]:
    """Whether each node that is left stands at an odd depth of the tree that is left."""
    row = np.empty(len(above), dtype=np.int64)
    row[alive] = np.arange(len(alive))
    jump = np.r_[0, row[above[alive[1:]]]]
    odd = np.ones(len(alive), dtype=bool)
    odd[0] = False
    while jump.any():
        odd ^= odd[jump]
        jump = jump[jump]
    return odd


def _numbered(n: int, edge_count: int, found: list[_Pick]) -> Plan:
    """Give nodes and edges the numbers in which the rounds use them, so that each round works on slices."""
    node, edge = np.empty(n, dtype=np.int64), np.empty(edge_count, dtype=np.int64)
    points = edges = 0
    for pick in found:
        node[pick.gone] = np.arange(points, points + len(pick.gone))
        points += len(pick.gone)
        for consumed in (pick.up, pick.down):
            edge[consumed] = np.arange(edges, edges + len(consumed))
            edges += len(consumed)
    node[0] = points
    rounds, points, edges = [], 0, 0
    for pick in found:
        size, split = len(pick.gone), edges + len(pick.gone)
        parents, place = np.unique(node[pick.parent], return_inverse=True)
        gather = sparse.csr_array((np.ones(size), (place, np.arange(size))), shape=(len(parents), size))
        rounds.append(
            Round(
                nodes=slice(points, points + size),
                to_parent=slice(edges, split),
                to_child=slice(split, split + len(pick.down)),
                parent=node[pick.parent],
                child=node[pick.child],
                bridge=edge[pick.bridge],
                parents=parents,
                gather=gather,
            )
        )
        points, edges = points + size, split + len(pick.down)
    return Plan(node=node, edge=edge[: n - 1], edges=edge_count, rounds=tuple(rounds))
