"""How fast the map is, as ratios within one run; the answer is checked before anything is timed.

    python tests/benchmarks/map_speed.py [CELL.swc] [--scaling]

Prints JSON. `map_s` is the best of five, from a new `CableModel` to certified variances (1e-6, two
conductance inputs): zones, mean state, refinement and its certificate, sweeps. `column_route_s` is the
generic way: per frequency one sparse LU (scipy) and one column of the impedance matrix per point; a sample
of columns is timed and scaled to all points. `floor_s` is one complex exponential per cylinder and frequency.
"""

from __future__ import annotations

import json
import resource
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

from cable import CableModel, Kernel, Membrane, SynapticInput
from cable.network.quadrature import integrate
from cable.noise.integral import analytic_strip, slowest_rate_per_ms
from morphology import CellTree, Zone
from morphology.growth import random_arbor

DEFAULT = Path(__file__).parent.parent / "data" / "ca1_pyramidal.swc"
TOLERANCE = 1e-6
SAMPLE = 40
MEMBRANE = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
INPUTS = (
    SynapticInput(
        name="excitation",
        where=Zone(kinds=("basal", "apical")),
        density_per_um=0.5,
        rate_Hz=1.0,
        conductance_nS=0.4,
        reversal_mV=0.0,
        kernel=Kernel.two_exponential(0.2, 2.0),
    ),
    SynapticInput(
        name="inhibition",
        where=Zone(),
        density_per_um2=0.02,
        rate_Hz=3.0,
        conductance_nS=0.6,
        reversal_mV=-75.0,
        kernel=Kernel.two_exponential(0.5, 6.0),
    ),
)


def best(run: Callable[[], object], times: int = 5) -> float:
    """Shortest of several runs, seconds."""
    found = []
    for _ in range(times):
        start = time.perf_counter()
        run()
        found.append(time.perf_counter() - start)
    return min(found)


def peak_MB() -> float:
    """Largest resident memory of this process so far; getrusage would also count the parent that started it."""
    status = Path("/proc/self/status")
    if status.exists():
        lines = status.read_text(encoding="ascii", errors="replace").splitlines()
        return next(int(line.split()[1]) for line in lines if line.startswith("VmHWM")) / 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def column_route(
    model: CableModel, nodes: np.ndarray, omega: np.ndarray, weights: np.ndarray
) -> tuple[np.ndarray, float, float]:
    """Variances (nodes, inputs) from sparse LU columns, and the seconds for the factors and for one column."""
    point = model.refined.point
    net, parent = point.network, point.network.parent[1:]
    n, pieces = len(net.parent), np.arange(len(parent))
    total, factor_s, column_s = np.zeros((len(nodes), len(point.sources))), 0.0, 0.0
    for w, weight in zip(omega, weights, strict=True):
        start = time.perf_counter()
        y = net.conductance_nS + 1j * w * net.capacitance_pF
        x = np.sqrt(net.resistance_GOhm * y)
        half = x / np.tanh(x / 2) / 2
        across, ground = (
            (half - x * np.tanh(x / 2) / 2) / net.resistance_GOhm,
            x * np.tanh(x / 2) / net.resistance_GOhm,
        )
        at_near, at_far = ground * (1 - 2 * net.lean) - net.tilt_nS, ground * (1 + 2 * net.lean) + net.tilt_nS
        node = net.node_conductance_nS + 1j * w * net.node_capacitance_pF
        rows = np.r_[np.arange(n), parent, pieces + 1, parent, pieces + 1]
        columns = np.r_[np.arange(n), parent, pieces + 1, pieces + 1, parent]
        lu = splu(
            csc_array(
                (np.r_[node, across + at_near, across + at_far, -across, -across], (rows, columns)),
                shape=(n, n),
            )
        )
        factor_s += time.perf_counter() - start
        start = time.perf_counter()
        unit = np.zeros((n, len(nodes)), dtype=complex)
        unit[nodes, np.arange(len(nodes))] = 1
        z = lu.solve(unit)
        near, far = z[parent], z[1:]
        a, b = x.real, x.imag if w else np.full(len(x), 1e-5)
        if w:
            size = np.abs(np.sinh(x)) ** 2
            own = (np.sinh(2 * a) / (4 * a) - np.sin(2 * b) / (4 * b)) / size
            cross = (np.cosh(a) * np.sin(b) / b - np.sinh(a) * np.cos(b) / a) / 2 / size
        else:
            own = (np.sinh(2 * a) / (4 * a) - 0.5) / np.sinh(a) ** 2
            cross = (np.cosh(a) - np.sinh(a) / a) / 2 / np.sinh(a) ** 2
        for k, source in enumerate(point.sources):
            q, m = source.piece_strength, source.piece_lean
            spectrum = np.einsum("e,ek->k", q * own * (1 - 3 * m), np.abs(near) ** 2)
            spectrum += np.einsum("e,ek->k", q * own * (1 + 3 * m), np.abs(far) ** 2)
            spectrum += np.einsum("e,ek->k", 2 * q * cross, (near * far.conj()).real)
            spectrum += source.node_strength @ np.abs(z) ** 2
            total[:, k] += weight * spectrum * source.alone(np.array([1j * w]))[0].real
        column_s += (time.perf_counter() - start) / len(nodes)
    return total, factor_s, column_s


