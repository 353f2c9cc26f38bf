"""The noise oracles of whole cells, one against another: worked examples, compartments, Laplace identity."""

import math

import numpy as np
import pytest

from . import compartments, infinite_cable, laplace_identity, shot_noise, worked, worked_distal
from . import worked_typed as typed
from .plain import Cell, Cylinder, Input, Sphere, event_area

P = infinite_cable.Cable()


def digits12(value, typed_value):
    """Equal to within the twelfth typed digit."""
    assert float(value) == pytest.approx(typed_value, rel=1e-11, abs=0.0)


TYPED_EXAMPLES = [(name, key) for name, values in typed.TYPED.items() for key in values]


@pytest.fixture(scope="module")
def examples():
    found = {name: getattr(worked, name)() for name in typed.TYPED if name != "distal_cable"}
    return found | {"distal_cable": worked_distal.distal_cable()}


@pytest.mark.parametrize(("name", "key"), TYPED_EXAMPLES)
def test_worked_examples(examples, name, key):
    # Derived, verified by two computations.
    assert set(examples[name]) == set(typed.TYPED[name])
    digits12(examples[name][key], typed.TYPED[name][key])


CELLS = {
    "uniform_cable": (typed.uniform_cable_cell, ["sd_0_mV", "sd_500_mV", "sd_1000_mV"]),
    "distal_cable": (typed.distal_cable_cell, ["sd_0_mV", "sd_500_mV", "sd_1000_mV"]),
    "ball_and_stick": (typed.ball_and_stick_cell, ["sd_soma_mV", "sd_mid_mV", "sd_tip_mV"]),
    "y_branch": (typed.y_branch_cell, ["sd_root_mV", "sd_branch_mV", "sd_tip_mV", "sd_tip_mV"]),
}


@pytest.mark.parametrize("name", CELLS)
def test_compartments_converge_to_the_worked_examples(examples, name):
    build, keys = CELLS[name]
    cell, source = build()
    nodes = list(range(cell.node_count))
    sds = [compartments.sd_at_nodes(cell, [source], nodes, n) for n in (8, 16, 32)]
    np.testing.assert_allclose(compartments.convergence_order(sds), 2.0, atol=0.1)
    exact = [float(examples[name][key]) for key in keys]
    np.testing.assert_allclose(compartments.richardson(sds), exact, rtol=2e-6)


@pytest.mark.parametrize("name", ["uniform_cable", "ball_and_stick", "y_branch"])
def test_laplace_identity_on_the_worked_examples(examples, name):
    build, keys = CELLS[name]
    cell, source = build()
    per_pF = source.density_per_um[0] / (cell.cylinders[0].capacitance_pF / cell.cylinders[0].length_um)
    nodes = list(range(cell.node_count))
    arguments = (cell, nodes, (2.0,), source.event_area, per_pF * source.rate_per_ms)
    covariance = laplace_identity.covariance_mV2(*arguments)
    exact = [float(examples[name][key]) for key in keys]
    np.testing.assert_allclose(np.sqrt(np.diag(covariance)), exact, rtol=1e-12)
    if name == "ball_and_stick":
        slope = laplace_identity.derivative_covariance_mV2_per_ms2(*arguments)
        rate = shot_noise.upcrossing_Hz(np.diag(covariance), np.diag(slope))
        digits12(rate[0], 37.3753365578)  # derived, verified by two computations


@pytest.mark.parametrize("poles", [(), (2.0,), (0.5, 5.0), (2.0, 2.0)])
def test_laplace_identity_agrees_with_compartments_on_a_ragged_tree(poles):
    per_pF = 0.4
    density = tuple(per_pF * c.capacitance_pF / c.length_um for c in typed.RAGGED.cylinders)
    spheres = tuple((s.node, per_pF * s.capacitance_pF) for s in typed.RAGGED.spheres)
    source = Input(0.002, 15.0, poles, density, spheres)
    runs = [compartments.mean_and_covariance(typed.RAGGED, [source], n)[1][0] for n in (6, 12, 24)]
    exact = laplace_identity.covariance_mV2(typed.RAGGED, list(range(5)), poles, 15.0, per_pF * 0.002)
    np.testing.assert_allclose(compartments.richardson(runs), exact, rtol=2e-6)


