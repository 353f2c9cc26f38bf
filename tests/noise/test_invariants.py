"""What must not change the answer, and what must change it by a known factor."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Fluctuations, Kernel, Membrane, SynapticInput
from morphology import CellTree, Site, Zone
from morphology.growth import cylinder, rall_tree
from morphology.tree import breadth_first_order
from noise.cells import EXCITATION, INHIBITION, arbor, model
from tolerances import ALGEBRA, EXACT, IDENTITY, REFINED, ROUND_OFF


def by_id(fluctuations: Fluctuations, values: np.ndarray) -> np.ndarray:
    return values[np.argsort(fluctuations.model.tree.ids)]


def same(one: Fluctuations, other: Fluctuations, tolerance: float = EXACT) -> None:
    """Same mean, variance by input, and input resistance at every point of the same id."""
    for name in ("mean_mV", "sd_mV", "input_resistance_MOhm", "correlation_time_ms"):
        assert_allclose(
            by_id(one, getattr(one, name)), by_id(other, getattr(other, name)), rtol=tolerance, err_msg=name
        )
    for name, part in one.variance_by_input_mV2.items():
        assert_allclose(
            by_id(one, part),
            by_id(other, other.variance_by_input_mV2[name]),
            rtol=2 * tolerance,
            err_msg=name,
        )


@pytest.fixture(scope="module")
def tree() -> CellTree:
    return arbor(seed=4, points=180)


@pytest.fixture(scope="module")
def reference(tree: CellTree) -> Fluctuations:
    return model(tree).fluctuations()


def test_another_root(tree: CellTree, reference: Fluctuations) -> None:
    for row in (170, 60):
        same(reference, model(tree.rerooted(int(tree.ids[row]))).fluctuations())


def test_another_order_and_numbering(tree: CellTree, reference: Fluctuations) -> None:
    shuffled = np.random.default_rng(1).permutation(len(tree))
    place = np.argsort(shuffled)
    parent = np.where(tree.parent[shuffled] >= 0, place[tree.parent[shuffled]], -1)
    order = breadth_first_order(parent)
    rows, place = shuffled[order], np.argsort(order)
    parent = np.where(parent[order] >= 0, place[parent[order]], -1)
    moved = CellTree(tree.ids[rows], tree.kinds[rows], tree.xyz_um[rows], tree.radius_um[rows], parent)
    same(reference, model(moved).fluctuations())
    renumbered = replace(tree, ids=tree.ids * 7 + 1000)
    same(reference, model(renumbered).fluctuations(), tolerance=ROUND_OFF)


def test_moved_and_turned(tree: CellTree, reference: Fluctuations) -> None:
    turn, _ = np.linalg.qr(np.random.default_rng(2).normal(size=(3, 3)))
    same(reference, model(replace(tree, xyz_um=tree.xyz_um @ turn.T + [300.0, -40.0, 77.0])).fluctuations())


def split(tree: CellTree, times: int) -> CellTree:
    """The same cell with every edge between two neurite points cut into `times`."""
    ids, kinds, xyz, radius, parent, at = [], [], [], [], [], {}
    fresh = int(tree.ids.max()) + 1
    for row in range(len(tree)):
        above = int(tree.parent[row])
        last = at.get(above, -1)
        if above > 0:
            for k in range(1, times):
                share = k / times
                ids.append(fresh)
                fresh += 1
                kinds.append(tree.kinds[row])
                xyz.append(tree.xyz_um[above] + share * (tree.xyz_um[row] - tree.xyz_um[above]))
                radius.append(tree.radius_um[above] + share * (tree.radius_um[row] - tree.radius_um[above]))
                parent.append(last)
                last = len(ids) - 1
        ids.append(int(tree.ids[row]))
        kinds.append(tree.kinds[row])
        xyz.append(tree.xyz_um[row])
        radius.append(tree.radius_um[row])
        parent.append(last)
        at[row] = len(ids) - 1
    return CellTree(np.array(ids), np.array(kinds), np.array(xyz), np.array(radius), np.array(parent))


def compare_split(tree: CellTree, tolerance: float, *inputs: SynapticInput) -> None:
    whole, cut = model(tree, *inputs).fluctuations(), model(split(tree, 10), *inputs).fluctuations()
    rows = [cut.model.tree.index_of(int(i)) for i in tree.ids]
    for name in ("mean_mV", "sd_mV", "input_resistance_MOhm"):
        assert_allclose(getattr(cut, name)[rows], getattr(whole, name), rtol=tolerance, err_msg=name)


def test_straight_edges_split_in_ten() -> None:
    currents = [
        SynapticInput(name=n, where=w, density_per_um=0.4, rate_Hz=2.0, current_pA=p, kernel=Kernel.exponential(2.0))
        for n, w, p in (("a", Zone(kinds=("basal",)), 9.0), ("b", Zone(kinds=("apical",)), -4.0))
    ]
    compare_split(arbor(seed=5, points=90, untapered=True), IDENTITY, *currents)


def test_tapering_driven_edges_split_in_ten() -> None:
    compare_split(arbor(seed=5, points=90), REFINED)


def test_two_halves_of_an_input_are_the_input(tree: CellTree, reference: Fluctuations) -> None:
    halves = [replace(EXCITATION, name=f"half {k}", density_per_um=share * 0.4) for k, share in enumerate((0.3, 0.7))]
    both = model(tree, *halves, INHIBITION).fluctuations()
    assert_allclose(both.sd_mV, reference.sd_mV, rtol=EXACT)
    parts = both.variance_by_input_mV2
    assert_allclose(parts["half 0"] + parts["half 1"], reference.variance_by_input_mV2["excitation"], rtol=EXACT)
    assert_allclose(parts["half 0"] / parts["half 1"], 0.3 / 0.7, rtol=EXACT)


def test_parts_add_up(reference: Fluctuations) -> None:
    assert_allclose(sum(reference.variance_by_input_mV2.values()), reference.variance_mV2, rtol=ROUND_OFF)


def test_reciprocity(tree: CellTree) -> None:
    point = model(tree).refined.point
    response = point.network.at(np.array([0.0, 0.05, 2.0]))
    nodes = point.layout.row_node[[3, 77, 150]]
    columns = [response.column(int(node)) for node in nodes]
    for j in range(3):
        for k in range(3):
            assert_allclose(columns[j][nodes[k]], columns[k][nodes[j]], rtol=ALGEBRA)
        assert_allclose(columns[j][nodes[j]], response.input_impedance_GOhm()[nodes[j]], rtol=ALGEBRA)


def test_more_correlation_means_more_variance(tree: CellTree) -> None:
    sd = []
    for correlation in (0.0, 0.02, 0.5, 1.0):
        sd.append(model(tree, replace(EXCITATION, correlation=correlation), INHIBITION).fluctuations(1e-7).sd_mV)
    assert (np.diff(sd, axis=0) > 0).all()


@pytest.mark.parametrize("share", [0.5, 0.35])
def test_a_tree_by_the_three_halves_law_is_its_cylinder_seen_from_the_trunk(share: float) -> None:
    """Rall 1962, Ann NY Acad Sci 96:1071 (from memory): at every frequency, and for even input in variance too."""
    plain = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70.0)
    even = SynapticInput(
        name="e", where=Zone(), density_per_um2=0.1, rate_Hz=1.0, current_pA=10.0, kernel=Kernel.alpha(2.0)
    )
    lengths, diameter = (120.0, 90.0, 150.0), 2.4
    # electrotonic lengths add; a cylinder of the trunk's diameter has them at its own length constant
    whole = sum(length / (2 ** (-2 * k / 3)) ** 0.5 for k, length in enumerate(lengths))
    tree, stick = rall_tree(diameter, lengths, share), cylinder(whole, diameter)
    branched, straight = (CableModel(t, plain, (even,)) for t in (tree, stick))
    omega = np.array([0.0, 0.05, 0.5, 5.0])
    one, other = (m.refined.point.network.at(omega).input_impedance_GOhm()[0] for m in (branched, straight))
    assert_allclose(one, other, rtol=ALGEBRA)
    assert branched.fluctuations().variance_mV2[0] == pytest.approx(straight.fluctuations().variance_mV2[0], rel=EXACT)
    assert branched.fluctuations().variance_mV2[-1] > 1.01 * straight.fluctuations().variance_mV2[-1]


def test_scaling_laws(tree: CellTree) -> None:
    one = SynapticInput(
        name="i",
        where=Zone(),
        density_per_um=0.3,
        rate_Hz=2.0,
        current_pA=5.0,
        kernel=Kernel.exponential(2.0),
    )
    base = model(tree, one).fluctuations()
    rest = base.model.membrane.rest_mV
    faster = model(tree, replace(one, rate_Hz=6.0)).fluctuations()
    assert_allclose(faster.variance_mV2, 3 * base.variance_mV2, rtol=EXACT)
    assert_allclose(faster.mean_mV - rest, 3 * (base.mean_mV - rest), rtol=EXACT)
    larger = model(tree, replace(one, current_pA=-10.0)).fluctuations()
    assert_allclose(larger.variance_mV2, 4 * base.variance_mV2, rtol=EXACT)
    assert_allclose(larger.mean_mV - rest, -2 * (base.mean_mV - rest), rtol=EXACT)


def test_all_admittances_times_k() -> None:
    """Leak, capacitance and axial conductance times k: variance over k², time constants unchanged."""
    tree = arbor(seed=8, points=60)
    one = SynapticInput(
        name="i", where=Zone(), density_per_um=0.3, rate_Hz=2.0, current_pA=5.0, kernel=Kernel.alpha(2.0)
    )

    def at(k: float) -> Fluctuations:
        membrane = Membrane(
            axial_resistivity_ohm_cm=150 / k,
            capacitance_uF_cm2=k,
            resistance_ohm_cm2=20000 / k,
            rest_mV=-70.0,
        )
        return CableModel(tree, membrane, (one,)).fluctuations()

    assert_allclose(at(3.0).variance_mV2 * 9, at(1.0).variance_mV2, rtol=EXACT)
    assert_allclose(at(3.0).correlation_time_ms, at(1.0).correlation_time_ms, rtol=EXACT)


def test_even_area_density_makes_an_even_mean() -> None:
    tree = arbor(seed=9, points=120)
    plain = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70.0)
    even = SynapticInput(
        name="e",
        where=Zone(),
        density_per_um2=0.05,
        rate_Hz=1.0,
        conductance_nS=0.5,
        reversal_mV=0.0,
        kernel=Kernel.exponential(2.0),
    )
    tonic = 0.05 * 1e-3 * 0.5 * 2.0  # nS/µm²
    leak = 10 / 20000
    mean = CableModel(tree, plain, (even,)).fluctuations(1e-6).mean_mV
    assert_allclose(mean, -70 * leak / (leak + tonic), rtol=EXACT)


def test_a_site_is_the_same_as_a_point(tree: CellTree) -> None:
    row = 100
    named = model(
        tree,
        sites=(
            Site("point", swc_id=int(tree.ids[row])),
            Site("near it", swc_id=int(tree.ids[row]), fraction=1 - 1e-9),
        ),
    ).fluctuations()
    assert named.at("point").sd_mV == named.sd_mV[row]
    assert named.at("near it").sd_mV == pytest.approx(named.sd_mV[row], rel=1e-7)
    assert named.at("soma").mean_mV == named.mean_mV[0]


def test_no_input_no_noise(tree: CellTree) -> None:
    silent = model(tree, replace(EXCITATION, rate_Hz=0.0)).fluctuations()
    assert (silent.sd_mV == 0).all()
    assert_allclose(silent.mean_mV, -68.0)
    assert np.isnan(silent.correlation_time_ms).all()
