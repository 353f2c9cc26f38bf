"""The impedance oracles against published and closed-form values, and against one another.

Cable P of the tables below: 2 x 1000 um, Rm 20 000 ohm cm2, Ri 150 ohm cm, Cm 1 uF/cm2.
"""

import cmath
import math

import mpmath as mp
import numpy as np
import pytest

from . import cone, dense, finite_elements, infinite_cable, laplace_identity
from . import worked_typed as typed
from .plain import Cell, Cylinder

P = infinite_cable.Cable()


def digits12(value, typed_value):
    """Equal to within the twelfth typed digit."""
    assert float(value) == pytest.approx(typed_value, rel=1e-11, abs=0.0)


# Rall 1959 Exp Neurol 1:491; Rall & Rinzel 1973 Biophys J 13:648; Koch 1999 ch 2 (from memory): sealed
# cable P.
SEALED = [
    (0.0, 463.526791954, 0.0, 389.848400617, 0.540960099062),
    (1.0, 460.376310283, -5.09853657946, 388.324353108, 0.540329957387),
    (10.0, 316.000687814, -32.5606690592, 307.628923916, 0.486760122912),
    (100.0, 110.143604948, -42.6532131696, 109.800784277, 0.0818497428828),
    (1000.0, 34.7763463227, -44.7720323331, 34.7763461128, 0.000116959089703),
]


@pytest.mark.parametrize(("frequency", "sealed", "phase", "semi", "ratio"), SEALED)
def test_published_cable_impedance(frequency, sealed, phase, semi, ratio):
    one = Cell((Cylinder(0, 1, 1000.0, 2.0),))
    closed = infinite_cable.input_impedance_GOhm(P, frequency, 1000.0)
    digits12(1e3 * abs(closed), sealed)
    assert math.degrees(cmath.phase(closed)) == pytest.approx(phase, rel=1e-11, abs=1e-12)
    digits12(1e3 * abs(infinite_cable.input_impedance_GOhm(P, frequency, None)), semi)
    digits12(abs(infinite_cable.sealed_transfer_impedance_GOhm(P, frequency, 1000.0, 0.0, 1000.0) / closed), ratio)
    Z = dense.cell_impedance_GOhm(one, 2e-3j * math.pi * frequency)
    assert Z[0, 0] == pytest.approx(closed, rel=1e-12)
    digits12(abs(Z[1, 0] / Z[0, 0]), ratio)
    E = finite_elements.impedance_GOhm(one, frequency, n=400)
    assert E[0, 0] == pytest.approx(closed, rel=1e-8)
    assert abs(E[1, 0] / E[0, 0]) == pytest.approx(ratio, rel=1e-6)


def test_published_steady_state():
    # Rall 1959 Exp Neurol 1:491 (from memory); the Y tree: Rall & Rinzel 1973 Biophys J 13:648 (from memory).
    digits12(P.lambda_um, 816.496580928)
    digits12(P.R_inf_GOhm * 1e3, 389.848400617)
    digits12(1e3 * abs(infinite_cable.input_impedance_GOhm(P, 0.0, 1000.0, "killed")), 327.881317977)
    c = Cylinder(0, 1, 1000.0, 2.0)
    digits12(c.area_um2, 6283.18530718)
    digits12(c.axial_GOhm / 1000.0 * 1e3, 0.477464829276)
    tree, _ = typed.y_branch_cell()
    for Z in (dense.cell_impedance_GOhm(tree, 0.0).real, finite_elements.impedance_GOhm(tree, 0.0, 60).real):
        assert 1e3 * Z[0, 0] == pytest.approx(558.120083187, rel=1e-10)
        assert 1e3 * Z[2, 2] == pytest.approx(743.373777685, rel=1e-10)
        assert Z[2, 0] / Z[0, 0] == pytest.approx(0.659768073623, rel=1e-10)
        assert Z[0, 2] / Z[2, 2] == pytest.approx(0.495349477192, rel=1e-10)


def test_finite_elements_agree_with_dense_on_a_ragged_tree_and_converge():
    for frequency in (0.0, 30.0, 300.0):
        exact = dense.cell_impedance_GOhm(typed.RAGGED, 2e-3j * math.pi * frequency)
        np.testing.assert_allclose(finite_elements.impedance_GOhm(typed.RAGGED, frequency, 80), exact, rtol=1e-6)
    exact = dense.cell_impedance_GOhm(typed.RAGGED, 0.2j * math.pi)
    errors = [np.abs(finite_elements.impedance_GOhm(typed.RAGGED, 100.0, n) - exact).max() for n in (5, 10, 20)]
    np.testing.assert_allclose(np.log2(np.divide(errors[:-1], errors[1:])), 4.0, atol=0.3)


@pytest.mark.parametrize("frequency", [0.0, 20.0, 500.0])
@pytest.mark.parametrize(("near", "far"), [(4.0, 0.6), (0.6, 4.0), (2.0, 1.9)])
def test_cone_agrees_with_finite_elements(frequency, near, far):
    E = finite_elements.impedance_GOhm(Cell((Cylinder(0, 1, 400.0, near),)), frequency, 200, (far,))
    s = 2e-3j * math.pi * frequency
    Z = cone.frusta_impedance_GOhm([(0, 1, 400.0, near, far)], 20000.0, 150.0, 1.0, s)
    np.testing.assert_allclose(Z, E, rtol=1e-7)


