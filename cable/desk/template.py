"""The example scenario that `start` writes: an invented cell in an invented, lively network."""

SEED = 7  # of the invented cell

SCENARIO = """\
# A scenario: one cell, its passive membrane, its synaptic input, and the places of interest.
# Lengths in µm, times in ms, voltages in mV. Every key carries its unit; change a value and run again.
title = "Heron, awake-like drive"

[cell]
morphology = "heron.swc"        # relative to this file
omit = ["axon"]                 # kinds left out of the electrical model
repairs = []                    # named repairs, as "cablenoise inspect" proposes them
shrinkage = { xy = 1.0, z = 1.0 }   # measured size times this = living size

[membrane]
axial_resistivity_ohm_cm = 150.0
capacitance_uF_cm2 = 1.0
resistance_ohm_cm2 = 20000.0
rest_mV = -72.0

[[membrane.zone]]               # other values in a part of the cell; later zones win
where = { kinds = ["apical"], path_um = [100, inf] }
spine_factor = 1.9              # membrane area per bare area

[[membrane.zone]]
where = { kinds = ["basal"], path_um = [40, inf] }
spine_factor = 1.7

[[input]]
name = "glutamate_basal"
where = { kinds = ["basal"], path_um = [30, inf] }
density_per_um = 1.0            # or density_per_um2, or count, or at = [{ swc_id = 7, number = 3 }]
rate_Hz = 0.8                   # of each synapse
conductance_nS = 0.25           # peak of one event
reversal_mV = 0.0
kernel = { rise_ms = 0.2, decay_ms = 2.0 }   # or { decay_ms }, { alpha_ms }, { expression = "t*exp(-t/2)" }
correlation = 0.003             # of the spike trains of any two synapses of this input
size_cv = 0.0                   # coefficient of variation of the size of its events
spike_train = { process = "poisson" }        # or { process = "gamma", order = 2 }, or { dead_time_ms = 3 }

[[input]]
name = "glutamate_apical"
where = { kinds = ["apical"], path_um = [60, inf] }
density_per_um = 1.2
rate_Hz = 0.7
conductance_nS = 0.2
reversal_mV = 0.0
kernel = { rise_ms = 0.3, decay_ms = 2.5 }
correlation = 0.003

# Instead of conductance_nS and reversal_mV an event may be a current: current_pA, or charge_fC (without a kernel the
# charge comes at once). Instead of a density, synapses may be listed one by one: synapses = "list.csv", a file with
# the column swc_id and, where wanted, fraction and number. Inputs may have spikes in common:
# shares = [{ input = "glutamate_basal", fraction = 0.001 }].

[[input]]
name = "GABA"                   # soma and proximal dendrites
where = { kinds = ["soma", "basal", "apical"], path_um = [0, 150] }
density_per_um2 = 0.02
rate_Hz = 3.0
conductance_nS = 0.7
reversal_mV = -75.0
kernel = { rise_ms = 0.5, decay_ms = 8.0 }

# The soma is always a site. A site is an SWC id, or one path distance with filters that leave one place.
[[site]]
name = "basal dendrite"
at = { swc_id = 211 }

[[site]]
name = "trunk"
at = { kinds = ["apical"], path_um = 250, radius_um = [1.2, inf] }

[[site]]
name = "tuft"
at = { swc_id = 1125, fraction = 0.5 }

# A pipette loads the cell and filters what is recorded; take the # away to have one at the soma, and ask `record`.
#[[electrode]]
#site = "soma"
#series_resistance_MOhm = 12.0
#pipette_capacitance_pF = 6.0
#filter = { family = "bessel", order = 4, corner_Hz = 2000 }

[threshold]
level_mV = -50.0
"""
