"""Worked examples, each from its own closed form with mpmath to 25 digits; `worked_distal` has one more.

Common to all but the second: Rm 20 000 ohm cm2, Ri 150 ohm cm, Cm 1 uF/cm2, sealed ends, independent
Poisson current synapses. Where events fall in proportion to capacitance the covariance is (D/2)[Z(0) -
Z(1/tau_s)] with the analytic impedance (see `laplace_identity`). All values: derived, verified by two
computations. Each function returns a dict of mpf whose names carry place and unit; `worked_typed` has the
same cells as plain cylinders.
"""

import mpmath as mp

DIGITS = 30


class CableConstants:
    """Constants of a cylinder as mpf: lambda (um), tau (ms) and semi-infinite input resistance (GOhm)."""

    def __init__(self, diameter_um, Rm="20000", Ri="150", Cm="1"):
        d, Rm, Ri, Cm = (mp.mpf(v) for v in (diameter_um, Rm, Ri, Cm))
        self.length_constant_um = mp.sqrt(Rm * d * mp.mpf(10) ** 4 / (4 * Ri))
        self.tau_ms = Rm * Cm / 1000
        self.R_inf = self.length_constant_um * 4 * Ri / (mp.pi * d**2 * mp.mpf(10) ** 5)
        self.leak_per_um2 = 10 / Rm
        self.capacitance_per_um2 = Cm / 100


def sphere_current():
    """Sphere of 20 um, 1 event per ms in all, exponential 5 pA, tau_s 2 ms."""
    with mp.workdps(DIGITS):
        area = mp.pi * 20**2
        R, tau, tau_s, Q = 1 / (area * mp.mpf(10) / 20000), mp.mpf(20), mp.mpf(2), mp.mpf(10)
        A = Q * R / (tau - tau_s)

        def kappa(n):
            """Cumulant: A^n (e^(-t/tau) - e^(-t/tau_s))^n expanded and integrated term by term."""
            return A**n * mp.fsum((-1) ** k * mp.binomial(n, k) / ((n - k) / tau + k / tau_s) for k in range(n + 1))

        omega = 2 * mp.pi * 10 / 1000
        rho = (tau * mp.exp(-10 / tau) - tau_s * mp.exp(-10 / tau_s)) / (tau - tau_s)
        psd = 2 * (Q * R) ** 2 / ((1 + (omega * tau) ** 2) * (1 + (omega * tau_s) ** 2)) / 1000
        return {
            "mean_mV": Q * R,
            "sd_mV": mp.sqrt(kappa(2)),
            "skewness": kappa(3) / kappa(2) ** mp.mpf(1.5),
            "rho_10ms": rho,
            "psd_10Hz_mV2_per_Hz": psd,
        }


def sphere_conductance():
    """Point cell of 34 636 um2 with Poisson exponential conductances, linearised about its mean state.

    Leak 0.045 mS/cm2 at -80 mV; excitation 12.1 nS on average, 1.2 nS events, 2.728 ms, 0 mV; inhibition
    57.3 nS, 0.6 nS, 10.49 ms, -75 mV (values of Destexhe, Rudolph, Fellous & Sejnowski 2001 Neuroscience
    107:13, from memory).
    """
    with mp.workdps(DIGITS):
        area, leak_reversal = mp.mpf(34636), mp.mpf(-80)
        leak, C = area * mp.mpf("0.045") / 100, area / 100
        sets = [
            tuple(mp.mpf(v) for v in ("12.1", "1.2", "2.728", "0")),
            tuple(mp.mpf(v) for v in ("57.3", "0.6", "10.49", "-75")),
        ]
        total = leak + mp.fsum(g for g, *_ in sets)
        mean = (leak * leak_reversal + mp.fsum(g * E for g, _, _, E in sets)) / total
        tau = C / total
        variance = shift = mp.mpf(0)
        for g, jump, tau_s, E in sets:
            noise = g * jump / 2
            variance += noise * ((E - mean) / total) ** 2 * tau_s / (tau_s + tau)
            shift -= noise * (E - mean) * tau_s / ((tau_s + tau) * total**2)
        return {
            "mean_mV": mean,
            "sd_mV": mp.sqrt(variance),
            "tau_eff_ms": tau,
            "second_order_shift_mV": shift,
            "excitation_per_ms": sets[0][0] / (sets[0][1] * sets[0][2]),
            "inhibition_per_ms": sets[1][0] / (sets[1][1] * sets[1][2]),
        }


