"""How many independent voltages a dendrite has: the leading modes of the covariance over the membrane.

The covariance P of the voltage at lag 0 is weighted by bare membrane area, D^½ P D^½, and its largest eigenvalues are
found by the Lanczos method (scipy's eigsh) from products with vectors alone: each is two solves per frequency,
O(points), and no points × points matrix is ever formed, unless about as many modes as points are wanted.

The participation number (Σλ)²/Σλ² needs the modes that are not computed too. Σλ is the area-weighted variance.
The rest of Σλ² is the expectation of |Mg|², with M the matrix without the computed modes and g a vector of random
signs (Hutchinson 1990, Commun Stat Simul Comput 19:433; from memory): a mean over `PROBES` such vectors, with its
standard error. It is told by g·Mg as well, whose expectation, the rest of Σλ, is known: regression on it takes
away most of the scatter.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.correlation import apply_spectra
from cable.noise.integral import block_for, integrate_spectra
from cable.noise.population import total_spectrum
from cable.noise.steepness import falls_as

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
PROBES = 24
FEW = 64  # nodes up to which all modes are found at once


@dataclass(frozen=True, eq=False)
class Modes:
    """The leading modes, the strongest first.

    Attributes:
        share: (K,) share of the area-weighted variance that each mode explains.
        pattern_mV: (K, N) SD pattern of each mode at the tree's points: the voltage there while the mode's own
            amplitude is at one SD; the sign is chosen so that the largest value is positive.
        participation: the participation number (Σλ)²/Σλ².
        participation_se: its standard error, of the random probes; 0 where all modes are computed.
        relative_error: certified bound of the frequency integral, of the variance at any point.
    """

    share: Floats
    pattern_mV: Floats
    participation: float
    participation_se: float
    relative_error: float


def modes(model: CableModel, count: int, seed: int, tolerance: float) -> Modes:
    """See `CableModel.modes`."""
    point = model.refined.point
    layout, size = point.layout, len(point.layout.parent)
    if not 1 <= count <= size:
        raise ValueError(f"count: expected 1 to {size} modes for this cell, found {count}")
    area = layout.sphere_area_um2.copy()
    half = 0.5 * layout.area_um2
    area[1:] += half
    np.add.at(area, layout.parent[1:], half)
    weight = area / area.sum()
    root_area = np.sqrt(weight)
    if not any(one.rate_Hz > 0 for one in model.inputs):
        raise ValueError("nothing fluctuates in this cell, so it has no modes; give it an input with a rate")
    found = integrate_spectra(
        point,
        lambda seen, omega: total_spectrum(seen.sources, point.network.at(omega)),
        lambda variance: variance,
        tolerance,
        falls_as(point),
    )
    total = float(weight @ found.value)
    if not total > 0:
        raise ValueError("nothing fluctuates in this cell, so it has no modes; check the sizes of its inputs' events")
    omega, weights, seen = found.found.omega_per_ms, found.found.weights, found.seen.sources
    width = block_for(point)
    blocks = [(point.network.at(omega[k : k + width]), weights[k : k + width]) for k in range(0, len(omega), width)]
    rng = np.random.default_rng(seed)
    with ThreadPoolExecutor(2) as pool:

        def product(vector: Floats) -> Floats:
            weighted = root_area * np.asarray(vector).ravel()
            parts = pool.map(lambda b: apply_spectra(seen, b[0], weighted).real @ b[1], blocks)
            return root_area * np.sum(list(parts), axis=0)

        values, vectors = _leading(product, size, count, rng)
        rest, rest_se = _squares_left(product, values, vectors, total, rng)
    squares = float((values**2).sum()) + rest
    number = total**2 / squares
    values, vectors = values[:count], vectors[:, :count]
    pattern = (np.sqrt(np.maximum(values, 0.0)) * _per_root(vectors, root_area))[layout.row_node].T
    pattern *= np.where(pattern[np.arange(count), np.abs(pattern).argmax(axis=1)] < 0, -1.0, 1.0)[:, None]
    return Modes(values / total, pattern, number, number * rest_se / squares, found.relative_error)


def _leading(
    product: Callable[[Floats], Floats], size: int, count: int, rng: np.random.Generator
) -> tuple[Floats, Floats]:
    """(K,) largest eigenvalues, falling, and (size, K) their vectors: K = `count`, or `size` where all were found."""
    if size <= FEW or count >= size - 1:
        matrix = np.array([product(unit) for unit in np.eye(size)])
        values, vectors = np.linalg.eigh(0.5 * (matrix + matrix.T))
    else:
        from scipy.sparse.linalg import LinearOperator, eigsh

        operator = LinearOperator((size, size), matvec=product, dtype=float)
        values, vectors = eigsh(operator, k=count, which="LA", v0=rng.normal(size=size), tol=1e-12)
    order = np.argsort(values)[::-1]
    return values[order], vectors[:, order]


def _squares_left(
    product: Callable[[Floats], Floats], values: Floats, vectors: Floats, total: float, rng: np.random.Generator
) -> tuple[float, float]:
    """Sum of the squares of the eigenvalues that are not among `values`, and its standard error."""
    size, count = vectors.shape
    left = max(total - float(values.sum()), 0.0)
    if count == size or left <= 1e-9 * total:
        return 0.0, 0.0

    def without(vector: Floats) -> Floats:
        return vector - vectors @ (vectors.T @ vector)

    squares, traces = np.empty(PROBES), np.empty(PROBES)
    for k in range(PROBES):
        signs = rng.choice([-1.0, 1.0], size=size)
        reply = without(product(without(signs)))
        squares[k], traces[k] = reply @ reply, signs @ reply
    spread = traces - traces.mean()
    slope = float(spread @ squares) / (float(spread @ spread) or np.inf)
    found = squares - slope * (traces - left)
    # none of the rest is stronger than the weakest mode, and they are weakest together where they are all alike
    bounded = np.clip(found.mean(), left**2 / (size - count), max(float(values[-1]), 0.0) * left)
    return float(bounded), float(found.std(ddof=2) / np.sqrt(PROBES))


def _per_root(vectors: Floats, root_area: Floats) -> Floats:
    """Vectors over the roots of the areas; 0 where a node has no membrane of its own."""
    return np.divide(vectors, root_area[:, None], out=np.zeros_like(vectors), where=root_area[:, None] > 0)
