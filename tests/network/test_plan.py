"""How many rounds of elimination a tree takes: about log2 of its points, whatever its shape."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from cable.network.plan import Plan, plan_elimination

POINTS = 1500  # so few that no round is cut into slices


def random_tree(span: int) -> np.ndarray:
    rng = np.random.default_rng(span)
    return np.array([-1, *(rng.integers(max(0, i - span), i) for i in range(1, POINTS))])


TREES = {
    "chain": np.arange(-1, POINTS - 1),
    "star": np.r_[-1, np.zeros(POINTS - 1, dtype=int)],
    "binary": np.r_[-1, np.arange(POINTS - 1) // 2],
    "comb": np.r_[-1, np.arange(POINTS - 1) // 2 * 2],
    "broom": np.r_[np.arange(-1, 700), np.full(POINTS - 701, 700)],
    "local": random_tree(3),
    "bushy": random_tree(POINTS),
}


def joined(parent: np.ndarray, plan: Plan) -> list[dict[int, set[int]]]:
    """Neighbours of the points that are left before each round, in the network's own numbers."""
    own = np.argsort(plan.node)
    near: dict[int, set[int]] = {i: set() for i in range(len(parent))}
    for i, p in enumerate(parent.tolist()):
        if p >= 0:
            near[i].add(p)
            near[p].add(i)
    found = []
    for step in plan.rounds:
        found.append({i: set(others) for i, others in near.items()})
        for point in own[step.nodes].tolist():
            others = near.pop(point)
            for one in others:
                near[one].discard(point)
                near[one] |= others - {one}
    assert list(near) == [0]
    return found


@pytest.mark.parametrize("name", TREES)
def test_few_rounds_of_points_that_do_not_touch(name: str) -> None:
    parent = TREES[name].astype(np.int64)
    plan = plan_elimination(parent)
    assert len(plan.rounds) <= 2 * np.log2(POINTS)
    own = np.argsort(plan.node)
    for step, near in zip(plan.rounds, joined(parent, plan), strict=True):
        gone = set(own[step.nodes].tolist())
        assert 0 not in gone
        assert all(len(near[point]) <= 2 and not near[point] & gone for point in gone)
        up = dict(zip(own[step.nodes].tolist(), own[step.parent].tolist(), strict=True))
        chain = own[step.nodes].tolist()[: len(step.child)]
        for point, child in zip(chain, own[step.child].tolist(), strict=True):
            assert near[point] == {up[point], child}


def test_rounds_grow_by_one_or_two_as_points_double() -> None:
    rounds = [len(plan_elimination(np.arange(-1, n - 1)).rounds) for n in (100, 200, 400, 800)]
    assert all(1 <= later - earlier <= 2 for earlier, later in pairwise(rounds)), rounds