def uniform_cable():
    """Cable of 2 x 1000 um, 0.5 synapses/um at 1 Hz, exponential 10 pA, tau_s 2 ms."""
    with mp.workdps(DIGITS):
        cable, length, tau_s = CableConstants(2), mp.mpf(1000), mp.mpf(2)
        L = length / cable.length_constant_um
        D = mp.mpf("0.0005") / (mp.pi * 2 * cable.capacitance_per_um2) * 20**2

        def Z(a, X, Y):
            low, high = min(X, Y), max(X, Y)
            return cable.R_inf * mp.cosh(a * low) * mp.cosh(a * (L - high)) / (a * mp.sinh(a * L))

        def covariance(x, y):
            X, Y = x / cable.length_constant_um, y / cable.length_constant_um
            return D / 2 * (Z(mp.mpf(1), X, Y) - Z(mp.sqrt(1 + cable.tau_ms / tau_s), X, Y))

        near, far = mp.mpf(0), length
        return {
            "mean_mV": mp.mpf("0.0005") * 20 / (mp.pi * 2 * cable.leak_per_um2),
            "sd_0_mV": mp.sqrt(covariance(near, near)),
            "sd_500_mV": mp.sqrt(covariance(length / 2, length / 2)),
            "sd_1000_mV": mp.sqrt(covariance(far, far)),
            "covariance_0_1000_mV2": covariance(near, far),
            "correlation_0_1000": covariance(near, far) / covariance(near, near),
        }


def ball_and_stick():
    """Sphere of 20 um with a cable of 2 x 1000 um, 0.08 synapses/um2 at 1 Hz, exponential 2 ms, 20 fC."""
    with mp.workdps(DIGITS):
        cable, length, tau_s, Q = CableConstants(2), mp.mpf(1000), mp.mpf(2), mp.mpf(20)
        L = length / cable.length_constant_um
        sphere = mp.pi * 20**2
        per_um2 = mp.mpf("0.00008")
        D = per_um2 / cable.capacitance_per_um2 * Q**2

        def Z(s):
            """Impedances soma, mid, tip and soma-tip at Laplace frequency s."""
            a = mp.sqrt(1 + s * cable.tau_ms)
            G = a / cable.R_inf
            soma = sphere * (cable.leak_per_um2 + s * cable.capacitance_per_um2)
            at_soma = 1 / (soma + G * mp.tanh(a * L))

            def along(X):
                seen = G * (soma + G * mp.tanh(a * X)) / (G + soma * mp.tanh(a * X))
                return 1 / (seen + G * mp.tanh(a * (L - X)))

            return {"soma": at_soma, "mid": along(L / 2), "tip": along(L), "pair": at_soma / mp.cosh(a * L)}

        slow, fast = Z(mp.mpf(0)), Z(1 / tau_s)
        cov = {place: D / 2 * (slow[place] - fast[place]) for place in slow}

        def psd(frequency_Hz, place):
            """One-sided, mV2/Hz: -(D/omega) |k|^2 Im Z, which has a limit at zero frequency."""
            omega = 2 * mp.pi * mp.mpf(frequency_Hz) / 1000
            return -2 * D / omega / (1 + (omega * tau_s) ** 2) * mp.im(Z(1j * omega)[place]) / 1000

        def soma_autocovariance(t):
            """Inverse Laplace transform of the causal half of the spectrum.

            (D/2)[(Z(0) - Z(s))/s - s tau_s^2 (Z(0) - Z(1/tau_s))]/(1 - s^2 tau_s^2): with its mirror image
            in s it is the spectrum, and it has no pole in the right half plane.
            """

            def half(s):
                drop = slow["soma"] - Z(s)["soma"]
                odd = s * tau_s**2 * (slow["soma"] - fast["soma"])
                return D / 2 * (drop / s - odd) / (1 - (s * tau_s) ** 2)

            return mp.invertlaplace(half, t, method="talbot", degree=40)

        Rm_area = 1 / cable.leak_per_um2
        # One train at rate nu drives every synapse: density^2 times rate, not density times rate.
        coherent = mp.mpf("0.001") * (mp.mpf("0.08") * Q * Rm_area) ** 2 / (2 * (cable.tau_ms + tau_s))
        common = mp.mpf("0.1")
        values = {
            "area_um2": sphere + mp.pi * 2 * length,
            "input_resistance_soma_MOhm": slow["soma"] * 1000,
            "mean_mV": per_um2 * Q / cable.leak_per_um2,
            "sd_soma_mV": mp.sqrt(cov["soma"]),
            "sd_mid_mV": mp.sqrt(cov["mid"]),
            "sd_tip_mV": mp.sqrt(cov["tip"]),
            "correlation_soma_tip": cov["pair"] / mp.sqrt(cov["soma"] * cov["tip"]),
            "rho_soma_5ms": soma_autocovariance(5) / cov["soma"],
            "rho_soma_20ms": soma_autocovariance(20) / cov["soma"],
            "coherent_variance_mV2": coherent,
            "sd_soma_correlated_mV": mp.sqrt((1 - common) * cov["soma"] + common * coherent),
        }
        for name, frequency in (("0", "1e-6"), ("1", 1), ("10", 10), ("100", 100)):
            values[f"psd_soma_{name}Hz_mV2_per_Hz"] = psd(frequency, "soma")
        for name in ("1", "10", "100"):
            values[f"psd_soma_tip_{name}Hz_mV2_per_Hz"] = psd(name, "pair")
        for place in ("soma", "tip"):
            ratio = fast[place] / (slow[place] - fast[place])
            values[f"upcrossing_{place}_Hz"] = 1000 / (2 * mp.pi * tau_s) * mp.sqrt(ratio)
        return values


