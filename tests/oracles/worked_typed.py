"""The worked examples' values to 12 digits, and their cells as plain cylinders.

All: derived, verified by two computations (closed form or frequency quadrature, and eigenfunction series,
time-domain quadrature or finite volumes). Keys are those of the functions in `worked` and `worked_distal`.
"""

import math

from .plain import Cell, Cylinder, Input, Sphere, event_area

TYPED: dict[str, dict[str, float]] = {
    "sphere_current": {
        "mean_mV": 15.9154943092,
        "sd_mV": 2.39935104439,
        "skewness": 0.193031072455,
        "rho_10ms": 0.673174294459,
        "psd_10Hz_mV2_per_Hz": 0.193371016129,
    },
    "sphere_conductance": {
        "mean_mV": -65.2387799431,
        "sd_mV": 1.37066238059,
        "tau_eff_ms": 4.07548519642,
        "second_order_shift_mV": -0.00956266032347,
        "excitation_per_ms": 3.69623655914,
        "inhibition_per_ms": 9.10390848427,
    },
    "uniform_cable": {
        "mean_mV": 3.18309886184,
        "sd_0_mV": 0.741982656795,
        "sd_500_mV": 0.686722585262,
        "sd_1000_mV": 0.741982656795,
        "covariance_0_1000_mV2": 0.392637555232,
        "correlation_0_1000": 0.713188495026,
    },
    "distal_cable": {
        "mean_0_mV": 2.66717827415,
        "mean_1000_mV": 3.69901944953,
        "sd_0_mV": 0.524479935894,
        "sd_500_mV": 0.639824773561,
        "sd_1000_mV": 0.798159338449,
        "correlation_0_1000": 0.866379924789,
        "covariance_0_1000_plus_5ms_mV2": 0.295689184648,
        "covariance_0_1000_minus_5ms_mV2": 0.393038591831,
    },
    "ball_and_stick": {
        "area_um2": 7539.82236862,
        "input_resistance_soma_MOhm": 358.977342903,
        "mean_mV": 3.2,
        "sd_soma_mV": 0.685974913407,
        "sd_mid_mV": 0.637080987142,
        "sd_tip_mV": 0.710358491895,
        "correlation_soma_tip": 0.630294846558,
        "rho_soma_5ms": 0.778135918011,
        "rho_soma_20ms": 0.336417328441,
        "coherent_variance_mV2": 232.727272727,
        "sd_soma_correlated_mV": 4.86787763778,
        "psd_soma_0Hz_mV2_per_Hz": 0.0357386935455,
        "psd_soma_1Hz_mV2_per_Hz": 0.035204475923,
        "psd_soma_10Hz_mV2_per_Hz": 0.0146399174194,
        "psd_soma_100Hz_mV2_per_Hz": 0.000221291836504,
        "psd_soma_tip_1Hz_mV2_per_Hz": 0.0316033455081,
        "psd_soma_tip_10Hz_mV2_per_Hz": 0.0112576542181,
        "psd_soma_tip_100Hz_mV2_per_Hz": -1.59998780199e-5,
        "upcrossing_soma_Hz": 37.3753365578,
        "upcrossing_tip_Hz": 48.5831397932,
    },
    "y_branch": {
        "trunk_diameter_um": 1.90488126236,
        "input_resistance_root_MOhm": 558.120083187,
        "input_resistance_tip_MOhm": 743.373777685,
        "transfer_resistance_root_tip_MOhm": 368.229812135,
        "mean_mV": 4.0,
        "sd_root_mV": 0.92873373518,
        "sd_branch_mV": 0.888629595374,
        "sd_tip_mV": 1.00049806381,
        "correlation_root_tip": 0.771183690591,
        "correlation_tip_tip": 0.72337557221,
    },
}

# Every worked cell is cut at the places where its values are given, so that those places are nodes.


def uniform_cable_cell() -> tuple[Cell, Input]:
    """Nodes 0, 1, 2 at 0, 500 and 1000 um."""
    cell = Cell((Cylinder(0, 1, 500.0, 2.0), Cylinder(1, 2, 500.0, 2.0)))
    return cell, Input(1e-3, event_area(10.0, (2.0,)), (2.0,), (0.5, 0.5))


def distal_cable_cell() -> tuple[Cell, Input]:
    """Nodes 0, 1, 2 at 0, 500 and 1000 um; synapses on the second half only."""
    cell = Cell((Cylinder(0, 1, 500.0, 2.0), Cylinder(1, 2, 500.0, 2.0)))
    return cell, Input(1e-3, 20.0, (0.5, 5.0), (0.0, 1.0))


def ball_and_stick_cell() -> tuple[Cell, Input]:
    """Nodes 0, 1, 2: soma, middle and tip of the dendrite."""
    area = math.pi * 20.0**2
    cell = Cell((Cylinder(0, 1, 500.0, 2.0), Cylinder(1, 2, 500.0, 2.0)), (Sphere(0, area),))
    density = 0.08 * math.pi * 2.0
    return cell, Input(1e-3, 20.0, (2.0,), (density, density), ((0, 0.08 * area),))


def y_branch_cell() -> tuple[Cell, Input]:
    """Nodes 0, 1, 2, 3: root, branch point and the two tips."""
    trunk = (2.0 * 1.2**1.5) ** (2.0 / 3.0)
    cell = Cell((Cylinder(0, 1, 400.0, trunk), Cylinder(1, 2, 300.0, 1.2), Cylinder(1, 3, 300.0, 1.2)))
    return cell, Input(1e-3, 20.0, (2.0,), tuple(0.1 * math.pi * c.diameter_um for c in cell.cylinders))


# Deliberately uneven: own Rm, Ri, Cm and diameter for every part, a sphere at the root and at a tip.
RAGGED = Cell(
    (
        Cylinder(0, 1, 120.0, 3.1, Rm_ohm_cm2=15000.0),
        Cylinder(1, 2, 310.0, 1.3, Rm_ohm_cm2=30000.0, Ri_ohm_cm=90.0),
        Cylinder(1, 3, 190.0, 0.8, Cm_uF_cm2=1.4),
        Cylinder(0, 4, 260.0, 1.7, Rm_ohm_cm2=9000.0),
    ),
    (Sphere(0, 700.0, 8000.0, 0.9), Sphere(3, 60.0)),
)
