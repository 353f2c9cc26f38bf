"""The inspection of one reconstruction: findings and measures, and how they stand on a terminal."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from cable.desk.messages import shown
from cable.desk.terminal import console, print_whole
from morphology import Finding, SwcError
from morphology.measures import Measures, measure
from morphology.swc import build_tree, read_swc

if TYPE_CHECKING:
    from rich.table import Table

KIND_CODES_SHOWN = 12  # a file with a code per branch would fill the screen


@dataclass(frozen=True)
class Inspection:
    """What was found in a reconstruction.

    Attributes:
        name: the file's name.
        findings: all findings, errors first.
        measures: the measures of the cell as it would be computed; None where it cannot be.
    """

    name: str
    findings: tuple[Finding, ...]
    measures: Measures | None

    @property
    def usable(self) -> bool:
        """Whether the cell can be computed."""
        return self.measures is not None

    def as_dict(self) -> dict[str, Any]:
        """`usable`, `findings` and `measures` as plain values, ready for JSON."""
        return {
            "usable": self.usable,
            "findings": [f.as_dict() for f in self.findings],
            "measures": self.measures.as_dict() if self.measures else {},
        }


def inspect_cell(path: str, omit: Sequence[str] = (), repairs: Sequence[str] = ()) -> Inspection:
    """Read, repair and measure a reconstruction; what is wrong with it is in the findings, not raised."""
    try:
        tree, findings = build_tree(read_swc(path), omit=omit, repairs=repairs)
    except SwcError as error:
        return Inspection(error.name or path, error.findings, None)
    return Inspection(tree.name, findings, measure(tree))


def print_inspection(result: Inspection) -> None:
    """Findings and measures as two tables and a verdict."""
    out = console()
    if result.findings:
        out.print(_findings_table(result.findings))
    if result.measures is not None:
        print_whole(out, _measures_table(result.measures))
        out.print(f"soma rule: {shown(result.measures.soma_rule)}")
    counts = {s: sum(f.severity == s for f in result.findings) for s in ("error", "warning", "note")}
    tally = ", ".join(f"{n} {word}{'' if n == 1 else 's'}" for word, n in counts.items() if n) or "nothing odd"
    verdict = "can be computed" if result.usable else "cannot be computed"
    out.print(f"{shown(result.name)} {verdict}: {tally}")


def _findings_table(findings: Sequence[Finding]) -> Table:
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False)
    table.add_column("severity", no_wrap=True)
    table.add_column("line", no_wrap=True, justify="right")
    table.add_column("code", no_wrap=True)
    table.add_column("what was found, and what to do")
    for f in findings:
        said = Text(shown(f.message, 1000)).append(f"\n{shown(f.remedy, 1000)}", style="dim")
        line = "" if f.line is None else str(f.line)
        table.add_row(Text(f.severity, style="bold" if f.severity == "error" else ""), line, Text(shown(f.code)), said)
    return table


def _measures_table(m: Measures) -> Table:
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False)
    table.add_column("measure")
    table.add_column("cell", justify="right")
    kinds = list(m.area_by_kind_um2)[:KIND_CODES_SHOWN]
    for kind in kinds:
        table.add_column(Text(shown(kind)), justify="right")
    blank = [""] * len(kinds)

    def by_kind(values: dict[str, float], form: str) -> list[str]:
        return [format(values[k], form) if k in values else "" for k in kinds]

    table.add_row("points", f"{m.rows:,}", *blank)
    table.add_row("length of cable (µm)", f"{m.length_um:,.1f}", *by_kind(m.length_by_kind_um, ",.1f"))
    table.add_row("membrane area (µm²)", f"{m.area_um2:,.1f}", *by_kind(m.area_by_kind_um2, ",.1f"))
    table.add_row("taper (µm of radius per µm)", "", *by_kind(m.taper_by_kind, ".2e"))
    table.add_row("branch points", f"{m.branch_points:,}", *blank)
    table.add_row("tips", f"{m.tips:,}", *blank)
    table.add_row("highest branch order", f"{m.max_branch_order}", *blank)
    table.add_row("longest path (µm)", f"{m.max_path_um:,.1f}", *blank)
    table.add_row("extent x × y × z (µm)", " × ".join(f"{v:,.0f}" for v in m.box_um), *blank)
    q = m.rall_ratio
    if q.count:
        table.add_row("Rall's 3/2 ratio, quartiles", f"{q.lower:.2f}  {q.median:.2f}  {q.upper:.2f}", *blank)
    constants = f"Ri {m.axial_resistivity_ohm_cm:g} Ω cm, Rm {m.resistance_ohm_cm2:g} Ω cm²"
    table.add_row(f"electrotonic extent ({constants})", f"{m.electrotonic_extent:.3f} λ", *blank)
    return table
