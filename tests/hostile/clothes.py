"""The same cell and the same scenario in other clothes, which must give the same answer."""

from __future__ import annotations

import random
import re
from pathlib import Path

from cable.desk.messages import DeskError
from cable.desk.scenario import read_scenario
from cable.network.quadrature import NotConverged
from cable.noise.fluctuations import Fluctuations
from cable.noise.model import ModelError
from hostile.guards import Defect, guarded
from hostile.soundness import TOLERANCE, model_of, near
from morphology import SwcError
from morphology.swc import build_tree, read_swc


def same_cell(data: bytes, draw: random.Random) -> bytes | None:
    """The same rows in other clothes: comments, blanks, tabs, line ends, other ids; None where it is not plain text."""
    try:
        text = data.decode("ascii")
    except UnicodeDecodeError:
        return None
    if re.search(r"[,\x00-\x08\x0b-\x1f]", text.replace("\r\n", "\n")):
        return None
    rows = [line.split("#")[0].split() for line in text.replace("\r\n", "\n").split("\n")]
    rows = [row for row in rows if row]
    shift = draw.choice((0, 1, 1000))
    out = ["# other clothes \u00b5"]
    for row in rows:
        word = [
            str(int(float(row[0])) + shift),
            *row[1:6],
            str(int(float(row[6])) + (shift if float(row[6]) >= 0 else 0)),
        ]
        out.append(
            draw.choice(("", " ", "\t")) + draw.choice((" ", "\t", "   ")).join(word) + draw.choice(("", " ", " # x"))
        )
        if draw.random() < 0.2:
            out.append(draw.choice(("", "# a comment", "   ")))
    return draw.choice(("\n", "\r\n")).join(out).encode()


def same_answer(data: bytes, draw: random.Random) -> str:
    """Check that an accepted cell gives the same answer in other clothes; "answered", or "refused" where it is not."""

    def work() -> str:
        other = same_cell(data, draw)
        try:
            tree, _ = build_tree(read_swc(data, name="cell.swc"))
        except SwcError:
            return "refused"
        if other is None:
            return "answered"
        try:
            again, _ = build_tree(read_swc(other, name="cell.swc"))
        except SwcError as error:
            raise Defect(f"refused in other clothes: {error!s:.200}") from error
        try:
            one, two = (model_of(t).fluctuations(TOLERANCE) for t in (tree, again))
        except (NotConverged, ModelError):
            return "not converged"
        near(two.variance_mV2, one.variance_mV2, None, "variance")
        near(two.mean_mV, one.mean_mV, None, "mean")
        return "answered"

    return guarded(work)


def same_scenario(files: dict[str, bytes], folder: Path, draw: random.Random) -> None:
    """Check that an accepted scenario gives the same answer with comments, other line ends and a shuffled list."""
    lines = []
    for line in files["scenario.toml"].decode("utf-8-sig").replace("\r\n", "\n").split("\n"):
        if draw.random() < 0.3 and "'''" not in line and '"""' not in line:
            lines += [draw.choice(("# a comment", "", "  \t"))]
        lines.append(line)
    rows = re.split(rb"\r?\n", files["list.csv"])
    if b'"' not in files["list.csv"]:
        rest = [row for row in rows[1:] if row.strip()]
        draw.shuffle(rest)
        rows = [rows[0], *rest]
    other = files | {"scenario.toml": draw.choice(("\n", "\r\n")).join(lines).encode(), "list.csv": b"\n".join(rows)}
    if any(mark in files["scenario.toml"] for mark in (b"'''", b'"""')):
        return

    def work() -> str:
        try:
            one, two = (field_of(each, folder) for each in (files, other))
        except NotConverged:
            return "not converged"
        except DeskError as error:
            raise Defect(f"refused in other clothes: {error!s:.300}") from error
        near(two.mean_mV, one.mean_mV, None, "mean")
        near(two.variance_mV2, one.variance_mV2, None, "variance")
        return "answered"

    guarded(work)


def field_of(files: dict[str, bytes], folder: Path) -> Fluctuations:
    for name, data in files.items():
        (folder / name).write_bytes(data)
    return read_scenario(folder / "scenario.toml").model.fluctuations(TOLERANCE)
