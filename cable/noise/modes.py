"""How many independent voltages a dendrite has: the leading modes of the covariance over the membrane.

The covariance P of the voltage at lag 0 is weighted by membrane area, D^½ P D^½, and its largest eigenvalues are
found by the Lanczos method (scipy's eigsh) from products with vectors alone: each is two solves per frequency,
O(points), and no matrix is ever formed.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.correlation import apply_spectra
from cable.noise.integral import integrate_spectra
from cable.noise.operating_point import total_spectrum
from cable.noise.steepness import falls_as

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
BLOCK = 8


@dataclass(frozen=True, eq=False)
class Modes:
    """The leading modes, the strongest first.

    Attributes:
        share: (K,) share of the area-weighted variance that each mode explains.
        pattern_mV: (K, N) SD pattern of each mode at the tree's points: the voltage there while the mode's own
            amplitude is at one SD; the sign is chosen so that the largest value is positive.
        participation: the participation number (Σλ)²/Σλ², as lower and upper bound: the modes that are not
            computed can at most be as strong as the weakest that is.
        relative_error: certified bound of the frequency integral, of the variance at any point.
    """

    share: Floats
    pattern_mV: Floats
    participation: tuple[float, float]
    relative_error: float


def modes(model: CableModel, count: int, seed: int, tolerance: float) -> Modes:
    """See `CableModel.modes`."""
    from scipy.sparse.linalg import LinearOperator, eigsh

    point = model.refined.point
    size = len(point.layout.parent)
    if not 1 <= count < size:
        raise ValueError(f"count: expected 1 to {size - 1} modes for this cell, found {count}")
    if not model.inputs:
        raise ValueError("the model has no input, so nothing fluctuates")
    area = point.layout.sphere_area_um2.copy()
    half = 0.5 * point.layout.area_um2
    area[1:] += half
    np.add.at(area, point.layout.parent[1:], half)
    root_area = np.sqrt(area / area.sum())

    found = integrate_spectra(
        point,
        lambda omega: total_spectrum(point.sources, point.network.at(omega)),
        lambda variance: variance,
        tolerance,
        falls_as(point),
    )
    omega, weights = found.omega_per_ms, found.weights
    blocks = [(point.network.at(omega[k : k + BLOCK]), weights[k : k + BLOCK]) for k in range(0, len(omega), BLOCK)]
    with ThreadPoolExecutor(2) as pool:

        def product(vector: Floats) -> Floats:
            weighted = root_area * np.asarray(vector).ravel()
            parts = pool.map(lambda b: apply_spectra(point.sources, b[0], weighted).real @ b[1], blocks)
            return root_area * np.sum(list(parts), axis=0)

        operator = LinearOperator((size, size), matvec=product, dtype=float)
        start = np.random.default_rng(seed).normal(size=size)
        values, vectors = eigsh(operator, k=count, which="LA", v0=start, tol=1e-12)
    order = np.argsort(values)[::-1]
    values, vectors = values[order], vectors[:, order]
    total = float((area / area.sum()) @ found.value)
    rest = max(total - float(values.sum()), 0.0)
    squares = float((values**2).sum())
    rows = point.layout.row_node
    pattern = (np.sqrt(np.maximum(values, 0.0)) * vectors / root_area[:, None])[rows].T
    pattern *= np.sign(pattern[np.arange(count), np.abs(pattern).argmax(axis=1)])[:, None]
    bounds = total**2 / (squares + float(values[-1]) * rest), total**2 / squares
    return Modes(values / total, pattern, bounds, found.relative_error)
