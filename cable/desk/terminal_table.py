"""Tables on a terminal: the columns a person reads first, rounded."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from cable.desk.messages import shown
from cable.desk.tables import Table
from cable.desk.terminal import console, print_whole

TITLES = {
    "site": "site",
    "swc_id": "SWC id",
    "kind": "kind",
    "from_soma_um": "from soma\nµm",
    "path_um": "path\nµm",
    "mean_mV": "mean\nmV",
    "sd_mV": "SD\nmV",
    "mean_next_mV": "next order\nmean, mV",
    "sd_next_mV": "next order\nSD, mV",
    "correlation_time_ms": "corr. time\nms",
    "input_resistance_MOhm": "input res.\nMΩ",
    "upcrossing_Hz": "upcrossing\nHz",
}
DECIMALS = {
    "from_soma_um": 1,
    "path_um": 1,
    "mean_mV": 2,
    "sd_mV": 3,
    "mean_next_mV": 2,
    "sd_next_mV": 3,
    "correlation_time_ms": 2,
    "input_resistance_MOhm": 1,
}


def print_table(table: Table, inputs: Sequence[str], sentences: Iterable[str], title: str = "") -> None:
    """A site table for reading: no coordinates, variances of the inputs as shares of the whole."""
    from rich import box
    from rich.table import Table as Grid
    from rich.text import Text

    out = console()
    columns = table.plain()
    grid = Grid(box=box.SIMPLE_HEAD, pad_edge=False)
    cells: list[list[str]] = []
    for key, heading in TITLES.items():
        if key not in columns:
            continue
        is_text = key in ("site", "kind")
        grid.add_column(heading, justify="left" if is_text else "right")
        cells.append([shown(v, 60) if is_text else _number(v, key) for v in columns[key]])
    for name in inputs:
        grid.add_column(Text(f"{shown(name, 30)}\n% of var."), justify="right")
        pairs = zip(columns[f"variance_{name}_mV2"], columns["variance_mV2"], strict=True)
        cells.append([f"{100 * part / whole:.1f}" if whole > 0 else "" for part, whole in pairs])
    for row in zip(*cells, strict=True):
        grid.add_row(*(Text(cell) for cell in row))
    if title:
        out.print(Text(shown(title), style="bold"))
    print_whole(out, grid)
    for sentence in sentences:
        out.print(shown(sentence, 1000))


def _number(value: float, key: str) -> str:
    if math.isnan(value):
        return "undefined"
    if key == "upcrossing_Hz":
        return f"{value:.3g}"
    return f"{value:.{DECIMALS[key]}f}" if key in DECIMALS else str(value)


def thinned(table: Table, most: int) -> Table:
    """A table of at most `most` rows, evenly taken, with the first, the last and all named sites."""
    if len(table) <= most:
        return table
    rows = {round(i * (len(table) - 1) / (most - 1)) for i in range(most)}
    rows |= {i for i, name in enumerate(table.columns["site"]) if name}
    return Table({key: [column[i] for i in sorted(rows)] for key, column in table.plain().items()})


def print_matrix(names: Sequence[str], matrix: Sequence[Sequence[float]], title: str = "") -> None:
    """Correlations between all sites for reading."""
    from rich import box
    from rich.table import Table as Grid
    from rich.text import Text

    grid = Grid(box=box.SIMPLE_HEAD, pad_edge=False)
    grid.add_column("correlation")
    for name in names:
        grid.add_column(Text(shown(name, 30)), justify="right")
    for name, row in zip(names, matrix, strict=True):
        grid.add_row(Text(shown(name, 60)), *(f"{value:.4f}" if value == value else "" for value in row))
    if title:
        console().print(Text(shown(title), style="bold"))
    print_whole(console(), grid)