def test_equal_poles_are_the_limit_of_unequal_ones():
    def both(poles):
        arguments = (typed.RAGGED, [0, 2, 3], poles, 15.0, 1e-3)
        return [
            laplace_identity.covariance_mV2(*arguments),
            laplace_identity.derivative_covariance_mV2_per_ms2(*arguments),
        ]

    for equal, near in zip(both((2.0, 2.0)), both((2.0 - 1e-3, 2.0 + 1e-3)), strict=True):
        np.testing.assert_allclose(equal, near, rtol=3e-6)
    with pytest.raises(ValueError, match="infinite"):
        laplace_identity.derivative_covariance_mV2_per_ms2(typed.RAGGED, [0], (), 1.0, 1.0)


def test_compartments_reproduce_the_conductance_driven_sphere():
    # Effective-time-constant theory: Richardson 2004 Phys Rev E 69:051918 (from memory).
    example = worked.sphere_conductance()
    cell = Cell(spheres=(Sphere(0, 34636.0, 1000.0 / 0.045),))
    rates = float(example["excitation_per_ms"]), float(example["inhibition_per_ms"])
    inputs = [
        Input(rates[0], 1.2 * 2.728, (2.728,), number_at=((0, 1.0),), reversal_mV=80.0),
        Input(rates[1], 0.6 * 10.49, (10.49,), number_at=((0, 1.0),), reversal_mV=5.0),
    ]
    mean, covariance = compartments.mean_and_covariance(cell, inputs, 1)
    digits12(mean[0] - 80.0, -65.2387799431)
    digits12(math.sqrt(covariance.sum()), 1.37066238059)


def test_compartments_with_uniform_conductance_obey_the_identity_of_the_active_cable():
    cell = Cell((Cylinder(0, 1, 400.0, 2.0), Cylinder(1, 2, 300.0, 0.9)))
    area_density = 0.05
    density = tuple(area_density * math.pi * c.diameter_um for c in cell.cylinders)
    source = Input(0.004, event_area(0.3, (0.4, 3.0)), (0.4, 3.0), density, reversal_mV=70.0)
    tonic = area_density * source.rate_per_ms * source.event_area
    leak = 10.0 / 20000.0
    uniform = 70.0 * tonic / (tonic + leak)
    runs = [compartments.mean_and_covariance(cell, [source], n) for n in (6, 12, 24)]
    np.testing.assert_allclose(runs[0][0], uniform, rtol=1e-11)
    active = Cell(
        tuple(Cylinder(c.parent, c.child, c.length_um, c.diameter_um, 10.0 / (leak + tonic)) for c in cell.cylinders)
    )
    charge = source.event_area * (70.0 - uniform)
    exact = laplace_identity.covariance_mV2(active, [0, 1, 2], (0.4, 3.0), charge, area_density * 0.004 / 0.01)
    np.testing.assert_allclose(compartments.richardson([r[1][0] for r in runs]), exact, rtol=2e-6)


def test_compartments_see_one_synapse_on_a_long_cable():
    # Derived, verified by two computations: one exponential synapse on the infinite cable, 0.0727667702786
    # mV2.
    variance = infinite_cable.point_variance_at_site_mV2(P, 0.1, 20.0, 2.0)
    digits12(variance, 0.0727667702786)
    half = 4.5 * P.lambda_um
    cell = Cell((Cylinder(0, 1, half, 2.0), Cylinder(0, 2, half, 2.0)))
    source = Input(0.1, 20.0, (2.0,), number_at=((0, 1.0),))
    runs = [compartments.mean_and_covariance(cell, [source], n)[1][0][0, 0] for n in (30, 60, 120)]
    assert compartments.richardson(runs) == pytest.approx(variance, rel=1e-3)
