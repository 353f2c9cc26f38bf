"""Measures against published geometry, a naive loop from the definitions, and what must not matter."""

import json
import math
import time

import numpy as np
import pytest
from scipy.integrate import quad

from morphology import CellTree
from morphology.growth import ball_and_stick, cylinder, neuron, rall_tree, random_arbor, sphere
from morphology.measures import area_by_distance, electrotonic_distance, electrotonic_extent, measure


def frustum(length, near, far):
    return CellTree([1, 2], [3, 3], [[0, 0, 0], [length, 0, 0]], [near, far], [-1, 0])


def bush():
    """A small asymmetric cell, off-centre, with an axon: soma 5, a trunk of 40 that forks to 30 and 50."""
    return CellTree.from_text(
        """1 1 10 20 30 5 -1
2 3 15 20 30 2 1
3 3 55 20 30 1 2
4 3 55 50 30 0.5 3
5 3 55 -30 30 0.25 3
6 2 10 15 30 0.5 1
7 2 10 -5 30 0.5 6
"""
    )


def test_a_sphere_has_its_area_and_no_length():
    measures = measure(sphere(7.5))
    assert measures.area_um2 == pytest.approx(4 * math.pi * 7.5**2, rel=1e-15)
    assert (measures.length_um, measures.tips, measures.branch_points) == (0, 0, 0)
    assert measures.area_by_kind_um2 == {"soma": measures.area_um2}
    assert measures.as_dict()["rall_ratio"]["median"] is None


def test_the_lateral_area_of_a_frustum():
    # π (r + R) sqrt(h² + (R - r)²) with h = 50, R = 1, r = 0.5: elementary geometry
    assert measure(frustum(50, 1.0, 0.5)).area_um2 == pytest.approx(235.631229697, rel=1e-11)
    assert measure(frustum(50, 0.5, 1.0)).area_um2 == pytest.approx(235.631229697, rel=1e-11)


def test_a_ball_and_stick_counts_the_cable_from_the_surface():
    measures = measure(ball_and_stick(8.0, 300.0, 2.0, points=7))
    assert measures.length_um == pytest.approx(300, rel=1e-14)
    assert measures.area_by_kind_um2 == pytest.approx({"soma": 4 * math.pi * 64, "basal": math.pi * 2 * 300}, rel=1e-14)
    assert measures.max_path_um == pytest.approx(308, rel=1e-14)
    assert measures.taper_by_kind == {"basal": 0}


def test_a_bush_by_hand():
    measures = measure(bush())
    assert measures.rows == 7
    assert measures.length_by_kind_um == pytest.approx({"axon": 20, "basal": 120})
    assert (measures.branch_points, measures.tips, measures.max_branch_order) == (1, 3, 1)
    assert measures.max_path_um == pytest.approx(95)
    assert measures.box_um == (45, 80, 0)
    trunk, short, long = 3 * math.hypot(40, 1), 1.5 * math.hypot(30, 0.5), 1.25 * math.hypot(50, 0.75)
    assert measures.area_by_kind_um2 == pytest.approx(
        {"soma": 100 * math.pi, "axon": 20 * math.pi, "basal": math.pi * (trunk + short + long)}
    )
    assert measures.taper_by_kind == pytest.approx({"axon": 0, "basal": (-1 - 0.5 - 0.75) / 120})
    assert measures.rall_ratio.median == pytest.approx(0.5**1.5 + 0.25**1.5)
    assert measures.rall_ratio.count == 1


def test_the_electrotonic_length_of_the_reference_cable():
    # L = l / sqrt(R_m d / (4 R_i)) for 1000 µm of 2 µm, 150 Ω cm, 20 000 Ω cm²: Rall 1959, Exp Neurol 1:491
    assert electrotonic_extent(cylinder(1000, 2.0), 150.0, 20_000.0) == pytest.approx(1.22474487139, rel=1e-11)
    # λ = 1 mm for d = 4 µm, 200 Ω cm, 20 000 Ω cm²: Koch 1999, Biophysics of Computation, ch 2 (from memory)
    assert electrotonic_extent(cylinder(1000, 4.0), 200.0, 20_000.0) == pytest.approx(1.0, rel=1e-12)