def frequency_nodes(model: CableModel) -> tuple[np.ndarray, np.ndarray]:
    """The nodes and weights that the map uses, found again from its certificate's number of frequencies."""
    point = model.refined.point
    count = model.fluctuations(TOLERANCE).certificate.frequencies
    omega0 = slowest_rate_per_ms(point)
    shape = integrate(
        lambda w: np.ones((1, len(w))) / (1 + (w / omega0) ** 2),
        lambda v: v,
        omega0,
        TOLERANCE,
        1.0,
        analytic_strip(point, omega0),
    )
    step = float(np.arcsinh(shape.omega_per_ms[1] / omega0))
    u = step * np.arange(count)
    weights = omega0 * np.cosh(u) * step / np.pi
    weights[0] /= 2
    return omega0 * np.sinh(u), weights


def measure(tree: CellTree) -> dict[str, object]:
    """All figures for one cell."""
    model = CableModel(tree, MEMBRANE, INPUTS)
    field = model.fluctuations(TOLERANCE)
    omega, weights = frequency_nodes(model)
    rows = np.random.default_rng(0).choice(len(tree), min(SAMPLE, len(tree)), replace=False)
    nodes = model.refined.point.layout.row_node[rows]
    want, factor_s, column_s = column_route(model, nodes, omega, weights)
    got = np.stack([field.variance_by_input_mV2[one.name][rows] for one in INPUTS], axis=1)
    difference = float(np.abs(got / want - 1).max())
    if difference > 1e-8:
        raise SystemExit(f"the map and the column route differ by {difference:.1e}; no times are given")
    pieces = len(model.refined.point.layout.row)
    x = np.exp(1j * np.linspace(0, 1, pieces * 8)).reshape(pieces, 8)
    floor_s = best(lambda: np.exp(-x)) * len(omega) / 8
    refined_s = best(lambda: CableModel(tree, MEMBRANE, INPUTS).refined)
    sweeps_s = best(lambda: model.fluctuations(TOLERANCE))
    map_s = best(lambda: CableModel(tree, MEMBRANE, INPUTS).fluctuations(TOLERANCE))
    column_route_s = factor_s + column_s * len(tree)
    return {
        "points": len(tree),
        "pieces": pieces,
        "frequencies": len(omega),
        "inputs": len(INPUTS),
        "map_s": map_s,
        "column_route_s": column_route_s,
        "ratio": column_route_s / map_s,
        "max_relative_difference": difference,
        "floor_s": floor_s,
        "over_floor": map_s / floor_s,
        "spent": {
            "mean_state_and_refinement_s": refined_s,
            "sweeps_s": sweeps_s,
            "sweeps_over_floor": sweeps_s / floor_s,
        },
        "certificate": field.certificate.as_dict(),
        "peak_MB": peak_MB(),
        "note": f"column route: {len(rows)} columns timed per frequency, scaled to all points",
    }


def scaling() -> dict[str, object]:
    """Seconds and peak memory from 1,000 to 100,000 points, each in a process of its own, and the exponent."""
    found = []
    for points in (1_000, 10_000, 100_000):
        run = subprocess.run(
            [sys.executable, __file__, "--points", str(points)], capture_output=True, text=True, check=True
        )
        found.append(json.loads(run.stdout))
    seconds = [one["map_s"] for one in found]
    sizes = [one["points"] for one in found]
    return {"runs": found, "exponent": float(np.polyfit(np.log(sizes), np.log(seconds), 1)[0])}


def one_size(points: int) -> dict[str, float]:
    """Time and memory of the map of a random arbor."""
    tree = random_arbor(7, points)
    seconds = best(lambda: CableModel(tree, MEMBRANE, INPUTS).fluctuations(TOLERANCE), 3)
    return {
        "points": points,
        "map_s": seconds,
        "peak_MB": peak_MB(),
    }


def main(arguments: list[str]) -> None:
    if "--points" in arguments:
        print(json.dumps(one_size(int(arguments[-1]))))
        return
    files = [Path(a) for a in arguments if not a.startswith("--")]
    result = measure(CellTree.from_file(files[0] if files else DEFAULT))
    if "--scaling" in arguments:
        result["scaling"] = scaling()
    print(json.dumps(result, indent=2))


if __name__ == "__main__":
    main(sys.argv[1:])