def y_branch():
    """Y of a 400 um trunk and two daughters of 1.2 x 300 um (3/2 law), 0.1 synapses/um2 at 1 Hz, 2 ms, 20 fC.

    The symmetric part is the equivalent cylinder; the antisymmetric one is a daughter killed at the branch
    point.
    """
    with mp.workdps(DIGITS):
        trunk_diameter = (2 * mp.mpf("1.2") ** mp.mpf(1.5)) ** (mp.mpf(2) / 3)
        trunk, daughter, tau_s, Q = (
            CableConstants(trunk_diameter),
            CableConstants("1.2"),
            mp.mpf(2),
            mp.mpf(20),
        )
        Lp, Ld = 400 / trunk.length_constant_um, 300 / daughter.length_constant_um
        L = Lp + Ld
        D = mp.mpf("0.0001") / trunk.capacitance_per_um2 * Q**2

        def Z(s):
            a = mp.sqrt(1 + s * trunk.tau_ms)
            R, r = trunk.R_inf / a, daughter.R_inf / a
            even, odd = R * mp.coth(a * L), r * mp.tanh(a * Ld) / 2
            branch = R / (mp.tanh(a * Lp) + mp.tanh(a * Ld))
            return {
                "root": even,
                "branch": branch,
                "tip": even + odd,
                "tip_tip": even - odd,
                "root_tip": R / mp.sinh(a * L),
            }

        slow, fast = Z(mp.mpf(0)), Z(1 / tau_s)
        cov = {place: D / 2 * (slow[place] - fast[place]) for place in slow}
        return {
            "trunk_diameter_um": trunk_diameter,
            "input_resistance_root_MOhm": slow["root"] * 1000,
            "input_resistance_tip_MOhm": slow["tip"] * 1000,
            "transfer_resistance_root_tip_MOhm": slow["root_tip"] * 1000,
            "mean_mV": mp.mpf("0.0001") * Q / trunk.leak_per_um2,
            "sd_root_mV": mp.sqrt(cov["root"]),
            "sd_branch_mV": mp.sqrt(cov["branch"]),
            "sd_tip_mV": mp.sqrt(cov["tip"]),
            "correlation_root_tip": cov["root_tip"] / mp.sqrt(cov["root"] * cov["tip"]),
            "correlation_tip_tip": cov["tip_tip"] / cov["tip"],
        }
