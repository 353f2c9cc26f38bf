"""Subthreshold voltage fluctuations in passive dendrites, from linear cable theory.

The public face is one page: `load_scenario` reads a scenario file into a `CableModel`; or make one from a
`morphology.CellTree`, a `Membrane` and `SynapticInput`s. `CableModel.fluctuations()` is the main answer.
"""

from __future__ import annotations

from os import PathLike

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
]


def load_scenario(path: str | PathLike[str]) -> CableModel:
    """The model that a scenario file (TOML) describes.

    Raises:
        cable.desk.scenario.ScenarioError: the file is wrong; the error names file, key and remedy.
    """
    from cable.desk.scenario import load_scenario as load

    return load(path)
