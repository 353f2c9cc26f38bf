"""Good files from which hostile ones are made. All are our own inventions and small, so that many can be tried."""

from __future__ import annotations

import math

SCENARIO = """\
title = "small"

[cell]
morphology = "cell.swc"
omit = []
repairs = []
shrinkage = { xy = 1.0, z = 1.0 }

[membrane]
axial_resistivity_ohm_cm = 150.0
capacitance_uF_cm2 = 1.0
resistance_ohm_cm2 = 15000.0
rest_mV = -70.0
spine_factor = 1.0

[[membrane.zone]]
where = { path_um = [40, inf] }
spine_factor = 1.5

[[input]]
name = "excitation"
where = { kinds = ["basal", "apical"], path_um = [20, inf] }
density_per_um = 0.5
rate_Hz = 2.0
conductance_nS = 0.5
reversal_mV = 0.0
kernel = { rise_ms = 0.2, decay_ms = 2.0 }
correlation = 0.001
spike_train = { process = "poisson" }

[[input]]
name = "inhibition"
at = [{ swc_id = 3, fraction = 0.5 }, { swc_id = 1, number = 4 }]
rate_Hz = 3.0
conductance_nS = 0.6
reversal_mV = -75.0
kernel = { decay_ms = 6.0 }

[[site]]
name = "half way"
at = { swc_id = 3, fraction = 0.4 }

[threshold]
level_mV = -50.0
"""

LISTED = SCENARIO.replace("at = [{ swc_id = 3, fraction = 0.5 }, { swc_id = 1, number = 4 }]", 'synapses = "list.csv"')

LIST = "swc_id,fraction,number\r\n3,0.5,2\r\n4,1,1\r\n2,,3\r\n1,1,0.5\r\n6,0.25,\r\n"

EXPRESSIONS = (
    "t*exp(-t/2)",
    "exp(-t/5) - exp(-t/0.5)",
    "t**2*exp(-t/3) + 0.25*exp(-t/20)",
    "exp(-t/4)*cos(2*t)",
    "(1 - exp(-t/0.3))**3*exp(-t/8)",
    "exp(1 - t/2)*(t/2)",
    "exp(-t)*(1 + sin(pi*t/7))",
)


def forked() -> str:
    """A soma of one row, two dendrites, one of them forked, and an axon; unequal everywhere."""
    return """\
# an invented cell
1 1 0 0 0 8 -1
2 3 9 0 0 1 1
3 3 40 3 0 0.9 2
4 3 80 10 2 0.6 3
5 3 75 -12 1 0.5 3
6 4 2 30 0 1.2 1
7 4 2 90 4 0.7 6
8 2 0 -50 1 0.4 1
"""


def three_rows() -> str:
    """A soma in the three-row way, and neurites of a few rows."""
    return """\
1 1 0 0 0 6 -1
2 1 0 -6 0 6 1
3 1 0 6 0 6 1
4 3 8 1 0 1.1 1
5 3 30 2 0 0.8 4
6 4 -1 40 0 0.9 1
7 4 -2 95 5 0.5 6
"""


def outline() -> str:
    """A soma drawn as a ring, one neurite on it."""
    angle = [2 * math.pi * k / 9 for k in range(9)]
    rows = [f"{k + 1} 1 {7 * math.cos(a):.3f} {7 * math.sin(a):.3f} 0 0.2 {k or -1}" for k, a in enumerate(angle)]
    return "\n".join([*rows, "10 3 30 2 3 0.7 1", "11 3 60 2 3 0.6 10", "12 4 62 9 3 0.5 11", ""])


def backwards() -> str:
    """Numbers as other programs print them: floats for ids, a child before its parent, tabs, CR LF, no final end."""
    rows = ["7.0 3 60 2 3 0.7 5.0", "1.0 1 0 0 0 7.25e0 -1.0", "5.0 3 20.5 2 3 0.75 1.0", "3 4 0 33 0 0.07500000298 1"]
    return "\r\n".join(["# x y z", *(row.replace(" ", "\t") for row in rows)])


CELLS = {"forked": forked(), "three rows": three_rows(), "outline": outline(), "backwards": backwards()}
