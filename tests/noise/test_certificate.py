"""The quadrature certificate is a true bound, and infinite derivative variances are named, not numbered."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from cable import CableModel, Kernel, Placed, SpikeTrain, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import MEMBRANE, arbor

MEMBRANE_PLAIN = replace(MEMBRANE, zones=())
KERNELS = {
    "jump": (Kernel.exponential(1.5), SpikeTrain.poisson()),
    "slow": (Kernel.two_exponential(3.0, 90.0), SpikeTrain.poisson()),
    "fast": (Kernel.alpha(0.1), SpikeTrain.poisson()),
    "ringing": (Kernel.expression("exp(-t/4)*(1 + 0.5*cos(2*t))"), SpikeTrain.poisson()),
    "gamma": (Kernel.exponential(2.0), SpikeTrain.gamma(4)),
    "dead time": (Kernel.exponential(2.0), SpikeTrain.dead_time(8.0)),
}


@pytest.mark.parametrize("name", KERNELS)
@pytest.mark.parametrize("tolerance", [1e-4, 1e-7])
def test_error_is_below_what_is_certified(name: str, tolerance: float) -> None:
    kernel, train = KERNELS[name]
    one = SynapticInput(
        name="a",
        where=Zone(kinds=("basal",)),
        density_per_um=0.4,
        rate_Hz=60.0,
        current_pA=2.0,
        kernel=kernel,
        spike_train=train,
    )
    cell = CableModel(arbor(3, 40), MEMBRANE, (one,))
    exact = cell.fluctuations(1e-12).variance_mV2
    rough = cell.fluctuations(tolerance)
    assert rough.certificate.quadrature_relative_error <= tolerance
    error = np.abs(rough.variance_mV2 / exact - 1).max()
    assert error <= rough.certificate.quadrature_relative_error
    assert error > 1e-15  # the rough rule is not the exact one in disguise


def test_a_point_synapse_whose_kernel_jumps_has_no_crossing_rate_at_its_site() -> None:
    """The voltage's derivative has infinite variance there (power 3 of 1/ω; derived), and a finite one elsewhere."""
    tree = CellTree.from_text("1 1 0 0 0 8 -1\n2 3 8 0 0 1 1\n3 3 100 0 0 1 2\n4 3 300 0 0 1 3\n")

    def crossings(kernel: Kernel, swc_id: int) -> tuple[np.ndarray, str]:
        one = SynapticInput(
            name="a", at=(Placed(Site("", swc_id=swc_id), 20.0),), rate_Hz=20.0, current_pA=4.0, kernel=kernel
        )
        field = CableModel(tree, MEMBRANE_PLAIN, (one,), threshold_mV=-66.0).fluctuations(1e-6)
        assert field.upcrossing_Hz is not None
        assert np.isfinite(field.sd_mV).all()
        return np.isnan(field.upcrossing_Hz), field.upcrossing_note

    undefined, note = crossings(Kernel.exponential(2.0), 3)
    assert undefined.tolist() == [False, False, True, False]
    assert "point synapses" in note
    assert not crossings(Kernel.alpha(2.0), 3)[0].any()
    undefined, note = crossings(Kernel.exponential(2.0), 1)  # on the soma's capacitance it is finite
    assert not undefined.any() and note == ""
