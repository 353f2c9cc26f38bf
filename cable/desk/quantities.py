"""The quantities that a figure can show, each with its words, its unit and its values."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import DeskError, choices, did_you_mean, quoted

if TYPE_CHECKING:
    from cable.desk.tables import Table
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.sources import Sources

Floats = NDArray[np.float64]
SOURCE_TOLERANCE = 1e-6  # for colours
LABELS = {
    "mean": "mean (mV)",
    "sd": "SD (mV)",
    "variance": "variance (mV²)",
    "correlation-time": "correlation time (ms)",
    "input-resistance": "input resistance (MΩ)",
    "share": "% of the variance",
    "correlation": "correlation",
    "lag": "lag (ms)",
    "source": "% of the variance per µm",
    "charge-share": "% of the charge",
}
WITH_SITE = ("correlation", "lag", "source", "charge-share")
COLUMNS = {
    "mean": "mean_mV",
    "sd": "sd_mV",
    "variance": "variance_mV2",
    "correlation-time": "correlation_time_ms",
    "input-resistance": "input_resistance_MOhm",
}


@dataclass(frozen=True)
class Quantity:
    """One quantity to show: its word on the command line, its label with the unit, its input for a share.

    `partner` is the site that a correlation or lag is with.
    """

    word: str
    label: str
    input: str | None = None
    partner: str | None = None

    def values(self, field: Fluctuations) -> Floats:
        """(N,) the quantity at every point."""
        if self.partner is not None:
            if self.word == "source":
                return _per_um(field.model.sources(self.partner, SOURCE_TOLERANCE))
            if self.word == "charge-share":
                return _charge_percent(field, self.partner)
            shared = field.model.correlation_map(self.partner)
            return shared.correlation if self.word == "correlation" else shared.lag_ms
        if self.input is None:
            return np.asarray(getattr(field, COLUMNS[self.word]), dtype=float)
        return _percent(field.variance_by_input_mV2[self.input], field.variance_mV2)

    def of_table(self, table: Table) -> Floats:
        """The quantity at every row of a site table."""
        if self.input is None:
            return np.asarray(table.columns[COLUMNS[self.word]], dtype=float)
        part = np.asarray(table.columns[f"variance_{self.input}_mV2"], dtype=float)
        return _percent(part, np.asarray(table.columns["variance_mV2"], dtype=float))


def with_site(word: str, site: str) -> Quantity:
    """The correlation or the lag of every point with a site, or what each point contributes to it."""
    label = {
        "correlation": f"correlation with {site}",
        "lag": f"lag behind {site} (ms)",
        "source": f"% of the variance at {site} per µm",
        "charge-share": f"% of the charge that the clamp at {site} sees",
    }[word]
    return Quantity(word, label, partner=site)


def quantities(word: str, inputs: Sequence[str], known_inputs: Sequence[str]) -> list[Quantity]:
    """The quantities that the options ask for: one, or one a named input for a share.

    Raises:
        DeskError: an unknown quantity or input, a share of no input, or an input beside another quantity.
    """
    if word not in LABELS:
        raise DeskError(f"--quantity: found {quoted(word)}, expected {choices(LABELS)}; {did_you_mean(word, LABELS)}")
    if word in WITH_SITE:
        raise DeskError(f"--quantity {word}: is drawn by the command map with --with SITE")
    if word != "share":
        if inputs:
            raise DeskError(f'--input: goes with --quantity share, found it with "{word}"; take it out')
        return [Quantity(word, LABELS[word])]
    if not inputs:
        raise DeskError(f"--quantity share: needs --input NAME; {_list(known_inputs)}")
    for name in inputs:
        if name not in known_inputs:
            raise DeskError(f"--input: there is no input {quoted(name)}; {_list(known_inputs)}")
    return [Quantity(word, f"{name}: {LABELS[word]}", name) for name in dict.fromkeys(inputs)]


def _per_um(sources: Sources) -> Floats:
    """(N,) % of the variance per µm of cylinder; for a spherical soma per µm of its diameter."""
    shape = sources.model.tree.shape
    length = np.where(shape.sphere_area_um2 > 0, np.sqrt(shape.sphere_area_um2 / np.pi), shape.length_um)
    return np.divide(100 * sources.variance_share, length, out=np.full(len(length), np.nan), where=length > 0)


def _charge_percent(field: Fluctuations, site: str) -> Floats:
    if not field.model.electrode_at(site).clamps:
        raise DeskError(f"--with: the electrode at {quoted(site)} is no voltage clamp, which charge-share needs")
    return 100 * field.model.clamp_shares(site, SOURCE_TOLERANCE).charge_share


def _list(names: Sequence[str]) -> str:
    return f"the scenario has {choices([quoted(n) for n in names], 'and') or 'no input'}"


def _percent(part: Floats, whole: Floats) -> Floats:
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(whole > 0, 100 * part / whole, np.nan)
