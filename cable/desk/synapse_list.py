"""A list of single synapses as a CSV file: one row a place, with `swc_id`, and `fraction` and `number` if wanted."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from cable.desk.messages import choices, did_you_mean, quoted, shown
from cable.desk.problems import Problem, ScenarioError
from cable.desk.schema import Document
from cable.theory.synapse import Placed
from morphology import CellTree, Site
from morphology.reading import bytes_of

COLUMNS = ("swc_id", "fraction", "number")


@dataclass(frozen=True)
class ListedSynapse:
    """One row: `number` synapses, `fraction` of the way from the parent of the point `swc_id` to that point.

    `line` is the row's line in the file.
    """

    line: int
    swc_id: int
    fraction: float = 1.0
    number: float = 1.0

    def placed(self, owner: str) -> Placed:
        """The entry of an input's `at`."""
        return Placed(Site(f"{owner} line {self.line}", swc_id=self.swc_id, fraction=self.fraction), self.number)


@dataclass(frozen=True, eq=False)
class SynapseList:
    """A list of synapses that was read."""

    path: Path
    data: bytes
    placed: tuple[Placed, ...]


def read_lists(document: Document, folder: Path, tree: CellTree, file: str) -> list[SynapseList | None]:
    """Each input's list of synapses, None where it has none.

    Raises:
        ScenarioError: a file that cannot be opened, is no list of synapses, or names points that the cell has not.
    """
    known = set(tree.ids.tolist())
    lists: list[SynapseList | None] = []
    for i, entry in enumerate(document.input):
        if entry.synapses is None:
            lists.append(None)
            continue
        path = folder / entry.synapses
        try:
            data = bytes_of(path)
        except (OSError, ValueError) as error:
            reason = getattr(error, "strerror", None) or "not the name of a file"
            message = (
                f"found {quoted(entry.synapses)}, which cannot be opened as {shown(path)} ({reason}), "
                f"expected a CSV file beside the scenario; correct the path (input {quoted(entry.name)})"
            )
            raise ScenarioError(file, [Problem(f"input[{i}].synapses", message)]) from None
        listed = read_synapses(data, str(path))
        problems = [
            Problem(
                f"line {one.line}, column swc_id",
                f"found {one.swc_id}, expected the SWC id of a point of {shown(tree.name)}; correct it "
                "(it may be of a kind that is left out)",
            )
            for one in listed
            if one.swc_id not in known
        ]
        if problems:
            raise ScenarioError(str(path), problems)
        lists.append(SynapseList(path, data, tuple(one.placed(entry.name) for one in listed)))
    return lists


def read_synapses(data: bytes, file: str) -> tuple[ListedSynapse, ...]:
    """The synapses of a CSV file with a header (RFC 4180). An empty cell of `fraction` or `number` means 1.

    Raises:
        ScenarioError: all that is wrong, each with file, line and column.
    """
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise ScenarioError(file, [Problem(f"line {line}", "is not UTF-8 text; save the file as UTF-8")]) from None
    problems: list[Problem] = []
    found = []
    rows = _rows(text, file)
    header_line, header = next(rows, (1, []))
    columns = _columns(header, header_line, file)
    for line, row in rows:
        if len(row) != len(columns):
            cells = f"{len(row)} cell{'' if len(row) == 1 else 's'}"
            message = f"found {cells}, expected {len(columns)} ({choices(columns, 'and')}); correct the row"
            problems.append(Problem(f"line {line}", message))
            continue
        values: dict[str, float] = {}
        for column, cell in zip(columns, row, strict=True):
            try:
                values[column] = _value(column, cell.strip())
            except ValueError as error:
                problems.append(Problem(f"line {line}, column {column}", str(error)))
        if len(values) == len(columns):
            others = {column: value for column, value in values.items() if column != "swc_id"}
            found.append(ListedSynapse(line, int(values["swc_id"]), **others))
    if problems:
        raise ScenarioError(file, problems)
    if not found:
        message = "found a header alone, expected at least one row below it; add one row a synapse"
        raise ScenarioError(file, [Problem(f"line {header_line}", message)])
    return tuple(found)


def _rows(text: str, file: str) -> Iterator[tuple[int, list[str]]]:
    """The rows that hold something, each with its line."""
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    while True:
        line = reader.line_num + 1
        try:
            row = next(reader)
        except StopIteration:
            return
        except csv.Error as error:
            message = f"is not CSV: {shown(error)}; write commas between cells and quotes only around whole cells"
            raise ScenarioError(file, [Problem(f"line {line}", message)]) from None
        if any(cell.strip() for cell in row):
            yield line, row


def _columns(header: list[str], line: int, file: str) -> list[str]:
    columns = [cell.strip() for cell in header]
    problems = []
    if not columns:
        problems.append(f"is empty, expected a header with the columns {choices(COLUMNS, 'and')}; only swc_id must be")
    elif len(columns) == 1 and any(sign in columns[0] for sign in ";\t"):
        problems.append(f"found {quoted(columns[0])}, expected columns with commas between them; export it so")
    else:
        for k, column in enumerate(columns):
            if column not in COLUMNS:
                problems.append(f"found the column {quoted(column)}, {did_you_mean(column, COLUMNS)}")
            elif column in columns[:k]:
                problems.append(f"found the column {quoted(column)} twice, expected it once; take one out")
        if "swc_id" not in columns and not problems:
            problems.append(f"found {choices(columns, 'and')}, expected a column swc_id; add it")
    if problems:
        raise ScenarioError(file, [Problem(f"line {line}", message) for message in problems])
    return columns


def _value(column: str, cell: str) -> float:
    """The value of a cell.

    Raises:
        ValueError: what was found and expected.
    """
    said = quoted(cell) if cell else "an empty cell"
    if column == "swc_id":
        if not (cell.isascii() and cell.removeprefix("-").isdigit() and len(cell) < 19):
            raise ValueError(f"found {said}, expected an SWC id, a whole number; correct it")
        return int(cell)
    if not cell:
        return 1.0
    try:
        value = float(cell)
    except ValueError:
        value = math.nan
    if column == "fraction" and not 0 <= value <= 1:
        raise ValueError(f"found {said}, expected a number from 0 (the parent) to 1 (the point); correct it")
    if column == "number" and not 0 < value < math.inf:
        raise ValueError(f"found {said}, expected a number of synapses above 0; correct it")
    return value
