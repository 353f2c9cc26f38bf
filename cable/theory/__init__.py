"""One cylinder, one synapse, one spike train: closed forms that know no tree.

| symbol | name in code | meaning | unit |
|---|---|---|---|
| R | resistance_GOhm | axial resistance of one cylinder | GΩ = 1/nS |
| Y(ω) = G + iωC | admittance_nS | membrane admittance of one whole cylinder | nS |
| x² = R·Y | x2 | squared propagation constant times length | 1 |
| c = csch(x)·x/R | coupling | admittance between the cylinder's two ends | nS |
| s = tanh(x/2)·x/R | shunt | admittance from each end to ground | nS |
| J_a, J_b | norton | noise currents that the cylinder injects at its ends | pA |
| ω | omega_per_ms | angular frequency | rad/ms |

Time dependence is e^{+iωt}. A cylinder is kept in its Π form (one coupling, two shunts), because joining
cylinders in Π form only ever adds and multiplies: nothing cancels, however short or long a cylinder is.
Spectra inside the program are two-sided per rad/ms: variance = (1/π)∫₀^∞ S dω. Spectra that are shown to
a person are one-sided, in mV²/Hz.
"""
