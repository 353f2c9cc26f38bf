"""Populations that share spikes: correlations between the spike trains of different inputs.

Where input A shares a fraction f of its spikes with input B, every synapse of A has the correlation f with every
synapse of B: the cross-spectrum of two of their trains is f·√(S_A S_B), S the spectrum of one train. For Poisson
trains of rates a and b that is f·√(ab), the rate of simultaneous spikes, so f is their share of either train where
the rates are equal and the geometric mean of the two shares otherwise.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from cable.theory.synapse import SynapticInput

SHARED = "shared"  # the name of the part of a variance that no single input makes
ROUNDING = 1e-12


@dataclass(frozen=True)
class Shared:
    """The fraction of its spikes that a population shares with another one, named by `input`."""

    input: str
    fraction: float

    def __post_init__(self) -> None:
        if not 0.0 <= self.fraction <= 1.0:
            raise ValueError(f"fraction: expected 0 to 1, found {self.fraction!r}")


class SharingError(ValueError):
    """Shared spikes that cannot be; `index` and `entry` say which of whose `shares`, -1 for all of them."""

    def __init__(self, index: int, message: str, entry: int = -1) -> None:
        super().__init__(message)
        self.index, self.entry, self.message = index, entry, message


def correlations(inputs: Sequence[SynapticInput]) -> NDArray[np.float64]:
    """(n, n) correlations of spike trains: within a population on the diagonal, between populations beside it.

    A fraction stands for both populations; it may be given by either or by both alike.

    Raises:
        SharingError: an unknown name, two fractions that differ, spike trains of different kinds, more shared spikes
            than one train has, or correlations that no set of spike trains can have.
    """
    matrix = np.diag([one.correlation for one in inputs])
    names = [one.name for one in inputs]
    for k, one in enumerate(inputs):
        seen: set[str] = set()
        for entry, shared in enumerate(one.shares):
            other = _partner(names, k, shared.input, seen, entry)
            seen.add(shared.input)
            if matrix[k, other] not in (0.0, shared.fraction):
                raise SharingError(
                    k,
                    f"found fraction {shared.fraction:g} with {shared.input!r}, which says {matrix[k, other]:g} of the "
                    "same pair; expected one value; give it once",
                    entry,
                )
            _check_pair(inputs, k, other, shared.fraction, entry)
            matrix[k, other] = matrix[other, k] = shared.fraction
    if np.linalg.eigvalsh(matrix).min(initial=0.0) < -ROUNDING:
        sharing = [k for k, one in enumerate(inputs) if one.shares]
        raise SharingError(
            sharing[-1],
            "the fractions of all inputs together are impossible: the matrix of correlations has a negative "
            "eigenvalue, so some mixture of the inputs would have a negative variance; lower the fractions or raise "
            "the correlations within the inputs",
        )
    return matrix


def _partner(names: list[str], k: int, name: str, seen: set[str], entry: int) -> int:
    others = ", ".join(repr(n) for n in names if n != names[k]) or "none, there is no other input"
    if name == names[k]:
        raise SharingError(k, "an input shares spikes with itself by its correlation; name another input", entry)
    if name not in names:
        raise SharingError(k, f"found {name!r}, expected the name of another input: {others}; correct it", entry)
    if name in seen:
        raise SharingError(k, f"found {name!r} twice, expected each input once; keep one", entry)
    if SHARED in names:
        raise SharingError(
            k, f"an input is called {SHARED!r}, which names the variance made by shared spikes; rename it", entry
        )
    return names.index(name)


def _check_pair(inputs: Sequence[SynapticInput], k: int, other: int, fraction: float, entry: int) -> None:
    one, two = inputs[k], inputs[other]
    poisson = one.spike_train.process == two.spike_train.process == "poisson"
    if not poisson and (one.spike_train, one.rate_Hz) != (two.spike_train, two.rate_Hz):
        raise SharingError(
            k,
            f"found spike trains of {one.name!r} and {two.name!r} that differ, expected Poisson trains, or the same "
            "process and rate in both; change one",
            entry,
        )
    low, high = sorted((one.rate_Hz, two.rate_Hz))
    most = math.sqrt(low / high) if high > 0 else 1.0
    if fraction > most * (1 + ROUNDING):
        raise SharingError(
            k,
            f"found fraction {fraction:g} with {two.name!r}, expected at most {most:.4g} for rates of {low:g} and "
            f"{high:g} Hz: the slower trains have no more spikes to share; lower it",
            entry,
        )
    own, theirs = one.correlation, two.correlation
    if fraction**2 > own * theirs * (1 + ROUNDING) + ROUNDING:
        raise SharingError(
            k,
            f"found fraction {fraction:g} with {two.name!r} for correlations of {own:g} and {theirs:g} within the two "
            f"inputs, expected at most the root of their product, {math.sqrt(own * theirs):.4g}: trains that share "
            "spikes with the same trains share spikes with each other; lower it or raise correlation in both inputs",
            entry,
        )