def test_cone_limits():
    # A vanishing taper is a cylinder; a stubby frustum has Ri h/(pi r1 r2) = 47.7464829276 MOhm (geometry,
    # derived).
    plain = Cylinder(0, 1, 300.0, 1.0)
    self_nS, mutual_nS = dense.cylinder_two_port_mp(plain.axial_GOhm, plain.leak_nS)
    Y = cone.frustum_two_port_nS(300.0, 1.0, 1.0 + 1e-9, 20000.0, 150.0, 1.0, 0.0, digits=60)
    assert Y[0, 0] == pytest.approx(complex(self_nS), rel=1e-8)
    assert Y[0, 1] == pytest.approx(complex(mutual_nS), rel=1e-8)
    stub = cone.frustum_two_port_nS(50.0, 2.0, 1.0, 1e12, 150.0, 1.0, 0.0)
    assert -1e3 / stub[0, 1].real == pytest.approx(47.7464829276, rel=1e-8)
    # The lateral area 235.631229697 um2 shows as the total leak of a nearly isopotential frustum.
    assert stub.sum().real == pytest.approx(10.0 / 1e12 * 235.631229697, rel=1e-6)
    with pytest.raises(ValueError, match="two different diameters"):
        cone.frustum_two_port_nS(50.0, 2.0, 2.0, 2e4, 150.0, 1.0, 0.0)


@pytest.mark.parametrize("x", [mp.mpc("0.3", "0.2"), mp.mpc(2, 1.7), mp.mpc(30, 29)])
def test_cylinder_noise_quadrature_against_its_integral(x):
    # Elementary integrals of products of sinh; derived, verified by two computations.
    aa, bb, ab = dense.cylinder_noise_mp(x)
    ja, jb = dense.cylinder_coherent_mp(x)
    with mp.workdps(50):
        a, b = x.real, x.imag
        norm = (mp.cosh(2 * a) - mp.cos(2 * b)) / 2
        same = (mp.sinh(2 * a) / (4 * a) - mp.sin(2 * b) / (4 * b)) / norm
        cross = (mp.cosh(a) * mp.sin(b) / b - mp.sinh(a) * mp.cos(b) / a) / (2 * norm)
        coherent = mp.tanh(x / 2) / x
        for value, exact in ((aa, same), (bb, same), (ab, cross), (ja, coherent), (jb, coherent)):
            assert abs(value / exact - 1) < mp.mpf(10) ** -30


def test_a_lopsided_density_reaches_the_nearer_port():
    aa, bb, ab = dense.cylinder_noise_mp(mp.mpc(1, 0.8), lambda u: (1 - u) ** 2)
    assert aa > 5 * bb
    assert abs(mp.im(ab)) > 1e-3 * abs(mp.re(ab))


def test_dense_covariance_is_the_sum_over_sources():
    rng = np.random.default_rng(7)
    shunt = rng.uniform(1, 2, (1, 3)) + 1j * rng.uniform(0, 1, (1, 3))
    ports = np.array([[[[2 + 1j, -1 + 0.3j], [-1 + 0.3j, 2.5 + 1j]], [[1 + 1j, -0.7], [-0.7, 1.2]]]])
    J = rng.normal(size=(1, 2, 2)) + 1j * rng.normal(size=(1, 2, 2))
    noise = J[..., :, None] * np.conj(J[..., None, :])
    A, W = dense.nodal_matrices(shunt, [(0, 1), (1, 2)], ports, noise, [[0.0, 0.0, 4.0]])
    Z, covariance = dense.impedance_and_covariance(A, W)
    columns = [Z[0] @ [J[0, 0, 0], J[0, 0, 1], 0], Z[0] @ [0, J[0, 1, 0], J[0, 1, 1]], 2 * Z[0][:, 2]]
    np.testing.assert_allclose(covariance[0], sum(np.outer(v, v.conj()) for v in columns), rtol=1e-12)


@pytest.mark.parametrize("pieces", [1, 4000])
def test_laplace_columns_do_not_care_how_finely_a_cable_is_cut(pieces):
    # Rall 1959 Exp Neurol 1:491 (from memory): R_inf coth L.
    fine = Cell(tuple(Cylinder(k, k + 1, 1000.0 / pieces, 2.0) for k in range(pieces)))
    Z = laplace_identity.transfer_impedance_GOhm(fine, 0.0, [0])
    digits12(1e3 * Z[0, 0], 463.526791954)
    assert Z[-1, 0] / Z[0, 0] == pytest.approx(1 / math.cosh(1000.0 / P.lambda_um), rel=1e-12)
    slope = laplace_identity.impedance_slope_GOhm_ms(fine, 0.1, [0, pieces])
    L = mp.mpf(1000.0 / P.lambda_um)

    def closed(s):
        a = mp.sqrt(1 + 20 * s)
        return P.R_inf_GOhm * mp.coth(a * L) / a

    assert slope[0, 0] == pytest.approx(float(mp.diff(closed, 0.1)), rel=1e-9)


def test_laplace_columns_survive_very_long_cylinders():
    long = Cell((Cylinder(0, 1, 1e6, 2.0), Cylinder(1, 2, 1e-3, 2.0)))
    Z = laplace_identity.transfer_impedance_GOhm(long, 0.0, [0])
    digits12(1e3 * Z[0, 0], 389.848400617)  # Rall 1959 Exp Neurol 1:491 (from memory): semi-infinite
    slope = laplace_identity.impedance_slope_GOhm_ms(long, 0.0, [0])
    assert slope[0, 0] == pytest.approx(-P.R_inf_GOhm * 10.0, rel=1e-9)  # d/ds of R_inf/sqrt(1 + 20 s) at 0


def test_laplace_columns_agree_with_the_dense_matrix():
    for s in (0.0, 0.05, 2.0):
        exact = dense.cell_impedance_GOhm(typed.RAGGED, s).real
        Z = laplace_identity.transfer_impedance_GOhm(typed.RAGGED, s, [3, 0])
        np.testing.assert_allclose(Z, exact[:, [3, 0]], rtol=1e-12)