def test_the_electrotonic_length_of_a_frustum_is_the_integral_of_1_over_lambda():
    def inverse_length_constant(x):
        diameter_cm = 2 * (1.0 - 0.5 * x / 300) * 1e-4
        return 1e-4 / math.sqrt(20_000 * diameter_cm / (4 * 150))

    expected, _ = quad(inverse_length_constant, 0, 300, epsabs=0, epsrel=1e-12)
    assert electrotonic_extent(frustum(300, 1.0, 0.5)) == pytest.approx(expected, rel=1e-12)


def test_the_electrotonic_distance_counts_from_the_soma_wherever_the_root_is():
    tree = bush()
    for root in (4, 7):
        moved = tree.rerooted(root)
        distance = electrotonic_distance(moved, 150.0, 20_000.0)
        by_id = dict(zip(moved.ids.tolist(), distance.tolist(), strict=True))
        original = dict(zip(tree.ids.tolist(), electrotonic_distance(tree, 150.0, 20_000.0), strict=True))
        assert by_id == pytest.approx(original, abs=1e-14)


def test_the_three_halves_law_gives_a_ratio_of_one():
    for tree in (
        rall_tree(4.0, [100, 80, 60]),
        rall_tree(4.0, [100, 80, 60], share=0.3, points_per_branch=5),
    ):
        ratio = measure(tree).rall_ratio
        assert ratio.count == 3
        assert (ratio.lower, ratio.median, ratio.upper) == pytest.approx((1, 1, 1), rel=1e-14)
    # two daughters of the parent's own diameter: 2
    fork = CellTree.from_text("1 3 0 0 0 1 -1\n2 3 50 0 0 1 1\n3 3 90 9 0 1 2\n4 3 90 -9 0 1 2\n")
    assert measure(fork).rall_ratio.median == pytest.approx(2)


