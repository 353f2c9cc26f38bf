"""A cell as a list of cylinders and spheres, and its inputs as filtered Poisson events.

A kernel is written by its poles: () is a delta, (tau,) an exponential, (rise, decay) two exponentials and
(a, a) an alpha function. Every kernel has unit area, so its Laplace transform is prod 1/(1 + s tau_i).
"""

import math
from dataclasses import dataclass


@dataclass(frozen=True)
class Cylinder:
    """One uniform cylinder from node `parent` to node `child`."""

    parent: int
    child: int
    length_um: float
    diameter_um: float
    Rm_ohm_cm2: float = 20000.0
    Ri_ohm_cm: float = 150.0
    Cm_uF_cm2: float = 1.0

    @property
    def area_um2(self) -> float:
        return math.pi * self.diameter_um * self.length_um

    @property
    def leak_nS(self) -> float:
        return 10.0 / self.Rm_ohm_cm2 * self.area_um2

    @property
    def capacitance_pF(self) -> float:
        return 0.01 * self.Cm_uF_cm2 * self.area_um2

    @property
    def axial_GOhm(self) -> float:
        return self.length_um * self.Ri_ohm_cm / (1e5 * math.pi / 4.0 * self.diameter_um**2)


@dataclass(frozen=True)
class Sphere:
    """Isopotential membrane lumped at a node."""

    node: int
    area_um2: float
    Rm_ohm_cm2: float = 20000.0
    Cm_uF_cm2: float = 1.0

    @property
    def leak_nS(self) -> float:
        return 10.0 / self.Rm_ohm_cm2 * self.area_um2

    @property
    def capacitance_pF(self) -> float:
        return 0.01 * self.Cm_uF_cm2 * self.area_um2


@dataclass(frozen=True)
class Cell:
    """Cylinders between nodes 0, 1, 2, ... and spheres at nodes; free ends are sealed."""

    cylinders: tuple[Cylinder, ...] = ()
    spheres: tuple[Sphere, ...] = ()

    @property
    def node_count(self) -> int:
        ends = [node for c in self.cylinders for node in (c.parent, c.child)]
        return 1 + max(ends + [s.node for s in self.spheres])


@dataclass(frozen=True)
class Input:
    """Independent Poisson synapses.

    rate_per_ms: events per ms of one synapse.
    event_area: charge of one event in fC or, with a reversal potential, time integral of its conductance in
    nS ms.
    poles_ms: the kernel, see above.
    density_per_um: synapses per um of each cylinder (one number a cylinder; () means none).
    number_at: pairs (node, number of synapses there).
    reversal_mV: None for a current; otherwise the reversal potential relative to rest.
    """

    rate_per_ms: float
    event_area: float
    poles_ms: tuple[float, ...]
    density_per_um: tuple[float, ...] = ()
    number_at: tuple[tuple[int, float], ...] = ()
    reversal_mV: float | None = None


def event_area(peak: float, poles_ms: tuple[float, ...]) -> float:
    """Time integral (peak's unit times ms) of a kernel whose maximum is `peak`."""
    if len(poles_ms) == 1:
        return peak * poles_ms[0]
    a, b = poles_ms
    if a == b:
        return peak * math.e * a
    t_peak = a * b / (b - a) * math.log(b / a)
    return peak * (b - a) / (math.exp(-t_peak / b) - math.exp(-t_peak / a))
