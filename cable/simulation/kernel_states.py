"""A kernel as a linear system in discrete time: exact decay from step to step, whatever the step.

A term c·tᵖ·e^{-rt} is a chain of p + 1 states. An event counts from half a step before the step at whose end it is
first felt, which is where it lies on average; so sums over steps are midpoint sums, of second order also where the
kernel jumps at t = 0. They are scaled so that the area, and with it every mean, is exact.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import block_diag, expm

from cable.theory.kernel import Kernel

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class KernelStates:
    """x ← decay·x + start·(events of the step), kernel = read·x.

    Attributes:
        decay: (S, S) one step.
        start: (S,) what one event adds.
        read: (S,) the kernel's value, 1/ms for an impulse.
    """

    decay: Floats
    start: Floats
    read: Floats

    @classmethod
    def of(cls, kernel: Kernel, dt_ms: float) -> KernelStates:
        """The states of a kernel for a time step."""
        if kernel.is_impulse:
            return cls(np.zeros((1, 1)), np.ones(1), np.array([1 / dt_ms]))
        blocks, starts, reads = [], [], []
        for term in kernel.terms:
            rate, size, factor = complex(term.rate_per_ms), term.power + 1, complex(term.factor)
            if rate.imag < 0:
                continue  # its conjugate partner stands for both
            chain = np.diag(np.full(size, -rate)) + np.diag(np.ones(size - 1), -1)
            first = np.eye(size)[0]
            last = factor * math.factorial(term.power) * np.eye(size)[-1]
            if rate.imag == 0:
                blocks.append(chain.real)
                starts.append(first)
                reads.append(last.real)
            else:  # 2·Re of a complex chain
                blocks.append(np.block([[chain.real, -chain.imag], [chain.imag, chain.real]]))
                starts.append(np.r_[first, np.zeros(size)])
                reads.append(2 * np.r_[last.real, -last.imag])
        rates, start, read = block_diag(*blocks), np.concatenate(starts), np.concatenate(reads)
        decay, start = expm(rates * dt_ms), expm(rates * dt_ms / 2) @ start
        area = dt_ms * read @ np.linalg.solve(np.eye(len(start)) - decay, start)
        return cls(decay, start, read * (kernel.area_ms / area if area else 1.0))

    def transform(self, omega_per_ms: Floats, dt_ms: float) -> NDArray[np.complex128]:
        """(F,) transform of the sampled kernel at ω (F,), with respect to an event half a step before it is felt."""
        turn = np.exp(-1j * omega_per_ms * dt_ms)[:, None, None]
        states = np.linalg.solve(np.eye(len(self.start)) - turn * self.decay, self.start[:, None].astype(complex))
        return np.asarray(dt_ms * (states[..., 0] @ self.read))
