"""Does a reconstructed cell under drive look like one: ranges from experiments, and bounds that no cell can leave."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from cable import CableModel, Kernel, Membrane, SynapticInput
from morphology import CellTree, Zone
from noise.cells import arbor

DATA = Path(__file__).parent.parent / "data"
NEURITES = Zone(kinds=("basal", "apical"))


def test_drive_as_in_vivo() -> None:
    """Input resistance about 5-fold lower, SD of some mV, beside almost no noise without most of the synapses.

    Numbers of synapses, conductances and rates as in the model of Destexhe & Paré 1999 (J Neurophysiol 81:1531;
    from memory); ranges from the same paper and from Destexhe, Rudolph & Paré 2003 (Nat Rev Neurosci 4:739;
    from memory): 3- to 5-fold, SD 2 to 6 mV.
    """
    membrane = Membrane(
        axial_resistivity_ohm_cm=250, capacitance_uF_cm2=1, resistance_ohm_cm2=1000 / 0.045, rest_mV=-80
    )
    tree = CellTree.from_file(DATA / "ca1_pyramidal.swc")

    def soma(activity: float):
        excitation = SynapticInput(
            name="excitation",
            where=NEURITES,
            count=16563,
            spread="area",
            rate_Hz=1.0 * activity,
            conductance_nS=1.2,
            reversal_mV=0.0,
            kernel=Kernel.exponential(2.7),
        )
        inhibition = SynapticInput(
            name="inhibition",
            where=Zone(kinds=("soma", "basal", "apical")),
            count=3376,
            spread="area",
            rate_Hz=5.5 * activity,
            conductance_nS=0.6,
            reversal_mV=-75.0,
            kernel=Kernel.exponential(10.5),
        )
        return CableModel(tree, membrane, (excitation, inhibition)).fluctuations(1e-6).at("soma")

    awake, slice_like = soma(1.0), soma(0.001)
    assert 3 < slice_like.input_resistance_MOhm / awake.input_resistance_MOhm < 6
    assert 2 < awake.sd_mV < 6
    assert slice_like.sd_mV < awake.sd_mV / 3
    assert -70 < awake.mean_mV < -50
    assert awake.correlation_time_ms < slice_like.correlation_time_ms / 3


@pytest.mark.parametrize("factor", [2.0, 5.0, 20.0])
def test_conductance_times_k_lowers_the_input_resistance_by_root_k_to_k(factor: float) -> None:
    """By k for an isopotential cell, by √k for an infinite cable, in between for a soma with dendrites (derived).

    A thin tip keeps the axial resistance between itself and the rest.
    """
    membrane = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
    leak = 10 / 20000  # nS/µm²
    even = SynapticInput(
        name="a",
        where=Zone(),
        density_per_um2=0.1,
        rate_Hz=(factor - 1) * leak / (0.1 * 1e-3 * 0.5 * 2.0),
        conductance_nS=0.5,
        reversal_mV=-70.0,
        kernel=Kernel.exponential(2.0),
    )
    for tree in (arbor(3, 80), CellTree.from_file(DATA / "granule.swc")):
        quiet, active = (CableModel(tree, membrane, inputs).fluctuations(1e-4) for inputs in ((), (even,)))
        drop = quiet.input_resistance_MOhm / active.input_resistance_MOhm
        assert np.sqrt(factor) < drop[0] < factor
        assert (drop > 1).all() and (drop < factor).all()
        assert drop.min() < 0.9 * drop[0]
        assert (active.sd_mV == 0).all()  # at its reversal potential a conductance drives no current
