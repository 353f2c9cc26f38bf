"""The worked example without a closed form: a cable with synapses on its distal half, by quadrature to 1e-18.

Derived, verified by two computations. `worked` has the others and the conventions.
"""

import mpmath as mp

from .worked import DIGITS, CableConstants


def distal_cable():
    """Cable of 2 x 1000 um, 1 synapse/um at 1 Hz from 500 to 1000 um, two exponentials (0.5, 5 ms), 20 fC.

    S_xz = n nu Q^2 |k|^2 int Z_xy Z_zy* dy, in closed form over the distal half and by quadrature over
    frequency.
    """
    with mp.workdps(DIGITS):
        cable, a, b = CableConstants(2), mp.mpf("0.5"), mp.mpf(5)
        L = 1000 / cable.length_constant_um
        H = L / 2
        n_rate, Q = mp.mpf("0.001"), mp.mpf(20)
        strength = n_rate * cable.length_constant_um * (Q * cable.R_inf) ** 2

        def product(p, q, u0, u1, f, g):
            """int cosh(p + f u) cosh(q + g u) du from u0 to u1 by the product formula."""
            total = mp.mpf(0)
            for sign in (1, -1):
                start, rate = p + sign * q, f + sign * g
                if rate == 0:
                    total += (u1 - u0) * mp.cosh(start) / 2
                else:
                    total += (mp.sinh(start + rate * u1) - mp.sinh(start + rate * u0)) / (2 * rate)
            return total

        def spectrum(omega, x, z):
            """Spectrum between two of the places 0, 1/2 and 1 of the length; sources lie beyond 1/2."""
            gamma = mp.sqrt(1 + 1j * omega * cable.tau_ms)
            kernel = 1 / ((1 + (omega * a) ** 2) * (1 + (omega * b) ** 2))
            factor, phase = mp.mpf(1), []
            for place, g in ((x, gamma), (z, mp.conj(gamma))):
                if place < 1:
                    factor *= mp.cosh(g * place * L)
                    phase.append((g * L, -g))
                else:
                    phase.append((mp.mpf(0), g))
            (p, f), (q, g) = phase
            scale = strength * kernel * factor / abs(gamma * mp.sinh(gamma * L)) ** 2
            return scale * product(p, q, H, L, f, g)

        def integral(x, z):
            """(1/pi) int_0^inf Re S d omega by the trapezoid in u, omega = (sinh u)/10, halved to settle.

            The integrand is even in omega, so this is the doubly infinite sum, which converges exponentially.
            """
            step, last = mp.mpf("0.1"), None
            while True:
                count = int(30 / step)
                total = mp.fsum(
                    mp.cosh(k * step) * mp.re(spectrum(mp.sinh(k * step) / 10, x, z)) * (2 if k else 1) / 2
                    for k in range(count)
                    if mp.sinh(k * step) < 10**6
                )
                value = total * step / 10 / mp.pi
                if last is not None and abs(value - last) < mp.mpf(10) ** -18:
                    return value
                step, last = step / 2, value

        def lagged(t):
            """E[V_0(s) V_1000(s + t)]; cut at 152 per ms, as the ends see e^(-sqrt omega)."""

            def integrand(omega):
                return mp.re(spectrum(omega, 0, 1) * mp.expj(-omega * t))

            ends = [mp.mpf(k) ** 2 / 10 for k in range(40)]
            with mp.workdps(18):
                return mp.quad(integrand, ends, maxdegree=5) / mp.pi

        half = mp.mpf("0.5")
        v0, vh, v1, c01 = integral(0, 0), integral(half, half), integral(1, 1), integral(0, 1)
        mean = n_rate * Q * cable.R_inf * cable.length_constant_um / mp.sinh(L)
        return {
            "mean_0_mV": mean * mp.sinh(H),
            "mean_1000_mV": mean * (mp.sinh(L) - mp.sinh(H)),
            "sd_0_mV": mp.sqrt(v0),
            "sd_500_mV": mp.sqrt(vh),
            "sd_1000_mV": mp.sqrt(v1),
            "correlation_0_1000": c01 / mp.sqrt(v0 * v1),
            "covariance_0_1000_plus_5ms_mV2": lagged(5),
            "covariance_0_1000_minus_5ms_mV2": lagged(-5),
        }
