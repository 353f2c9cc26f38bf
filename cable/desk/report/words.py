"""The sentences of a report: the headline, and what the parts of the page need to be understood."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from cable.desk.messages import percent, shown
from cable.desk.path import distance_from_soma
from cable.desk.site_table import electrode_note
from morphology import kind_name

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations, SiteFluctuations


def headline(field: Fluctuations) -> list[str]:
    """What a person should remember of this cell, with its numbers."""
    model, soma = field.model, field.at("soma")
    if not soma.variance_mV2 > 0 and not (field.variance_mV2 > 0).any():
        return [f"The soma rests at {_volt(soma.mean_mV)} mV.", "Nothing fluctuates: no synapse acts on this cell."]
    sentences = [_at_soma(soma), _extremes(field)]
    shares = {name: part / soma.variance_mV2 for name, part in soma.variance_by_input_mV2.items()}
    if len(shares) > 1 and soma.variance_mV2 > 0:
        most = max(shares, key=lambda name: shares[name])
        sentences.append(f"{shown(most, 60)} makes {percent(shares[most])} of the variance at the soma.")
    if soma.upcrossing_Hz is not None and math.isfinite(soma.upcrossing_Hz) and model.threshold_mV is not None:
        sentences.append(_crossings(model.threshold_mV, soma.upcrossing_Hz))
    return [sentence for sentence in sentences if sentence]


def _crossings(level_mV: float, rate_Hz: float) -> str:
    """How often the soma's voltage passes the threshold, as a person counts."""
    level = f"{level_mV:g}".replace("-", "−")
    if rate_Hz < 1e-9:
        return f"There the voltage practically never crosses {level} mV."
    often = f"{rate_Hz:.3g} times a second" if rate_Hz >= 0.1 else f"once in {1 / rate_Hz:,.3g} s on average"
    return f"There the voltage crosses {level} mV upwards {often}."


def _at_soma(soma: SiteFluctuations) -> str:
    if not soma.variance_mV2 > 0:
        return f"At the soma the voltage is {_volt(soma.mean_mV)} mV."
    return (
        f"At the soma the voltage is {_volt(soma.mean_mV)} ± {soma.sd_mV:.2f} mV (mean ± SD), "
        f"with a correlation time of {soma.correlation_time_ms:.3g} ms."
    )


def _extremes(field: Fluctuations) -> str:
    """Where the cell fluctuates most and least, with the ratio of the two."""
    tree, sd = field.model.tree, field.sd_mV
    defined = np.flatnonzero(np.isfinite(sd))
    if len(defined) < 2:
        return ""
    most, least = defined[np.argmax(sd[defined])], defined[np.argmin(sd[defined])]
    if sd[most] < sd[least] * 1.005:
        return "It fluctuates alike everywhere."
    distance = distance_from_soma(tree)

    def place(row: int) -> str:
        if row == tree.shape.soma:
            return "at the soma"
        word = kind_name(tree.kinds[row])
        kind = f"kind {word}" if word.isdigit() else word
        return f"at SWC id {tree.ids[row]} ({kind}, {distance[row]:.0f} µm from the soma)"

    largest = f"The SD is largest, {sd[most]:.2f} mV, {place(int(most))}"
    return f"{largest}, and smallest, {sd[least]:.2f} mV, {place(int(least))}."


def notes(field: Fluctuations) -> list[str]:
    """The certificate in plain words, and what stands beside it."""
    model = field.model
    named = tuple(name for name in model.site_names if field.at(name).variance_mV2 > 0)
    sentences = [*field.certificate.sentences(), field.variance_note, field.upcrossing_note, electrode_note(model)]
    sentences.append(model.small_fluctuation(named).sentence() if named else "")
    return [_sentence(text) for text in sentences if text]


def _sentence(text: str) -> str:
    """A note as a sentence."""
    return text[:1].upper() + text[1:] + ("" if text.endswith(".") else ".")


def _volt(value: float) -> str:
    """A voltage with the sign of mathematics."""
    return f"{value:.2f}".replace("-", "−")


def measures_rows(field: Fluctuations) -> list[tuple[str, str]]:
    """The usual numbers of the reconstruction, each with its words; the membrane is that of the model."""
    from morphology.measures import measure

    membrane = field.model.membrane
    m = measure(field.model.tree, membrane.axial_resistivity_ohm_cm, membrane.resistance_ohm_cm2)
    rows = [
        ("points", f"{m.rows:,}"),
        ("length of cable", f"{m.length_um:,.0f} µm{_by_kind(m.length_by_kind_um)}"),
        ("membrane area, bare", f"{m.area_um2:,.0f} µm²{_by_kind(m.area_by_kind_um2)}"),
        ("branch points, tips", f"{m.branch_points:,}, {m.tips:,}"),
        ("highest branch order", f"{m.max_branch_order}"),
        ("longest path", f"{m.max_path_um:,.1f} µm"),
        ("extent x × y × z", " × ".join(f"{v:,.0f}" for v in m.box_um) + " µm"),
        ("electrotonic extent", f"{m.electrotonic_extent:.3g} length constants of the membrane without zones"),
    ]
    q = m.rall_ratio
    if q.count:
        rows.append(("Rall's 3/2 ratio, quartiles", f"{q.lower:.2f}, {q.median:.2f}, {q.upper:.2f}"))
    return [*rows, ("soma", m.soma_rule)]


def _by_kind(values: dict[str, float]) -> str:
    """The parts of a sum in brackets, where there are several."""
    if len(values) < 2:
        return ""
    parts = [f"{f'kind {k}' if k.isdigit() else k} {v:,.0f}" for k, v in list(values.items())[:8]]
    return f" ({', '.join(parts)})"
