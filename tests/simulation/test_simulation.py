"""Simulations beside theory: seeded, with bounds that a factor of 2 in a variance or a wrong sign would break."""

from __future__ import annotations

import signal
import subprocess
import sys
import threading
import time
from contextlib import suppress
from dataclasses import replace
from os import getpid, kill
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from cable import CableModel, Electrode, Kernel, Placed, SpikeTrain, SynapticInput, simulate
from cable.simulation.simulation import TooShort, batch_times_ms
from morphology import CellTree, Site, Zone
from noise.cells import arbor
from simulation.simulated_cells import BALL_AND_STICK, EXCITATION, INHIBITION, PLAIN, SPHERE, TIP, stick

QUANTITIES = ("mean_mV", "sd_mV", "skewness", "correlation", "correlation_time_ms")
CURRENT = SynapticInput(
    name="a", where=Zone(), density_per_um2=0.08, rate_Hz=1.0, current_pA=10.0, kernel=Kernel.exponential(2.0)
)
FROZEN = {
    "sphere": CableModel(
        SPHERE, PLAIN, (replace(EXCITATION, where=Zone(), density_per_um=None, density_per_um2=0.05),)
    ),
    "ball and stick": stick(),
    "correlated, varying sizes": CableModel(
        BALL_AND_STICK, PLAIN, (replace(CURRENT, correlation=0.2, size_cv=0.5, current_pA=2.0),), (TIP,)
    ),
    "points that copy": CableModel(
        BALL_AND_STICK,
        PLAIN,
        (
            SynapticInput(
                name="p",
                at=(Placed(TIP, 5), Placed(Site("m", swc_id=3, fraction=0.5), 8)),
                rate_Hz=10.0,
                current_pA=5.0,
                kernel=Kernel.alpha(3.0),
                correlation=0.3,
            ),
        ),
        (TIP,),
    ),
    "dead time": CableModel(
        BALL_AND_STICK,
        PLAIN,
        (replace(CURRENT, rate_Hz=40.0, current_pA=2.0, spike_train=SpikeTrain.dead_time(15)),),
        (TIP,),
    ),
    "tree": CableModel(arbor(5, 25), PLAIN, (replace(EXCITATION, where=Zone()), INHIBITION)),
}


@pytest.mark.parametrize("name", FROZEN)
def test_frozen_driving_force_is_what_linear_theory_computes(name: str) -> None:
    found = simulate(FROZEN[name], 25.0, 12, frozen=True, runs=2, processes=1, dt_ms=0.2)
    z = [getattr(one, quantity).z for one in found.sites for quantity in QUANTITIES]
    known = [value for value in z if not np.isnan(value)]
    # batches are few, so tails are Student's; statistics of one simulation are correlated, hence no sum of squares
    assert max(map(abs, known)) < stats.t(found.batches - 1).isf(1e-4)
    sd = found.sites[-1].sd_mV
    assert sd.se < 0.08 * sd.value and len(known) >= 4 * len(found.sites) - 5
    assert abs(found.grid.error) < 0.03


def test_conductances_give_less_than_linear_theory_and_what_a_published_simulation_gave() -> None:
    """An in-vivo-like point cell: mean -65.252 ± 0.004 mV, SD 1.369 (full nonlinear Monte Carlo, typed in)."""
    membrane = replace(PLAIN, resistance_ohm_cm2=1000 / 0.045, rest_mV=-80.0)
    radius = (34636 / (4 * np.pi)) ** 0.5
    every = dict(where=Zone(), count=1000.0, spread="area")
    e = SynapticInput(
        name="e", rate_Hz=3.69623655914, conductance_nS=1.2, reversal_mV=0.0, kernel=Kernel.exponential(2.728), **every
    )
    i = SynapticInput(
        name="i",
        rate_Hz=9.10390848427,
        conductance_nS=0.6,
        reversal_mV=-75.0,
        kernel=Kernel.exponential(10.49),
        **every,
    )
    cell = CableModel(CellTree.from_text(f"1 1 0 0 0 {radius!r} -1\n"), membrane, (e, i))
    found = simulate(cell, 30.0, 3, runs=2, processes=1, dt_ms=0.2).at("soma")
    assert abs(found.mean_mV.value + 65.252) < 4 * np.hypot(found.mean_mV.se, 0.004)
    assert abs(found.sd_mV.value - 1.369) < 4 * np.hypot(found.sd_mV.se, 0.002)
    assert found.sd_mV.se < 0.02


def test_large_events_saturate() -> None:
    """The same spikes with driving force frozen and in full: few strong synapses at a thin tip."""
    strong = SynapticInput(
        name="s", at=(Placed(TIP, 6),), rate_Hz=5.0, conductance_nS=4.0, reversal_mV=0.0, kernel=Kernel.alpha(1.0)
    )
    cell = CableModel(BALL_AND_STICK, PLAIN, (strong,), (TIP,))
    frozen, full = (
        simulate(cell, 10.0, 5, frozen=mode, runs=1, processes=1, dt_ms=0.1).at("tip") for mode in (True, False)
    )
    assert full.sd_mV.value < 0.85 * frozen.sd_mV.value and full.mean_mV.value < frozen.mean_mV.value
    assert full.skewness.value < frozen.skewness.value
    finer = simulate(cell, 10.0, 5, runs=1, processes=1, dt_ms=0.05).at("tip")
    assert abs(finer.sd_mV.value - full.sd_mV.value) < 4 * np.hypot(finer.sd_mV.se, full.sd_mV.se)


