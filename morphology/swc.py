"""The SWC text: reading, checking, writing, and the way from rows to a tree.

The format is the seven-column text of Cannon, Turner, Pyapali & Wheal 1998, J Neurosci Methods 84:49-54:
id, kind, x, y, z, radius, parent; µm; parent -1 at the root.
"""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterable
from os import PathLike
from pathlib import Path

import numpy as np

from morphology.findings import Finding, SwcError, rows_by_kind, subject, verb
from morphology.kinds import KIND_NAMES, kind_code, kind_name
from morphology.reading import bytes_of
from morphology.structure import has_ancestor, parents_first
from morphology.swc_text import decode, parse
from morphology.table import SwcTable
from morphology.tree import CellTree

__all__ = [
    "Finding",
    "SwcError",
    "SwcTable",
    "build_tree",
    "read_swc",
    "read_swc_text",
    "to_text",
    "write_swc",
]


def read_swc(source: str | PathLike[str] | bytes, name: str | None = None) -> SwcTable:
    """The rows of an SWC file, with all that is odd about them; bad content never raises.

    Args:
        source: a path, the bytes of a file, or its text (a string with a line end in it).
        name: what to call the cell; the file's name if not given.

    Raises:
        SwcError: there is no such file, or it cannot be opened.
    """
    if isinstance(source, bytes):
        return _table(source, name or "bytes")
    if isinstance(source, str) and ("\n" in source or "\r" in source):
        return read_swc_text(source, name or "text")
    path = Path(source)
    called = name or path.name
    try:
        data = bytes_of(path, pipes=True)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        finding = Finding(
            "no-file",
            "error",
            None,
            f"the file cannot be opened ({reason})",
            "Check the path of the SWC file.",
        )
        raise SwcError([finding], name or str(source)) from None
    return _table(data, called)


def read_swc_text(text: str, name: str = "text") -> SwcTable:
    """As `read_swc`, from the text itself."""
    return _from_text(text, name, ())


def _table(data: bytes, name: str) -> SwcTable:
    text, findings = decode(data)
    return _from_text(text, name, tuple(findings))


def _from_text(text: str, name: str, findings: tuple[Finding, ...]) -> SwcTable:
    cells = parse(text)
    values = cells.values
    return SwcTable(
        ids=values[:, 0].astype(np.int64),
        kinds=values[:, 1].astype(np.int64),
        xyz_um=np.ascontiguousarray(values[:, 2:5]),
        radius_um=values[:, 5].copy(),
        parent_ids=values[:, 6].astype(np.int64),
        lines=cells.lines,
        name=name,
        text_findings=(*findings, *cells.findings),
        unread=cells.unread,
    )


def build_tree(
    table: SwcTable,
    omit: Iterable[str | int] = (),
    repairs: Iterable[str] = (),
    shrinkage: tuple[float, float] = (1.0, 1.0),
) -> tuple[CellTree, tuple[Finding, ...]]:
    """The tree of a table: named repairs in their order, then kinds left out, then living size.

    Args:
        omit: kinds to leave out, with all that hangs on them.
        repairs: names from `morphology.repair.REPAIRS`.
        shrinkage: factors (xy, z) by which measured lengths are multiplied; radii stay.

    Returns:
        The tree, parents first and else in the order of the file, and all findings.

    Raises:
        SwcError: errors remain, or an argument is wrong.
    """
    from morphology.repair import apply_repairs

    if not len(table):
        raise SwcError(table.findings, table.name)
    codes, (xy, z) = _omitted_codes(omit, table.name), _factors(shrinkage, table.name)
    table, done = apply_repairs(table, repairs)
    if codes:
        table, left_out = _without(table, codes)
        done += left_out
    if (xy, z) != (1.0, 1.0):
        table = table.take(np.arange(len(table)))
        table.xyz_um[:] *= (xy, xy, z)
        done.append(
            Finding(
                "shrinkage",
                "note",
                None,
                f"x and y were multiplied by {xy:g}, z by {z:g}",
                "Nothing to do: the scenario asks for it.",
            )
        )
    findings = (*table.findings, *done)
    if not table.usable:
        raise SwcError(findings, table.name)
    order = parents_first(table.parent)
    rank = np.empty(len(order), dtype=np.int64)
    rank[order] = np.arange(len(order))
    above = table.parent[order]
    tree = CellTree(
        ids=table.ids[order],
        kinds=table.kinds[order],
        xyz_um=table.xyz_um[order],
        radius_um=table.radius_um[order],
        parent=np.where(above >= 0, rank[above], -1),
        name=table.name,
    )
    return tree, findings


