"""How a model and its answer look in a notebook: short HTML, all names as text."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel
    from cable.theory.synapse import SynapticInput
    from morphology import CellTree

MOST_ROWS = 24  # of a table in a notebook
MAP_PX, MAP_PIECES, MAP_LEVELS = 240, 1500, 24
CELL = 'style="text-align:left"'


def text(value: object, limit: int = 60) -> str:
    """Anything as text in HTML; signs that cannot be seen are shown as escapes."""
    whole = str(value)
    cut = whole if len(whole) <= limit else f"{whole[: limit - 1]}…"
    return escape("".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in cut))


def number(value: float, digits: int = 5) -> str:
    """A number with some digits, "undefined" where there is none."""
    return f"{value:.{digits}g}".replace("-", "−") if np.isfinite(value) else "undefined"


def html_table(headings: Sequence[str], rows: Iterable[Sequence[str]], caption: str = "") -> str:
    """A table of cells that are HTML already; the first column is text, the others are numbers."""
    head = "".join(f"<th {CELL if k == 0 else ''}>{heading}</th>" for k, heading in enumerate(headings))
    body = "".join(
        "<tr>" + "".join(f"<td {CELL if k == 0 else ''}>{cell}</td>" for k, cell in enumerate(row)) + "</tr>"
        for row in rows
    )
    told = f'<caption style="text-align:left">{caption}</caption>' if caption else ""
    return f"<table>{told}<thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"


def model_card(model: CableModel) -> str:
    """Cell, membrane, inputs and sites on a few lines."""
    tree, membrane = model.tree, model.membrane
    shape = tree.shape
    area = shape.area_um2.sum() + shape.sphere_area_um2.sum()
    lines = [
        f"<strong>{text(model.title or tree.name or 'A cell')}</strong>",
        f"cell: {text(tree.name or 'no name')}, {len(tree):,} points, {shape.length_um.sum():,.0f} µm of cable, "
        f"{area:,.0f} µm² of membrane",
        f"membrane: R<sub>i</sub> {membrane.axial_resistivity_ohm_cm:g} Ω cm, R<sub>m</sub> "
        f"{membrane.resistance_ohm_cm2:g} Ω cm², C<sub>m</sub> {membrane.capacitance_uF_cm2:g} µF/cm², "
        f"rest {number(membrane.rest_mV)} mV" + (f", {len(membrane.zones)} zones" if membrane.zones else ""),
        f"sites: {', '.join(text(name) for name in model.site_names[:MOST_ROWS])}",
    ]
    if model.electrodes:
        lines.append(f"electrodes: {', '.join(f'{text(e.site)} ({text(e.mode)})' for e in model.electrodes)}")
    if model.threshold_mV is not None:
        lines.append(f"threshold: {number(model.threshold_mV)} mV")
    inputs = html_table(
        ("input", "rate of a synapse, Hz", "peak of an event", "reversal, mV", "spike trains"),
        [(text(one.name), f"{one.rate_Hz:g}", *event_words(one), _train(one)) for one in model.inputs[:MOST_ROWS]],
    )
    return f"<div>{'<br>'.join(lines)}</div>" + (inputs if model.inputs else "<div>no input</div>")


def event_words(one: SynapticInput) -> tuple[str, str]:
    """The size of an event, and the potential that it pulls to ("" where it is a current)."""
    if one.conductance_nS is not None and one.reversal_mV is not None:
        return f"{one.conductance_nS:g} nS", number(one.reversal_mV)
    return (f"{number(one.current_pA)} pA", "") if one.current_pA is not None else (f"{one.charge_fC:g} fC", "")


def _train(one: SynapticInput) -> str:
    train = one.spike_train
    extra = {"gamma": f" of order {train.order:g}", "dead time": f" of {train.dead_time_ms:g} ms"}
    pairs = f", correlation {one.correlation:g}" if one.correlation else ""
    return text(f"{train.process}{extra.get(train.process, '')}{pairs}")


def field_card(field: Fluctuations) -> str:
    """The site table, the certificate and a small map of the SD."""
    model = field.model
    headings = ["site", "path, µm", "mean, mV", "SD, mV", "corr. time, ms", "input res., MΩ"]
    if model.threshold_mV is not None:
        headings.append("upcrossing, Hz")
    headings += [f"{text(name, 30)}, %" for name in model.part_names]
    rows = []
    for site in field.sites[:MOST_ROWS]:
        values = [site.path_um, site.mean_mV, site.sd_mV, site.correlation_time_ms, site.input_resistance_MOhm]
        values += [] if site.upcrossing_Hz is None else [site.upcrossing_Hz]
        whole = site.variance_mV2 if site.variance_mV2 > 0 else np.nan
        values += [100 * part / whole for part in site.variance_by_input_mV2.values()]
        rows.append([text(site.name), *(number(value, 4) for value in values)])
    left = len(field.sites) - len(rows)
    more = f"<div>and {left} more sites</div>" if left else ""
    certificate = "<br>".join(text(sentence, 1000) for sentence in field.certificate.sentences())
    title = f"<div><strong>{text(model.title or model.tree.name or 'A cell')}</strong></div>"
    return f"{title}{html_table(headings, rows)}{more}<div>{certificate}</div>{small_map(field)}"


def small_map(field: Fluctuations) -> str:
    """The cell in its flattest plane as SVG, the SD in colour; of a large cell some points only."""
    tree, sd = field.model.tree, field.sd_mV
    low, high = (float(np.nanmin(sd)), float(np.nanmax(sd))) if np.isfinite(sd).any() else (0.0, 0.0)
    kept, above = _thinned(tree)
    if len(kept) < 2 or not high > 0:
        return ""
    extent = np.ptp(tree.xyz_um, axis=0)
    across, up = sorted(np.argsort(-extent, kind="stable")[:2].tolist())
    flat = tree.xyz_um[:, [across, up]] * [1.0, -1.0]
    place = (flat - flat.min(axis=0)) / max(float(extent.max()), 1e-9) * (MAP_PX - 10) + 5
    size = place.max(axis=0) + 5
    middle = 0.5 * (sd[kept] + sd[above])
    level = np.zeros(len(kept), dtype=int)
    if high > low:
        level = np.nan_to_num((middle - low) / (high - low) * (MAP_LEVELS - 1)).round().astype(int)
    paths = []
    for one, colour in enumerate(_colours()):
        pieces = zip(place[above[level == one]], place[kept[level == one]], strict=True)
        track = "".join(f"M{a[0]:.1f} {a[1]:.1f}L{b[0]:.1f} {b[1]:.1f}" for a, b in pieces)
        paths.append(f'<path d="{track}" stroke="{colour}"/>' if track else "")
    told = f"SD from {number(low, 3)} (dark) to {number(high, 3)} mV (bright)"
    return (
        f'<svg width="{size[0]:.0f}" height="{size[1]:.0f}" role="img" aria-label="map of the cell, {told}" '
        f'fill="none" stroke-width="1.5" stroke-linecap="round">{"".join(paths)}</svg><div>{told}</div>'
    )


def _thinned(tree: CellTree) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Rows to draw and, for each, the nearest row above it that is drawn too."""
    step = max(1, len(tree) // MAP_PIECES)
    children = np.bincount(tree.parent[1:], minlength=len(tree))
    drawn = np.full(len(tree), 0)  # of each row, itself or the nearest above that is drawn
    since = np.zeros(len(tree), dtype=int)
    rows, above = [], []
    for row in range(1, len(tree)):
        parent = tree.parent[row]
        since[row] = since[parent] + 1
        drawn[row] = drawn[parent]
        if children[row] != 1 or since[row] >= step:
            rows.append(row)
            above.append(drawn[parent])
            drawn[row], since[row] = row, 0
    return np.array(rows, dtype=np.int64), np.array(above, dtype=np.int64)


def _colours() -> list[str]:
    """The colours of the figures."""
    from matplotlib import colormaps
    from matplotlib.colors import to_hex

    return [to_hex(colour) for colour in colormaps["viridis"](np.linspace(0.0, 0.92, MAP_LEVELS))]
