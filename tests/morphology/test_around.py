"""Distances from any place of the tree against a general graph library, and sums within a distance by brute force."""

from __future__ import annotations

import networkx
import numpy as np
import pytest
from numpy.testing import assert_allclose

from morphology import CellTree, Place
from morphology.around import branch_ends, distance_from, stretches_around
from morphology.growth import random_arbor

Y = "1 1 0 0 0 8 -1\n2 3 8 0 0 1 1\n3 3 100 0 0 1 2\n4 3 160 80 0 0.7 3\n5 3 160 -80 0 0.7 3\n6 3 160 -150 0 0.7 5\n"
PLACES = [Place(0), Place(7), Place(40, 0.3), Place(79, 0.5), Place(120, 0.999)]


def along(tree: CellTree, place: Place) -> dict[int, float]:
    """The way from the place to every SWC id, by shortest paths."""
    graph = tree.graph.to_undirected()
    if place.row == 0:
        return networkx.single_source_dijkstra_path_length(graph, int(tree.ids[0]), weight="length_um")
    child, above = int(tree.ids[place.row]), int(tree.ids[tree.parent[place.row]])
    graph.remove_edge(child, above)
    length = tree.edge_length_um[place.row]
    graph.add_edge(above, "here", length_um=place.fraction * length)
    graph.add_edge("here", child, length_um=(1 - place.fraction) * length)
    return networkx.single_source_dijkstra_path_length(graph, "here", weight="length_um")


@pytest.mark.parametrize("place", PLACES)
def test_distance_to_every_point(place: Place) -> None:
    tree = random_arbor(8, 130)
    want = along(tree, place)
    assert_allclose(distance_from(tree, place), [want[int(i)] for i in tree.ids], rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("place", PLACES)
def test_sums_within_a_distance(place: Place) -> None:
    """Each cylinder as 4000 points, each at the shorter of its two ways."""
    tree = random_arbor(8, 130)
    amount = np.random.default_rng(1).uniform(-0.2, 1.0, len(tree))
    stretches, shape = stretches_around(tree, place), tree.shape
    reached = distance_from(tree, place)
    limits = np.r_[0.0, np.linspace(3.0, 1.1 * reached.max(), 9)]
    steps = (np.arange(4000) + 0.5) / 4000
    want = np.zeros(len(limits))
    for row in range(len(tree)):
        fraction = shape.near[row] + (shape.far[row] - shape.near[row]) * steps
        length = tree.edge_length_um[row]
        above = reached[max(tree.parent[row], 0)]
        way = np.minimum(above + fraction * length, reached[row] + (1 - fraction) * length)
        if row == place.row:
            way = np.abs(fraction - place.fraction) * length
        if shape.far[row] <= shape.near[row]:
            way = np.full(1, reached[row])
        want += amount[row] * np.mean(way <= limits[:, None], axis=1)
    assert_allclose(stretches.within(limits, amount), want, atol=2e-3)
    assert stretches.within(np.array([1e9]), amount)[0] == pytest.approx(amount.sum(), rel=1e-12)
    for goal in (0.1, 0.5, 0.9):
        found = stretches.reached_um(amount, goal * amount.sum())
        around = stretches.within(np.array([found - 1e-6, found]), amount)
        assert around[0] <= goal * amount.sum() <= around[1] + 1e-9
    assert stretches.reached_um(amount, 2 * np.abs(amount).sum()) == pytest.approx(stretches.far_um.max())


def test_the_first_crossing_counts_where_some_amounts_are_negative() -> None:
    tree = CellTree.from_text(Y)
    amount = np.array([0.0, 0.0, 2.0, -2.0, -1.0, 3.0])
    stretches = stretches_around(tree, Place(0))
    found = stretches.reached_um(amount, 1.0)
    assert found == pytest.approx(8 + 92 / 2)
    assert stretches.within(np.array([found]), amount)[0] == pytest.approx(1.0)


def test_unbranched_runs_end_at_forks_tips_and_changes_of_kind() -> None:
    tree = CellTree.from_text(Y)
    assert branch_ends(tree).tolist() == [0, 2, 2, 3, 5, 5]
    changed = CellTree.from_text(Y.replace("6 3 160", "6 4 160"))
    assert branch_ends(changed).tolist() == [0, 2, 2, 3, 4, 5]
