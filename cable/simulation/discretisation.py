"""How fine compartments and time steps must be, from the error that they make, computed and not guessed.

With driving forces frozen, compartments in discrete time are a linear network too. The step

  C·(3V' - 4V + V₋)/(2h) + G·V' = I'

(the second-order backward difference formula; Curtiss & Hirschfelder 1952, Proc Natl Acad Sci 38:235; from memory)
is the network at the complex frequency s(ω) = (3 - 4e^{-iωh} + e^{-2iωh})/(2h) instead of iω, and the sampled kernels
have transforms of their own. So the variance at a site follows from the same elimination as the exact one.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.network.elimination import eliminate, solve
from cable.network.plan import Plan, plan_elimination
from cable.noise.model import CableModel
from cable.noise.operating_point import OperatingPoint, operating_point
from cable.noise.population import couplings
from cable.simulation.compartments import Compartments, compartments
from cable.simulation.kernel_states import KernelStates

Floats = NDArray[np.float64]
GAUSS, PANEL, FALLEN = 8, 0.75, 1e-5  # points a panel, its width in u; what a spectrum may have left at the end
COARSEST, FINEST_MS = 0.5, 1e-4  # electrotonic length of a compartment at the fastest kernel rate; shortest step
ROUNDS, MOST = 14, 60_000  # of refinement; compartments


@dataclass(frozen=True, eq=False)
class Grid:
    """Compartments and time step with the errors they make in the SD at the sites, relative.

    Attributes:
        cells: the compartments.
        point: the operating point they were lumped from.
        dt_ms: the time step.
        space_error, time_error: (sites,) relative errors of the SD in the mode with frozen driving force.
    """

    cells: Compartments
    point: OperatingPoint
    dt_ms: float
    space_error: Floats
    time_error: Floats

    @property
    def error(self) -> float:
        """The largest error of either sort together."""
        return float(np.max(np.abs(self.space_error + self.time_error), initial=0.0))


def choose_grid(model: CableModel, wanted: float, dt_ms: float | None = None) -> Grid:
    """The coarsest grid of a doubling series whose errors of the SD at the sites are below `wanted`, relative.

    Args:
        model: the cell.
        wanted: largest relative error.
        dt_ms: a time step that was asked for; then only space is refined.
    """
    exact = model.fluctuations(1e-6)
    target = np.array([exact.at(name).variance_mV2 for name in model.site_names])
    coarse = model.refined.point
    segment, segments = coarse.layout.segment, coarse.layout.segments
    rates = [abs(p) for one in model.inputs for p in one.kernel.poles_per_ms]
    fastest = max(rates, default=coarse.network.slowest_rate_per_ms)
    network = coarse.network
    length = np.sqrt(network.resistance_GOhm * np.hypot(network.conductance_nS, fastest * network.capacitance_pF))
    whole = np.bincount(segment, length, segments)
    step = dt_ms or min(0.5 / fastest, 0.1)
    limit = COARSEST
    point, cells = _at(model, np.maximum(1, np.ceil(whole / limit)).astype(np.int64))
    for _ in range(ROUNDS):
        nodes = [point.layout.node_at(place) for place in model.site_places.values()]
        in_space = _relative(variances(cells, point, nodes, None), target)
        whole_error = _relative(variances(cells, point, nodes, step), target)
        grid = Grid(cells, point, step, in_space, whole_error - in_space)
        if grid.error <= wanted:
            return grid
        space, time = np.abs(grid.space_error).max(), np.abs(grid.time_error).max()
        finer = dt_ms is None and step / 2 >= FINEST_MS
        if (time >= space or len(cells.parent) > MOST) and finer:
            step /= 2
        elif len(cells.parent) <= MOST and space > 0.3 * wanted:
            limit /= 2
            point, cells = _at(model, np.maximum(1, np.ceil(whole / limit)).astype(np.int64))
        elif finer:
            step /= 2
        else:
            break
    return grid


def _at(model: CableModel, divide: NDArray[np.int64]) -> tuple[OperatingPoint, Compartments]:
    point = operating_point(model, divide)
    return point, compartments(point)


def _relative(variance: Floats, exact: Floats) -> Floats:
    """Relative error of the SD; 0 where nothing fluctuates."""
    return np.sqrt(np.divide(variance, exact, out=np.ones_like(exact), where=exact > 0)) - 1


def variances(cells: Compartments, point: OperatingPoint, nodes: list[int], dt_ms: float | None) -> Floats:
    """(sites,) variances at compartments `nodes` with frozen driving force, in time steps or (None) continuous time."""
    plan = plan_elimination(cells.parent)
    slow = point.network.slowest_rate_per_ms
    rates = [slow, *(abs(p) for one in point.model.inputs for p in one.kernel.poles_per_ms)]
    omega0 = min(rates)
    end = math.pi / dt_ms if dt_ms is not None else max(rates) * 1e6
    at, weight = np.polynomial.legendre.leggauss(GAUSS)
    panels = max(1, math.ceil(math.asinh(end / omega0) / PANEL))
    width = math.asinh(end / omega0) / panels
    total = np.zeros(len(nodes))
    for panel in range(panels):
        u = (panel + (at + 1) / 2) * width
        omega = omega0 * np.sinh(u)
        spectrum = _spectra(cells, plan, point, nodes, omega, dt_ms)
        part = spectrum @ (weight * width / 2 * omega0 * np.cosh(u)) / math.pi
        total += part
        if np.all(part <= FALLEN * 1e-2 * total):
            break
    return total


def _spectra(
    cells: Compartments, plan: Plan, point: OperatingPoint, nodes: list[int], omega: Floats, dt_ms: float | None
) -> Floats:
    if dt_ms is None:
        s = 1j * omega
    else:
        back = np.exp(-1j * omega * dt_ms)
        s = (3 - 4 * back + back**2) / (2 * dt_ms)
    shunt = cells.conductance_nS[:, None] + s * cells.capacitance_pF[:, None]
    coupling = np.broadcast_to(cells.axial_nS[:, None], (len(cells.axial_nS), len(omega))).astype(complex)
    factors = eliminate(plan, shunt, coupling)
    spectra = np.zeros((len(nodes), len(omega)))
    for i, node in enumerate(nodes):
        unit = np.zeros(shunt.shape, dtype=complex)
        unit[node] = 1.0
        z = solve(factors, unit)
        in_step = []
        for population in cells.populations:
            one, number = population.source, population.number
            kernel = (
                one.kernel.transform(omega)
                if dt_ms is None
                else KernelStates.of(one.kernel, dt_ms).transform(omega, dt_ms)
            )
            train = one.spike_train.spectrum_over_rate(omega, one.rate_Hz)
            force, rate, c = cells.force(one), one.rate_per_ms, one.correlation
            alone = rate * (number * force**2) @ np.abs(z) ** 2
            together = math.sqrt(rate) * kernel * ((number * force) @ z)
            spectra[i] += np.abs(kernel) ** 2 * alone * ((1 - c) * train + one.size_cv**2)
            spectra[i] += c * train * np.abs(together) ** 2
            in_step.append(together)
        for a, b, c in couplings(point.sources):
            one = cells.populations[a].source
            train = one.spike_train.spectrum_over_rate(omega, one.rate_Hz)
            spectra[i] += 2 * c * train * (in_step[a] * in_step[b].conj()).real
    return spectra
