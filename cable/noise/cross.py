"""Cross-spectra between a few nodes, at complex frequency: what two electrodes share.

For a real ω the cross-spectrum is S_ab = E[V_a V_b*]. Continued to complex frequency, the conjugate becomes
the value at -s, so S_ab(s) = Σ z_a(s) W(s) z_b(-s) with the network at s and at -s and the noise covariances
of `cable.theory.cylinder.noise_between`. It is analytic off the real s axis.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
from numpy.typing import NDArray

from cable.network.network import Columns
from cable.noise.operating_point import OperatingPoint
from cable.noise.population import Source, couplings
from cable.theory.cylinder import cylinder_form, noise_between
from cable.theory.units import OMEGA_PER_MS_PER_HZ

Complexes = NDArray[np.complex128]
BLOCK = 8  # frequencies handled at once


def cross_spectra(
    point: OperatingPoint, nodes: list[int], s_per_ms: NDArray[np.complexfloating], dead_times: bool = True
) -> Complexes:
    """(parts, nodes, nodes, F) cross-spectra S_ab at complex s (F,), 1/ms; two-sided per rad/ms, mV²·ms.

    The parts are those of `CableModel.part_names`. Without `dead_times` the first axis is that of `rows` instead, and
    trains that have a dead time count as Poisson trains.
    """
    s = np.asarray(s_per_ms, dtype=complex)
    own: NDArray[np.generic]
    cross: NDArray[np.generic]
    here = point.network.columns_at(s, nodes)
    if s.real.any():
        mirrored = point.network.columns_at(-s, nodes)
        own, cross = noise_between(here.x2, mirrored.x2)
    else:
        form = cylinder_form(here.x2)
        mirrored = Columns(here.x2.conj(), here.share.conj(), here.impedance_GOhm.conj())
        own, cross = form.noise_self, form.noise_cross
    parent = point.network.parent[1:]
    count, order = len(point.model.part_names), rows(point)
    result = np.zeros((len(order), len(nodes), len(nodes), len(s)), dtype=np.complex128)
    in_step = [(_in_step(source, here, parent), _in_step(source, mirrored, parent)) for source in point.sources]
    for k, source in enumerate(point.sources):
        correlation = source.population.correlation
        own_colour, common = source.alone(s, dead_times), correlation * source.common(source, s, dead_times)
        sizes = [] if dead_times else [row for row, found in enumerate(order) if found == (k, None)]
        strength = source.piece_strength[:, None]
        uneven = 3 * source.piece_lean[:, None]
        ends = own * (strength * (1 - uneven)), own * (strength * (1 + uneven)), cross * strength
        for i, z in enumerate(here.impedance_GOhm):
            near, far = z[parent], z[1:]
            # what one end of each piece hears of noise entering at either end, weighted once per row
            at_near, at_far = ends[0] * near + ends[2] * far, ends[1] * far + ends[2] * near
            lumped = source.node_strength[:, None] * z
            for j, other in enumerate(mirrored.impedance_GOhm):
                alone = (at_near * other[parent] + at_far * other[1:]).sum(axis=0) + (lumped * other).sum(axis=0)
                result[k, i, j] = own_colour * alone + common * in_step[k][0][i] * in_step[k][1][j]
                result[sizes, i, j] = source.sizes(s) * alone
    for row, (a, b, correlation) in enumerate(couplings(point.sources), start=len(point.sources)):
        for one, other in ((a, b), (b, a)):
            common = correlation * point.sources[one].common(point.sources[other], s, dead_times)
            result[row] += common * in_step[one][0][:, None] * in_step[other][1][None]
    if not dead_times:
        return result
    parts = np.zeros((count, *result.shape[1:]), dtype=np.complex128)
    np.add.at(parts, [part for part, _ in order], result)
    return parts


def rows(point: OperatingPoint) -> list[tuple[int, int | None]]:
    """What the parts are sums of, so that each has one spike train: (part, input whose trains count, None for none).

    These are the inputs, the pairs that share spikes, and the sizes of events of trains with a dead time.
    """
    inputs = point.model.inputs
    regular = [k for k, one in enumerate(inputs) if one.spike_train.dead_time_ms > 0 and one.size_cv > 0]
    shared = [(len(inputs), a) for a, _, _ in couplings(point.sources)]
    return [(k, k) for k in range(len(inputs))] + shared + [(k, None) for k in regular]


def by_frequency(point: OperatingPoint, nodes: list[int], frequency_Hz: NDArray[np.float64]) -> Complexes:
    """(parts, nodes, nodes, F) cross-spectra at real frequencies (F,), Hz; two-sided per rad/ms."""
    s = 1j * OMEGA_PER_MS_PER_HZ * np.asarray(frequency_Hz, dtype=float)
    if not len(s):
        return np.zeros((len(point.model.part_names), len(nodes), len(nodes), 0), dtype=np.complex128)
    with ThreadPoolExecutor(2) as pool:
        blocks = pool.map(lambda k: cross_spectra(point, nodes, s[k : k + BLOCK]), range(0, len(s), BLOCK))
        return np.concatenate(list(blocks), axis=-1)


def _in_step(source: Source, columns: Columns, parent: NDArray[np.int64]) -> Complexes:
    """(nodes, F) voltages where all synapses of a population act in step."""
    near = columns.share * (source.piece_amplitude - 2 * source.piece_moment)[:, None]
    far = columns.share * (source.piece_amplitude + 2 * source.piece_moment)[:, None]
    z = columns.impedance_GOhm
    return (near * z[:, parent] + far * z[:, 1:]).sum(axis=1) + (source.node_amplitude[:, None] * z).sum(axis=1)