def _refused(name: str, code: str, message: str, remedy: str) -> SwcError:
    return SwcError([Finding(code, "error", None, message, remedy)], name)


def _omitted_codes(omit: Iterable[str | int], name: str) -> list[int]:
    try:
        return sorted({kind_code(k) for k in ([omit] if isinstance(omit, str) else omit)})
    except (ValueError, TypeError) as error:
        known = ", ".join(f'"{word}"' for word in KIND_NAMES.values())
        raise _refused(name, "unknown-omit", f"omit: {error}", f"Use {known} or the number of a kind.") from None


def _factors(shrinkage: tuple[float, float], name: str) -> tuple[float, float]:
    factors = tuple(float(f) for f in shrinkage)
    if len(factors) != 2 or not all(np.isfinite(f) and f > 0 for f in factors):
        raise _refused(
            name,
            "bad-shrinkage",
            f"shrinkage: found {list(factors)}",
            "Give two positive numbers, for xy and for z.",
        )
    return factors[0], factors[1]


def _without(table: SwcTable, codes: list[int]) -> tuple[SwcTable, list[Finding]]:
    """The table without these kinds and without all that hangs on them."""
    gone = np.isin(table.kinds, codes)
    named = ", ".join(kind_name(c) for c in codes)
    at_top = table.roots[gone[table.roots]]
    if at_top.size and (len(at_top) == len(table.roots)):
        root = at_top[0]
        message = f"the root (id {table.ids[root]}) is of a kind that is to be left out ({named})"
        finding = Finding(
            "root-omitted",
            "error",
            int(table.lines[root]),
            message,
            "Leave this kind in, or give the root its right kind.",
        )
        raise SwcError((finding, *table.findings), table.name)
    below = has_ancestor(table.parent, gone)
    findings = []
    lost = np.flatnonzero(below & ~gone)
    if lost.size:
        length = np.nansum(table.edge_length_um[lost])
        message = (
            f"{rows_by_kind(table.kinds[lost])} ({length:.4g} µm) {verb(len(lost), 'hang', 'hangs')} "
            f"on what is left out ({named}) and {verb(len(lost), 'go', 'goes')} with it {table.named(lost)}"
        )
        findings.append(
            Finding(
                "kept-kind-left-out",
                "warning",
                int(table.lines[lost].min()),
                message,
                "Correct the kinds, or leave less out.",
            )
        )
    message = f"{subject(int(gone.sum()), 'were', 'was')} left out by kind ({named})"
    findings.append(Finding("left-out", "note", None, message, "Nothing to do: the scenario asks for it."))
    return table.take(~below), findings


def to_text(tree: CellTree) -> str:
    """The tree as standard SWC text: ids kept, every number in full so that it reads back equal."""
    title = "".join(c if c.isprintable() else " " for c in tree.name)
    parent_ids = np.where(tree.parent >= 0, tree.ids[tree.parent], -1)
    columns = zip(
        tree.ids.tolist(),
        tree.kinds.tolist(),
        tree.xyz_um.tolist(),
        tree.radius_um.tolist(),
        parent_ids.tolist(),
        strict=True,
    )
    rows = [f"{i} {k} {x!r} {y!r} {z!r} {r!r} {p}" for i, k, (x, y, z), r, p in columns]
    return "\n".join(
        [
            f"# {title}" if title else "# reconstruction",
            "# id kind x y z radius parent (lengths in um)",
            *rows,
            "",
        ]
    )


def write_swc(tree: CellTree, path: str | PathLike[str]) -> None:
    """Write the tree to a file in one go: a temporary name first, then the real one.

    Raises:
        OSError: the folder is missing or cannot be written to.
    """
    target = Path(path)
    handle, temporary = tempfile.mkstemp(dir=target.parent, prefix=target.name, suffix=".part")
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
            stream.write(to_text(tree))
        os.chmod(temporary, 0o644)
        os.replace(temporary, target)
    except BaseException:
        os.unlink(temporary)
        raise
