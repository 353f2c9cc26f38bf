"""The reconstruction as one frozen value: points, each with a kind, a place, a radius and a parent."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from functools import cached_property
from os import PathLike
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from morphology.kinds import kind_code, kind_name

if TYPE_CHECKING:
    import networkx

    from morphology.shape import Shape

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class CellTree:
    """A neuron as a tree of points; row 0 is the root and every parent stands before its children.

    Attributes:
        ids: (N,) SWC ids, unique.
        kinds: (N,) SWC codes of the kind of neurite.
        xyz_um: (N, 3) positions, µm.
        radius_um: (N,) radii, µm, all > 0.
        parent: (N,) row of the parent; -1 for the root alone.
        name: what to call the cell, usually the file's name.

    Raises:
        ValueError: arrays of unequal length, a radius that is not positive and finite, a repeated id,
            or a parent that does not stand before its child.
    """

    ids: Ints
    kinds: Ints
    xyz_um: Floats
    radius_um: Floats
    parent: Ints
    name: str = ""

    def __post_init__(self) -> None:
        for field, dtype in (
            ("ids", np.int64),
            ("kinds", np.int64),
            ("xyz_um", float),
            ("radius_um", float),
            ("parent", np.int64),
        ):
            array = np.array(getattr(self, field), dtype=dtype)
            array.setflags(write=False)
            object.__setattr__(self, field, array)
        n = len(self.ids)
        if n == 0:
            raise ValueError("a cell needs at least one point")
        if not (self.kinds.shape == self.radius_um.shape == self.parent.shape == (n,) and self.xyz_um.shape == (n, 3)):
            raise ValueError("ids, kinds, radius_um and parent must be (N,), xyz_um (N, 3), with one N")
        if not np.isfinite(self.xyz_um).all():
            raise ValueError("a position is not finite")
        if not (np.isfinite(self.radius_um) & (self.radius_um > 0)).all():
            raise ValueError("every radius must be positive and finite")
        if len(np.unique(self.ids)) != n:
            raise ValueError("two points have the same id")
        if self.parent[0] != -1 or (self.parent[1:] < 0).any() or (self.parent >= np.arange(n)).any():
            raise ValueError("row 0 must be the only root and every parent must stand before its children")

    @classmethod
    def from_file(
        cls,
        path: str | PathLike[str],
        omit: Iterable[str | int] = (),
        repairs: Iterable[str] = (),
        shrinkage: tuple[float, float] = (1.0, 1.0),
    ) -> CellTree:
        """Read an SWC file, apply named repairs, leave kinds out, undo shrinkage (xy and z factors).

        Raises:
            SwcError: the file cannot be computed; the error names line and remedy.
        """
        from morphology.swc import build_tree, read_swc

        return build_tree(read_swc(path), omit=omit, repairs=repairs, shrinkage=shrinkage)[0]

    @classmethod
    def from_text(
        cls,
        text: str,
        omit: Iterable[str | int] = (),
        repairs: Iterable[str] = (),
        shrinkage: tuple[float, float] = (1.0, 1.0),
        name: str = "text",
    ) -> CellTree:
        """As `from_file`, from the SWC text itself."""
        from morphology.swc import build_tree, read_swc_text

        return build_tree(read_swc_text(text, name=name), omit=omit, repairs=repairs, shrinkage=shrinkage)[0]

    def __len__(self) -> int:
        return len(self.ids)

    def __repr__(self) -> str:
        kinds = ", ".join(kind_name(k) for k in np.unique(self.kinds))
        return f"CellTree({self.name or 'unnamed'}: {len(self)} points, {kinds})"

    @cached_property
    def edge_length_um(self) -> Floats:
        """(N,) straight distance from each point to its parent, µm; 0 for the root."""
        length = np.linalg.norm(self.xyz_um - self.xyz_um[self.parent], axis=1)
        length[0] = 0.0
        return length

    @cached_property
    def depth(self) -> Ints:
        """(N,) number of edges between each point and the root."""
        return self._sum_from_root(np.r_[0, np.ones(len(self) - 1, dtype=np.int64)])

    @cached_property
    def path_um(self) -> Floats:
        """(N,) distance from the root's centre along the tree, µm."""
        return self._sum_from_root(self.edge_length_um)

    @cached_property
    def child_count(self) -> Ints:
        """(N,) number of children of each point."""
        return np.bincount(self.parent[1:], minlength=len(self)).astype(np.int64)

    @cached_property
    def branch_order(self) -> Ints:
        """(N,) number of branch points between each point and the root; those of the soma do not count."""
        from morphology.kinds import SOMA

        forks = (self.child_count > 1) & (self.kinds != SOMA)
        forks[0] &= bool((self.kinds != SOMA).all())
        return self._sum_from_root(np.where(self.parent >= 0, forks[self.parent], False).astype(np.int64))

    def _sum_from_root(self, step: NDArray) -> NDArray:
        """Sums of `step` (N,) along the way from the root to each point, by doubling jumps."""
        total, jump = step.copy(), np.maximum(self.parent, 0)
        total[0] = 0
        start = total.copy()
        while jump.any():
            start = total[jump]
            total, jump = total + start, jump[jump]
        return total

    def index_of(self, swc_id: int) -> int:
        """The row of an SWC id.

        Raises:
            KeyError: no point has that id.
        """
        rows = np.flatnonzero(self.ids == swc_id)
        if not rows.size:
            raise KeyError(f"no point of {self.name or 'the cell'} has the SWC id {swc_id}")
        return int(rows[0])

    def path_to(self, row: int) -> Ints:
        """The rows from the root to `row`, both included."""
        way = [row]
        while self.parent[way[-1]] >= 0:
            way.append(int(self.parent[way[-1]]))
        return np.array(way[::-1], dtype=np.int64)

    def subtree(self, row: int) -> NDArray[np.bool_]:
        """(N,) true for `row` and everything that hangs on it."""
        inside = np.zeros(len(self), dtype=bool)
        inside[row] = True
        jump = np.arange(len(self))
        jump[1:] = self.parent[1:]
        jump[row] = row
        while (jump != jump[jump]).any():
            jump = jump[jump]
        return inside | (jump == row)

    def take(self, rows: NDArray) -> CellTree:
        """The tree of the chosen rows (a boolean mask), which must keep every kept point's parent.

        Raises:
            ValueError: a chosen point's parent is left out.
        """
        keep = np.asarray(rows, dtype=bool)
        new_row = np.cumsum(keep) - 1
        parent = np.where(self.parent[keep] >= 0, new_row[self.parent[keep]], -1)
        if not keep[self.parent[keep & (self.parent >= 0)]].all():
            raise ValueError("a chosen point's parent is left out")
        return replace(
            self,
            ids=self.ids[keep],
            kinds=self.kinds[keep],
            xyz_um=self.xyz_um[keep],
            radius_um=self.radius_um[keep],
            parent=parent,
        )

    def without(self, kinds: Iterable[str | int]) -> CellTree:
        """The tree without the points of these kinds and without all that hangs on them.

        Raises:
            ValueError: the root is of such a kind.
        """
        gone = np.isin(self.kinds, [kind_code(k) for k in kinds])
        if gone[0]:
            raise ValueError(f"the root is of the kind {kind_name(self.kinds[0])}, which is to be left out")
        return self.take(self._sum_from_root(gone.astype(np.int64)) == 0)

    def rerooted(self, swc_id: int) -> CellTree:
        """The same cell with another point as its root; ids stay, rows are ordered anew."""
        way = self.path_to(self.index_of(swc_id))
        parent = self.parent.copy()
        parent[way[1:]], parent[way[0]] = way[:-1], -1
        parent[way[:-1]], parent[way[-1]] = way[1:], -1
        order = breadth_first_order(parent)
        new_row = np.empty(len(self), dtype=np.int64)
        new_row[order] = np.arange(len(self))
        parent = parent[order]
        return replace(
            self,
            ids=self.ids[order],
            kinds=self.kinds[order],
            xyz_um=self.xyz_um[order],
            radius_um=self.radius_um[order],
            parent=np.where(parent >= 0, new_row[parent], -1),
        )

    @cached_property
    def shape(self) -> Shape:
        """The sphere and frusta that the points stand for."""
        from morphology.shape import shape_of

        return shape_of(self)

    @cached_property
    def graph(self) -> networkx.DiGraph:
        """A networkx view: SWC ids as nodes (kind, xyz_um, radius_um), edges from parent to child (length_um)."""
        import networkx

        graph = networkx.DiGraph(name=self.name)
        for row, swc_id in enumerate(self.ids.tolist()):
            graph.add_node(
                swc_id,
                kind=kind_name(self.kinds[row]),
                xyz_um=tuple(self.xyz_um[row]),
                radius_um=self.radius_um[row],
            )
        for row in range(1, len(self)):
            graph.add_edge(int(self.ids[self.parent[row]]), int(self.ids[row]), length_um=self.edge_length_um[row])
        return graph


def breadth_first_order(parent: Ints) -> Ints:
    """(N,) an order of rows in which every parent stands before its children, level by level.

    `parent` (N,) must describe one tree with -1 at its root.
    """
    n = len(parent)
    depth = (parent >= 0).astype(np.int64)
    jump = np.where(parent >= 0, parent, np.arange(n))
    while (jump != jump[jump]).any():
        depth = depth + depth[jump]
        jump = jump[jump]
    return np.argsort(depth, kind="stable")
