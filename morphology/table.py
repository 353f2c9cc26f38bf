"""The rows of an SWC file before they are a tree: they may be broken, and say how."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from morphology.findings import Finding, listed
from morphology.kinds import SOMA
from morphology.structure import (
    Floats,
    Ints,
    Mask,
    child_counts,
    edge_lengths,
    endless,
    parent_rows,
    top_rows,
)

LARGEST_UM = 1e12  # beyond this a number is taken for infinite: squares must not overflow
SMALLEST_UM = 1e-9  # a radius below this, far below an atom's, is taken for 0: its inverse must not overflow


@dataclass(frozen=True, eq=False)
class SwcTable:
    """The rows of a reconstruction in the order of its file.

    Attributes:
        ids, kinds, parent_ids: (N,) whole numbers as found; any negative parent marks a root.
        xyz_um: (N, 3) positions, µm; NaN where the file has no number.
        radius_um: (N,) radii, µm, as found: they may be 0, negative or NaN.
        lines: (N,) line of the file of each row.
        name: what the cell is called.
        text_findings: what was odd in the text itself.
        unread: column and word of rows that have no number for a position or a radius, by line.
    """

    ids: Ints
    kinds: Ints
    xyz_um: Floats
    radius_um: Floats
    parent_ids: Ints
    lines: Ints
    name: str = ""
    text_findings: tuple[Finding, ...] = ()
    unread: dict[int, tuple[str, str]] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.ids)

    @cached_property
    def findings(self) -> tuple[Finding, ...]:
        """All that is odd about the rows, errors first."""
        from morphology.checks import check_rows
        from morphology.credibility import check_credibility

        found = list(self.text_findings)
        if len(self):
            seen = {f.code for f in found}
            found += [f for f in check_rows(self) if f.code not in seen]
            found += check_credibility(self)
        return tuple(sorted(found, key=lambda f: ("error", "warning", "note").index(f.severity)))

    @property
    def usable(self) -> bool:
        """Whether the rows make a tree that can be computed."""
        return all(f.severity != "error" for f in self.findings)

    @cached_property
    def parent(self) -> Ints:
        """(N,) row of each parent, -1 for roots, -2 where the file has no such row."""
        return parent_rows(self.ids, self.parent_ids)

    @cached_property
    def roots(self) -> Ints:
        """Rows of the roots."""
        return np.flatnonzero(self.parent_ids < 0)

    @cached_property
    def tops(self) -> Ints:
        """(N,) row at the upper end of each row's piece."""
        return top_rows(self.parent)

    @cached_property
    def linked(self) -> bool:
        """Whether every row leads up to a root: ids unique, no parent missing, no cycle."""
        unique = len(np.unique(self.ids)) == len(self)
        return unique and not (self.parent == -2).any() and not endless(self.parent).any()

    @cached_property
    def child_count(self) -> Ints:
        """(N,) number of children."""
        return child_counts(self.parent)

    @cached_property
    def edge_length_um(self) -> Floats:
        """(N,) straight distance to the parent, µm; 0 for roots, NaN where a position is missing."""
        with np.errstate(over="ignore", invalid="ignore"):
            return edge_lengths(self.xyz_um, self.parent)

    @cached_property
    def somata(self) -> Ints:
        """Rows of the soma."""
        return np.flatnonzero(self.kinds == SOMA)

    @cached_property
    def readable_radius(self) -> Mask:
        """(N,) whether the radius is one: positive and finite."""
        return (self.radius_um >= SMALLEST_UM) & (self.radius_um < LARGEST_UM)

    def named(self, rows: Ints) -> str:
        """The ids of some rows in brackets, the first few if there are many."""
        return f"(ids {listed(self.ids[rows])})"

    def take(self, rows: Ints | Mask) -> SwcTable:
        """The table of these rows alone."""
        return replace(
            self,
            ids=self.ids[rows],
            kinds=self.kinds[rows],
            xyz_um=self.xyz_um[rows],
            radius_um=self.radius_um[rows],
            parent_ids=self.parent_ids[rows],
            lines=self.lines[rows],
        )
