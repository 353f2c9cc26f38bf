"""How far everything is from one place of the tree, along the tree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from morphology.sites import Place
from morphology.tree import CellTree, Floats, Ints


def distance_from(tree: CellTree, place: Place) -> Floats:
    """(N,) way along the tree from a place to each point, µm."""
    above = tree.path_um[max(int(tree.parent[place.row]), 0)]
    here = above + place.fraction * (tree.path_um[place.row] - above)
    jump = np.maximum(tree.parent, 0)
    way = tree.path_to(place.row)
    jump[way] = way
    while (jump != jump[jump]).any():
        jump = jump[jump]
    return here + tree.path_um - 2 * np.minimum(tree.path_um[jump], here)


@dataclass(frozen=True, eq=False)
class Stretches:
    """The cable of a tree by its distance from one place: what is nearer than the place itself is cut there.

    A point without cable of its own (a sphere, a joined point) is a stretch of no length.

    Attributes:
        row: (S,) the tree row whose cylinder a stretch is of; every row occurs.
        near_um, far_um: (S,) distances of its two ends from the place, near_um <= far_um.
        part: (S,) the part of the cylinder that it is; the parts of a row add to 1.
    """

    row: Ints
    near_um: Floats
    far_um: Floats
    part: Floats

    def within(self, distance_um: Floats, amount: Floats) -> Floats:
        """(D,) sum of `amount` (N,), spread evenly along each row's cylinder, up to distances (D,), µm."""
        length = self.far_um - self.near_um
        weight = amount[self.row] * self.part
        total = np.empty(len(distance_um))
        for k, limit in enumerate(distance_um):
            inside = np.clip((limit - self.near_um) / np.where(length > 0, length, 1.0), 0.0, 1.0)
            total[k] = weight @ np.where(length > 0, inside, limit >= self.near_um)
        return total

    def reached_um(self, amount: Floats, goal: float) -> float:
        """The least distance up to which `amount` (N,) adds to `goal`, µm; the farthest end where it never does."""
        length = self.far_um - self.near_um
        weight = amount[self.row] * self.part
        slope = np.divide(weight, length, out=np.zeros_like(weight), where=length > 0)
        step = np.where(length > 0, 0.0, weight)
        knot, where = np.unique(np.r_[self.near_um, self.far_um], return_inverse=True)
        change = np.bincount(where, np.r_[slope, -slope], len(knot))
        jump = np.bincount(where, np.r_[step, np.zeros(len(step))], len(knot))
        rate = np.cumsum(change)
        before = np.r_[0.0, np.cumsum(rate[:-1] * np.diff(knot))] + np.cumsum(jump) - jump
        after = before + jump
        hit = np.flatnonzero(np.maximum(before, after) >= goal)
        if not hit.size:
            return float(knot[-1])
        k = int(hit[0])
        if k == 0 or before[k] < goal:
            return float(knot[k])
        return float(np.interp(goal, [after[k - 1], before[k]], [knot[k - 1], knot[k]]))


def stretches_around(tree: CellTree, place: Place) -> Stretches:
    """Where the cable of every row lies, by distance from `place`."""
    shape, distance = tree.shape, distance_from(tree, place)
    row, first, last = np.arange(len(tree)), shape.near.copy(), shape.far.copy()
    if first[place.row] < place.fraction < last[place.row]:
        row = np.r_[row, place.row]
        first, last = np.r_[first, place.fraction], np.r_[last, last[place.row]]
        last[place.row] = place.fraction
    above = distance[np.maximum(tree.parent, 0)][row]

    def at(fraction: Floats) -> Floats:
        straight = above + fraction * (distance[row] - above)
        return np.where(row == place.row, np.abs(fraction - place.fraction) * tree.edge_length_um[row], straight)

    one, other = at(first), at(last)
    cable = (shape.far - shape.near)[row]
    part = np.divide(last - first, cable, out=np.ones(len(row)), where=cable > 0)
    return Stretches(row, np.minimum(one, other), np.maximum(one, other), part)


def branch_ends(tree: CellTree) -> NDArray[np.int64]:
    """(N,) the row where the unbranched run of each row's cylinder ends: at a fork, a tip or a change of kind."""
    end = np.arange(len(tree))
    child = np.flatnonzero(tree.child_count[np.maximum(tree.parent, 0)] == 1)
    child = child[(tree.parent[child] >= 0) & (tree.kinds[child] == tree.kinds[np.maximum(tree.parent[child], 0)])]
    end[tree.parent[child]] = child
    while (end != end[end]).any():
        end = end[end]
    return end
