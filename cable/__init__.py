"""Subthreshold voltage fluctuations in passive dendrites, from linear cable theory.

The public face is one page: `load_scenario` reads a scenario file into a `CableModel`; or make one from a
`morphology.CellTree`, a `Membrane` and `SynapticInput`s. `CableModel.fluctuations()` is the main answer.
"""

from __future__ import annotations

from collections.abc import Callable
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING

from cable.noise.certificate import Certificate
from cable.noise.fluctuations import Fluctuations, SiteFluctuations
from cable.noise.model import CableModel, ModelError
from cable.theory.electrode import Electrode
from cable.theory.filters import LowPass
from cable.theory.kernel import Kernel
from cable.theory.membrane import Membrane, MembraneZone
from cable.theory.sharing import Shared
from cable.theory.spiketrain import SpikeTrain
from cable.theory.synapse import Placed, SynapticInput
from cable.version import __version__

if TYPE_CHECKING:
    from cable.simulation.simulation import Simulation

__all__ = [
    "CableModel",
    "Certificate",
    "Electrode",
    "Fluctuations",
    "Kernel",
    "LowPass",
    "Membrane",
    "MembraneZone",
    "ModelError",
    "Placed",
    "Shared",
    "SiteFluctuations",
    "SpikeTrain",
    "SynapticInput",
    "__version__",
    "load_scenario",
    "simulate",
    "write_report",
]


def load_scenario(path: str | PathLike[str]) -> CableModel:
    """The model that a scenario file (TOML) describes.

    Raises:
        cable.desk.scenario.ScenarioError: the file is wrong; the error names file, key and remedy.
    """
    from cable.desk.scenario import load_scenario as load

    return load(path)


def simulate(
    model: CableModel,
    seconds: float,
    seed: int,
    frozen: bool = False,
    runs: int = 4,
    processes: int | None = None,
    dt_ms: float | None = None,
    trace_seconds: float = 1.0,
    tell: Callable[[float], None] = lambda share: None,
) -> Simulation:
    """A stochastic simulation of a model, without its electrodes, beside what is computed for it.

    Args:
        model: the model.
        seconds: simulated time, all runs together.
        seed: of the random numbers; the same seed and runs give the same answer, whatever the processes.
        frozen: whether synaptic currents keep the driving force of the mean state, as linear theory has it.
        runs: independent runs, fewer where each would be too short.
        processes: processes that work at once; as many as there are processors unless given.
        dt_ms: the time step; chosen from its computed error unless given.
        trace_seconds: how much of the first run's voltage is kept.
        tell: is called with the share that is done.

    Raises:
        ValueError: no positive time, a time too short for statistics, or correlated trains that cannot be simulated.
    """
    from cable.simulation.simulation import simulate as run

    return run(model, seconds, seed, frozen, runs, processes, dt_ms, trace_seconds, tell)


def write_report(model: CableModel, path: str | PathLike[str], *, force: bool = False, tolerance: float = 1e-9) -> Path:
    """Write one HTML file that shows a model: map, curves, table, certificate; it needs a browser and no network.

    Args:
        model: the model; its report has no scenario text, which belongs to the command `report`.
        path: the file, which ends in .html.
        force: replace an existing file.
        tolerance: relative error of each variance that the frequency integral is certified to.

    Returns:
        The file that was written, as an absolute path.

    Raises:
        cable.desk.messages.DeskError: the file cannot be written, or exists already.
        NotConverged: the tolerance cannot be reached.
    """
    from cable.desk.report.page import write_report as write

    return write(model, path, force=force, tolerance=tolerance)
