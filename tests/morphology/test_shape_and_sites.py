"""The solids that points stand for, and how zones and sites fall on them."""

from __future__ import annotations

import numpy as np
import pytest

from morphology import CellTree, Place, PlaceError, Site, Zone

STICK = "1 1 0 0 0 10 -1\n2 3 4 0 0 2 1\n3 3 40 0 0 1 2\n4 3 100 0 0 0.5 3\n5 4 0 30 0 0.8 1\n6 2 0 -50 0 0.3 1\n"


@pytest.fixture
def tree() -> CellTree:
    return CellTree.from_text(STICK)


def test_a_neurite_starts_at_the_surface_and_points_inside_are_joined(tree: CellTree) -> None:
    shape = tree.shape
    assert shape.sphere_area_um2[0] == pytest.approx(4 * np.pi * 100)
    assert shape.near[1] == shape.far[1]  # the point at 4 µm lies inside the soma
    assert shape.length_um.tolist() == pytest.approx([0, 0, 30, 60, 20, 40])
    # cut by the surface at 10 µm, a sixth of the way from radius 2 to radius 1
    assert shape.radius_near_um[2] == pytest.approx(2 - 1 / 6)
    # a first point outside starts at the surface with its own radius
    assert shape.radius_near_um[4] == shape.radius_far_um[4] == 0.8
    assert shape.area_um2[3] == pytest.approx(np.pi * 1.5 * np.hypot(60, 0.5))


def test_the_other_root_gives_the_same_solids(tree: CellTree) -> None:
    other = tree.rerooted(4)
    for name in ("length_um", "area_um2"):
        assert getattr(other.shape, name).sum() == pytest.approx(getattr(tree.shape, name).sum(), rel=1e-14)
    assert sorted(other.shape.kind[other.shape.length_um > 0]) == sorted(tree.shape.kind[tree.shape.length_um > 0])


def test_a_point_on_the_surface_makes_no_sliver_of_cable() -> None:
    rng = np.random.default_rng(5)
    for _ in range(20):
        way = rng.normal(size=3)
        way /= np.linalg.norm(way)
        xyz = np.array([np.zeros(3), way * 7.3, way * 60]) + rng.normal(size=3) * 100
        shape = CellTree(np.arange(3), np.array([1, 3, 3]), xyz, np.array([7.3, 1.0, 1.0]), np.array([-1, 0, 1])).shape
        assert shape.near[1] == shape.far[1]
        assert shape.length_um[2] == pytest.approx(52.7, rel=1e-8)


@pytest.mark.parametrize(
    ("soma", "word", "sphere"),
    [
        ("1 1 0 0 0 5 -1\n", "one soma point", True),
        ("1 1 0 0 0 5 -1\n2 1 0 5 0 5 1\n3 1 0 -5 0 5 1\n", "three-point soma", True),
        ("1 1 0 0 0 5 -1\n2 1 0 0 0 5 1\n", "in one place", True),
        ("1 1 0 0 0 5 -1\n2 1 0 8 0 4 1\n3 1 0 16 0 3 2\n", "a chain of frusta", False),
        ("1 3 0 0 0 5 -1\n", "no soma point", False),
    ],
)
def test_soma_rules(soma: str, word: str, sphere: bool) -> None:
    shape = CellTree.from_text(soma + "9 3 60 0 0 1 1\n").shape
    assert word in shape.soma_rule
    assert shape.sphere_area_um2.sum() == pytest.approx(4 * np.pi * 25 if sphere else 0)


def test_zones_cut_where_they_fall(tree: CellTree) -> None:
    part = Zone(kinds=("basal",), path_um=(25.0, 70.0)).resolve(tree)
    length = np.maximum(part.high - part.low, 0) * tree.edge_length_um
    assert length.tolist() == pytest.approx([0, 0, 15, 30, 0, 0])
    assert not part.spheres.any()
    thin = Zone(radius_um=(0.6, 0.75)).resolve(tree)
    assert (np.maximum(thin.high - thin.low, 0) * tree.edge_length_um).sum() == pytest.approx(60 * 0.15 / 0.5)
    below = Zone(height_um=(-20.0, 5.0), kinds=("axon", "apical")).resolve(tree)
    assert (np.maximum(below.high - below.low, 0) * tree.edge_length_um).sum() == pytest.approx(10)
    assert Zone(subtree_of=3).resolve(tree).high.nonzero()[0].tolist() == [2, 3]
    assert Zone().resolve(tree).spheres.tolist() == [True, False, False, False, False, False]


def test_sites(tree: CellTree) -> None:
    assert Site("s", path_um=70.0).resolve(tree) == Place(3, pytest.approx(0.5))
    assert Site("s", swc_id=4, fraction=0.25).resolve(tree) == Place(3, 0.25)
    assert Site("s", path_um=5.0).resolve(tree) == Place(0, 1.0)
    with pytest.raises(PlaceError, match=r"3 places lie at path_um = 25.*ids 3 \(basal\), 5 \(apical\), 6 \(axon\)"):
        Site("s", path_um=25.0).resolve(tree)
    with pytest.raises(PlaceError, match="runs from 10 to 100"):
        Site("s", path_um=500.0).resolve(tree)
    with pytest.raises(PlaceError, match="SWC id 77"):
        Site("s", swc_id=77).resolve(tree)
    with pytest.raises(PlaceError, match="no part of the cell passes"):
        Site("s", path_um=25.0, zone=Zone(kinds=("7",))).resolve(tree)


@pytest.mark.parametrize(
    ("make", "word"),
    [
        (lambda: Zone(path_um=(5.0, 2.0)), "ends below its beginning"),
        (lambda: Zone(kinds=("dendrite",)), "unknown kind"),
        (lambda: Zone(height_axis="w"), "expected x, y or z"),
        (lambda: Site("s"), "either swc_id or path_um"),
        (lambda: Site("s", swc_id=1, fraction=1.5), "expected 0 to 1"),
    ],
)
def test_messages(make, word: str) -> None:
    with pytest.raises(ValueError, match=word):
        make()


def test_tree_queries(tree: CellTree) -> None:
    assert tree.path_to(3).tolist() == [0, 1, 2, 3]
    assert tree.subtree(1).tolist() == [False, True, True, True, False, False]
    assert [tree.ids[k] for k in np.flatnonzero(tree.branch_order == 0)] == [1, 2, 3, 4, 5, 6]
    graph = tree.graph
    assert graph.nodes[5]["kind"] == "apical" and graph.edges[3, 4]["length_um"] == pytest.approx(60)
    assert tree.without(["axon"]).ids.tolist() == [1, 2, 3, 4, 5]
    with pytest.raises(ValueError, match="the root is of the kind soma"):
        tree.without(["soma"])
    with pytest.raises(KeyError, match="SWC id 99"):
        tree.index_of(99)
    with pytest.raises(ValueError, match="positive and finite"):
        CellTree(tree.ids, tree.kinds, tree.xyz_um, -tree.radius_um, tree.parent)
    with pytest.raises(ValueError, match="before its children|before their children"):
        CellTree(tree.ids, tree.kinds, tree.xyz_um, tree.radius_um, tree.parent[::-1])