def naive_bins(tree, bin_um, pieces=4000):
    """Area and length by path distance, each frustum cut into many short ones."""
    areas, lengths = {}, {}
    shape = tree.shape
    for row in np.flatnonzero(shape.far > shape.near):
        start = tree.path_um[tree.parent[row]]
        cuts = shape.near[row] + (shape.far[row] - shape.near[row]) * np.linspace(0, 1, pieces + 1)
        length = np.diff(cuts) * tree.edge_length_um[row]
        radius = shape.radius_near_um[row] + (shape.radius_far_um[row] - shape.radius_near_um[row]) * (
            np.arange(pieces + 1) / pieces
        )
        middle = start + (cuts[1:] + cuts[:-1]) / 2 * tree.edge_length_um[row]
        area = np.pi * (radius[1:] + radius[:-1]) * np.hypot(length, np.diff(radius))
        for k, a, h in zip((middle // bin_um).astype(int), area, length, strict=True):
            areas[k], lengths[k] = areas.get(k, 0) + a, lengths.get(k, 0) + h
    areas[0] = areas.get(0, 0) + shape.sphere_area_um2.sum()
    return areas, lengths


def test_area_by_distance_cuts_where_the_limits_fall():
    tree = bush()
    areas, lengths = naive_bins(tree, 20.0)
    bins = area_by_distance(tree, 20.0)
    assert [b.from_um for b in bins] == [0, 20, 40, 60, 80]
    for k, part in enumerate(bins):
        assert part.to_um - part.from_um == 20
        assert part.area_um2 == pytest.approx(areas[k], rel=1e-3)
        assert part.length_um == pytest.approx(lengths[k], rel=1e-3)


def scalars(measures):
    """The numbers of a cell which must not depend on how it is written down."""
    whole = measures.as_dict()
    bins = {f"{b['from_um']:g} {k}": b[k] for b in whole["area_by_distance"] for k in ("area_um2", "length_um")}
    kept = ("length_um", "area_um2", "max_path_um", "electrotonic_extent", "branch_points", "tips")
    by_kind = {
        f"{name} {kind}": value
        for name in ("length_by_kind_um", "area_by_kind_um2", "taper_by_kind")
        for kind, value in whole[name].items()
    }
    return {name: whole[name] for name in (*kept, "max_branch_order")} | bins | by_kind


def split(tree, parts):
    """Every cable cut into `parts` equal pieces by rows on its straight line; soma edges stay whole."""
    ids, kinds, xyz, radius, parent, last = [], [], [], [], [], {}
    for row in range(len(tree)):
        up = int(tree.parent[row])
        cut = parts if up >= 0 and tree.kinds[up] != 1 else 1
        above = last.get(up, -1)
        for k in range(1, cut + 1):
            share = k / cut
            place = tree.xyz_um[row] if k == cut else tree.xyz_um[up] + share * (tree.xyz_um[row] - tree.xyz_um[up])
            size = (
                tree.radius_um[row]
                if k == cut
                else tree.radius_um[up] + share * (tree.radius_um[row] - tree.radius_um[up])
            )
            ids.append(len(ids) + 1)
            kinds.append(tree.kinds[row])
            xyz.append(place)
            radius.append(size)
            parent.append(above)
            above = len(ids) - 1
        last[row] = above
    return CellTree(ids, kinds, xyz, radius, parent)


def rotated(tree, seed):
    turn, _ = np.linalg.qr(np.random.default_rng(seed).normal(size=(3, 3)))
    return CellTree(tree.ids, tree.kinds, tree.xyz_um @ turn + np.array([10, -20, 30]), tree.radius_um, tree.parent)


def renumbered(tree):
    return CellTree(3 * tree.ids[::-1] + 7, tree.kinds, tree.xyz_um, tree.radius_um, tree.parent)


@pytest.mark.parametrize("cell", [bush(), neuron(11), random_arbor(2, 400)], ids=["bush", "neuron", "arbor"])
@pytest.mark.parametrize(
    "rewrite",
    [lambda t: rotated(t, 4), renumbered, lambda t: split(t, 3)],
    ids=["rotated", "renumbered", "split"],
)
def test_measures_do_not_depend_on_how_the_cell_is_written(cell, rewrite):
    assert scalars(measure(rewrite(cell))) == pytest.approx(scalars(measure(cell)), rel=1e-9, abs=1e-9)


def test_sizes_scale_as_they_must():
    tree = neuron(3)
    twice = CellTree(tree.ids, tree.kinds, 2 * tree.xyz_um, 2 * tree.radius_um, tree.parent)
    one, two = measure(tree), measure(twice)
    assert two.length_um == pytest.approx(2 * one.length_um)
    assert two.area_um2 == pytest.approx(4 * one.area_um2)
    assert two.electrotonic_extent == pytest.approx(math.sqrt(2) * one.electrotonic_extent)
    assert two.rall_ratio.median == pytest.approx(one.rall_ratio.median)


def test_rows_in_one_place_are_one_branch_point():
    text = "1 3 0 0 0 1 -1\n2 3 50 0 0 1 1\n3 3 50 0 0 0.8 2\n4 3 90 9 0 0.8 3\n5 3 90 -9 0 0.7 2\n"
    text += "6 3 90 -9 0 0.7 5\n"
    measures = measure(CellTree.from_text(text))
    assert (measures.branch_points, measures.tips) == (1, 2)


def test_measures_are_plain_data():
    text = json.dumps(measure(bush()).as_dict(), allow_nan=False)
    assert json.loads(text)["rall_ratio"]["count"] == 1
    with pytest.raises(ValueError, match="resistance_ohm_cm2"):
        measure(bush(), resistance_ohm_cm2=0.0)


def test_a_hundred_thousand_rows_are_measured_quickly():
    tree = random_arbor(1, 100_000)
    start = time.perf_counter()
    measure(tree)
    assert time.perf_counter() - start < 1.0  # about 0.1 s; the margin is for a loaded machine
