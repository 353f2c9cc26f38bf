"""Invented trees: sizes as asked for, the 3/2 law, repeatable from a seed, and plausible as a neuron."""

import math
import time

import numpy as np
import pytest

from morphology import CellTree
from morphology.growth import ball_and_stick, cylinder, neuron, rall_tree, random_arbor, sphere
from morphology.measures import measure
from morphology.swc import read_swc_text, to_text


def same(one, other):
    return all(
        np.array_equal(getattr(one, field), getattr(other, field))
        for field in ("ids", "kinds", "xyz_um", "radius_um", "parent")
    )


def test_simple_shapes_have_the_size_asked_for():
    assert sphere(6.0).radius_um.tolist() == [6.0]
    rod = cylinder(500.0, 2.0, points=11)
    assert (len(rod), rod.path_um[-1]) == (11, 500.0)
    assert rod.shape.area_um2.sum() == pytest.approx(math.pi * 2 * 500, rel=1e-14)
    cell = ball_and_stick(8.0, 300.0, 2.0)
    np.testing.assert_array_equal(cell.xyz_um[1], [8.0, 0, 0])
    assert cell.shape.length_um[1] == 0
    assert cell.shape.length_um.sum() == pytest.approx(300, rel=1e-14)


def test_a_rall_tree_obeys_the_three_halves_law_and_equals_one_cylinder():
    tree = rall_tree(4.0, [100.0, 80.0, 60.0], share=0.35, points_per_branch=4)
    diameter = 2 * tree.radius_um
    # by the definition: daughters are the rows that lie in the place of the row they hang on
    daughters = np.flatnonzero((tree.parent >= 0) & (tree.edge_length_um == 0))
    assert len(daughters) == 6
    for fork in np.unique(tree.parent[daughters]):
        both = daughters[tree.parent[daughters] == fork]
        assert (diameter[both] ** 1.5).sum() == pytest.approx(diameter[fork] ** 1.5, rel=1e-14)
    # the published equivalence: every tip is as far in length constants (Rall 1962, Ann NY Acad Sci 96:1071)
    step = tree.edge_length_um / np.sqrt(diameter)
    tips = np.flatnonzero(tree.child_count == 0)
    reach = [step[tree.path_to(int(tip))].sum() for tip in tips]
    assert len(tips) == 4
    np.testing.assert_allclose(reach, reach[0], rtol=1e-13)
    assert len(set(tree.radius_um[tips].tolist())) > 1


def test_daughters_of_equal_diameter_have_the_published_size():
    # a parent of 2^(2/3) d for two daughters of d; 1.90488126236 µm for two of 1.2 µm (Rall 1962)
    tree = rall_tree(1.90488126236, [400.0, 300.0])
    assert 2 * tree.radius_um[-1] == pytest.approx(1.2, rel=1e-10)
    assert measure(tree).length_um == pytest.approx(400 + 2 * 300, rel=1e-12)


def test_a_rall_tree_may_stand_on_a_soma():
    tree = rall_tree(4.0, [100.0, 80.0], soma_radius_um=9.0)
    assert tree.kinds.tolist() == [1] + [3] * 6
    assert measure(tree).length_um == pytest.approx(100 + 160)


@pytest.mark.parametrize("points", [1, 2, 3, 5, 17, 400, 5000])
def test_an_arbor_has_exactly_the_points_asked_for(points):
    assert len(random_arbor(4, points)) == points


def test_an_arbor_is_branched_tapering_and_unequal():
    tree = random_arbor(4, 3000)
    measures = measure(tree)
    assert measures.branch_points > 50
    assert measures.max_branch_order >= 5
    assert set(measures.length_by_kind_um) == {"basal", "apical"}
    assert all(taper < 0 for taper in measures.taper_by_kind.values())
    assert len(np.unique(tree.radius_um)) > 1000
    assert set(np.unique(random_arbor(4, 300, apical=False).kinds)) == {1, 3}
    # the first points lie on the soma: joined to it, not a cable as long as the rounding
    assert (tree.shape.length_um[tree.parent == 0] == 0).all()
    assert np.linalg.norm(tree.xyz_um[tree.parent == 0], axis=1) == pytest.approx(8.0)


@pytest.mark.parametrize("grow", [lambda seed: random_arbor(seed, 300), neuron], ids=["arbor", "neuron"])
def test_a_seed_gives_the_same_tree_and_another_seed_another(grow):
    assert same(grow(7), grow(7))
    assert not same(grow(7), grow(8))
    assert same(grow(7), grow(np.random.default_rng(7)))
    rng = np.random.default_rng(7)
    assert not same(grow(rng), grow(rng))


def test_a_hundred_thousand_points_grow_quickly():
    start = time.perf_counter()
    assert len(random_arbor(1, 100_000)) == 100_000
    assert time.perf_counter() - start < 3.0


@pytest.mark.parametrize("seed", range(12))
def test_an_invented_neuron_is_plausible_and_clean(seed):
    tree = neuron(seed)
    measures = measure(tree)
    assert 800 <= len(tree) <= 1600
    assert 10_000 < measures.area_um2 < 25_000
    assert 7 < tree.radius_um[0] < 9
    stems = tree.kinds[tree.parent == 0]
    assert (stems == 2).sum() == (stems == 4).sum() == 1
    assert (stems == 3).sum() in (5, 6)
    apical = tree.kinds == 4
    assert 400 < tree.xyz_um[apical, 1].max() < 900
    assert np.ptp(tree.xyz_um[:, 1]) > np.ptp(tree.xyz_um[:, 2])  # apical up, flat in depth
    assert tree.edge_length_um.max() < 15
    assert all(taper < 0 for taper in measures.taper_by_kind.values())
    assert read_swc_text(to_text(tree)).findings == ()


def test_an_invented_neuron_bends():
    tree = neuron(5)
    tips = np.flatnonzero(tree.child_count == 0)
    straight = np.linalg.norm(tree.xyz_um[tips] - tree.xyz_um[0], axis=1)
    assert 1.02 < np.median(tree.path_um[tips] / straight) < 1.6


@pytest.mark.parametrize(
    ("call", "word"),
    [
        (lambda: sphere(0.0), "radius_um"),
        (lambda: cylinder(-1.0, 2.0), "length_um"),
        (lambda: cylinder(1.0, 2.0, points=1), "points"),
        (lambda: ball_and_stick(8.0, 100.0, float("nan")), "diameter_um"),
        (lambda: rall_tree(4.0, []), "lengths_um"),
        (lambda: rall_tree(4.0, [10.0, -1.0]), r"lengths_um\[1\]"),
        (lambda: rall_tree(4.0, [10.0], share=1.0), "rest"),
        (lambda: random_arbor(1, 0), "points"),
    ],
)
def test_impossible_sizes_are_named(call, word):
    with pytest.raises(ValueError, match=word):
        call()


def test_all_are_trees_that_read_back():
    for tree in (rall_tree(3.0, [50.0, 40.0]), random_arbor(9, 60), neuron(1)):
        assert same(tree, CellTree.from_text(to_text(tree)))