def test_results_depend_on_seed_and_runs_alone() -> None:
    model = stick()
    one, two, other = (
        simulate(model, 6.0, seed, runs=2, processes=processes, dt_ms=0.4)
        for seed, processes in ((1, 1), (1, 2), (2, 1))
    )
    assert np.array_equal(one.moments.powers, two.moments.powers) and one.sites == two.sites
    assert not np.array_equal(one.moments.powers, other.moments.powers)
    assert np.array_equal(one.trace_mV, two.trace_mV) and one.runs == 2


@pytest.mark.parametrize("processes", [1, 2])
def test_interruption_gives_what_there_is(processes: int) -> None:
    threading.Timer(2.5, lambda: kill(getpid(), signal.SIGINT)).start()
    start = time.perf_counter()
    found = simulate(stick(), 4000.0, 1, runs=2, processes=processes, dt_ms=0.4)
    assert found.interrupted and time.perf_counter() - start < 60
    assert 0 < found.seconds < found.asked_seconds
    assert found.at("tip").sd_mV.value == pytest.approx(found.at("tip").sd_mV.computed, rel=0.5)


def test_progress_and_traces() -> None:
    told: list[float] = []
    found = simulate(stick(), 6.0, 1, runs=1, dt_ms=0.4, trace_seconds=0.5, tell=told.append)
    assert told == sorted(told) and told[-1] == 1.0
    assert found.trace_mV.shape == (len(found.trace_ms), 2) and 400 < found.trace_ms[-1] < 700
    assert abs(found.trace_mV[:, 1].mean() - found.at("tip").mean_mV.computed) < 3 * found.at("tip").sd_mV.computed
    assert found.sd_points_mV.shape == (3,) and found.sd_points_mV[2] == pytest.approx(
        found.at("tip").sd_mV.value, rel=0.3
    )


def test_time_of_a_long_batch_is_the_correlation_time() -> None:
    model = stick()
    exact = [one.correlation_time_ms for one in model.fluctuations().sites]
    assert batch_times_ms(model, 1e5) == pytest.approx(exact, rel=1e-3)
    assert (batch_times_ms(model, 100.0) < exact).all()


def test_electrodes_are_left_out() -> None:
    model = replace(stick(), electrodes=(Electrode(site="soma", seal_GOhm=0.1),))
    found = simulate(model, 6.0, 1, runs=1, dt_ms=0.4)
    assert not found.model.electrodes
    assert found.at("soma").mean_mV.computed == stick().fluctuations().at("soma").mean_mV


def test_mistakes() -> None:
    model = stick()
    with pytest.raises(ValueError, match="seconds: expected a positive number"):
        simulate(model, 0.0, 1)
    with pytest.raises(ValueError, match="dt_ms: expected a positive number"):
        simulate(model, 1.0, 1, dt_ms=-1.0)
    with pytest.raises(ValueError, match="runs: expected at least 1"):
        simulate(model, 1.0, 1, runs=0)
    with pytest.raises(TooShort, match=r"seconds: found 0.5, expected at least \S+ for 8 independent batches"):
        simulate(model, 0.5, 1, dt_ms=0.4)
    with pytest.raises(TooShort, match="nothing fluctuates"):
        simulate(CableModel(SPHERE, PLAIN), 10.0, 1)
    with pytest.raises(ValueError, match="correlated gamma trains"):
        simulate(stick(replace(EXCITATION, correlation=0.1, spike_train=SpikeTrain.gamma(2))), 10.0, 1, dt_ms=0.4)


ORPHANS = """
import sys
import cable, morphology  # before the folders of the tests, which bear the same names
sys.path.insert(0, {tests!r})
from simulation.simulated_cells import stick
cable.simulate(stick(), 1e5, 1, runs=2, processes=2, dt_ms=0.4)
"""


@pytest.mark.skipif(not Path("/proc").is_dir(), reason="children are counted in /proc")
def test_a_killed_parent_leaves_no_process_behind(tmp_path: Path) -> None:
    script = tmp_path / "orphans.py"
    script.write_text(ORPHANS.format(tests=str(Path(__file__).parents[1])))

    def running() -> int:
        found = 0
        for entry in Path("/proc").glob("[0-9]*/cmdline"):
            with suppress(OSError):
                found += str(script).encode() in entry.read_bytes()
        return found

    with subprocess.Popen([sys.executable, str(script)]) as parent:
        for _ in range(200):
            if running() >= 3:
                break
            time.sleep(0.1)
        assert running() >= 3
        time.sleep(0.5)
        parent.kill()
    for _ in range(100):
        if running() == 0:
            break
        time.sleep(0.1)
    assert running() == 0
