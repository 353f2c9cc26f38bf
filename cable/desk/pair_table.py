"""A pair of sites as a table, a document and sentences."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import shown
from cable.desk.tables import Table

if TYPE_CHECKING:
    from cable.noise.beyond.next_pair import NextPair
    from cable.noise.model import CableModel
    from cable.noise.pairs import Pair

LAGS, FREQUENCIES = 401, 61
DEFAULT_TIME_CONSTANTS = 5.0
FREQUENCY_RANGE_HZ = 0.1, 1000.0


def study_pair(model: CableModel, a: str, b: str, lag_ms: float | None, tolerance: float) -> Pair:
    """The pair at lags of both signs up to `lag_ms` (5 membrane time constants where None), lag 0 among them."""
    largest = lag_ms or DEFAULT_TIME_CONSTANTS * model.membrane.time_constant_ms
    return model.pair(
        a, b, np.linspace(-largest, largest, LAGS), np.geomspace(*FREQUENCY_RANGE_HZ, FREQUENCIES), tolerance
    )


def pair_table(pair: Pair, after: NextPair | None = None) -> Table:
    """One row per lag: covariance in all, to the next order where it is given, and by input."""
    columns = {"lag_ms": pair.lag_ms, "covariance_mV2": pair.covariance_mV2}
    columns |= {"covariance_next_mV2": after.covariance_mV2} if after else {}
    columns |= {f"covariance_{name}_mV2": part for name, part in pair.covariance_by_input_mV2.items()}
    return Table(columns)


def pair_document(pair: Pair) -> dict[str, Any]:
    """All of a pair by key: covariances by lag, coherence and phase by frequency, and the certificate."""
    return {
        "sites": list(pair.sites),
        "correlation": pair.correlation,
        "peak_lag_ms": pair.peak_lag_ms,
        **pair_table(pair).columns,
        "frequency_Hz": pair.frequency_Hz,
        "coherence": pair.coherence,
        "phase_rad": pair.phase_rad,
        "certificate": {"covariance_relative_error": pair.covariances.relative_error},
    }


def pair_sentences(pair: Pair) -> list[str]:
    """What a person wants to know of two electrodes first."""
    a, b = (shown(name, 60) for name in pair.sites)
    half = pair.frequency_Hz[pair.coherence >= 0.5]
    lag = pair.peak_lag_ms
    order = (
        f"{b} follows {a} by {lag:.3g} ms"
        if lag > 0
        else f"{b} leads {a} by {-lag:.3g} ms"
        if lag < 0
        else "both move together"
    )
    reach = f"stays above one half up to {half[-1]:.3g} Hz" if half.size else "is below one half at every frequency"
    return [
        f"The correlation of {a} and {b} is {pair.correlation:.4f}; it is largest where {order}.",
        f"Their coherence {reach}.",
        f"Covariances are certified to {pair.covariances.relative_error:.0e} of the variances.",
    ]


def matrix_table(names: Sequence[str], matrix: NDArray[np.float64]) -> Table:
    """Correlations of all sites: one row and one column a site."""
    return Table({"site": list(names)} | {f"correlation_{name}": matrix[:, k] for k, name in enumerate(names)})
