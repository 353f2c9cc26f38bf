"""Tables as columns, and the three ways in which a table becomes a file: CSV, JSON and npz."""

from __future__ import annotations

import csv
import json
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import IO, Any

import numpy as np
from numpy.typing import NDArray

from cable.desk.files import Output

TABLE_ENDINGS = (".csv", ".json", ".npz")
FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")

Column = Sequence[Any] | NDArray[Any]


@dataclass(frozen=True, eq=False)
class Table:
    """Named columns of equal length; the names carry the units.

    Raises:
        ValueError: columns of unequal length.
    """

    columns: Mapping[str, Column]

    def __post_init__(self) -> None:
        if len({len(c) for c in self.columns.values()}) > 1:
            raise ValueError("the columns of a table must have one length")

    def __len__(self) -> int:
        return len(next(iter(self.columns.values()), ()))

    def plain(self) -> dict[str, list[Any]]:
        """The columns as lists of Python values."""
        return {k: c.tolist() if isinstance(c, np.ndarray) else list(c) for k, c in self.columns.items()}

    def rows(self) -> list[dict[str, Any]]:
        """One dict a row."""
        plain = self.plain()
        return [dict(zip(plain, row, strict=True)) for row in zip(*plain.values(), strict=True)]

    def to_numpy(self) -> NDArray[np.void]:
        """(N,) a structured array, a field a column."""
        return self.structured()

    def to_pandas(self) -> Any:
        """The table as a pandas DataFrame.

        Raises:
            ImportError: pandas is not installed.
        """
        from cable.noise.columns import data_frame

        return data_frame(self.plain())

    def _repr_html_(self) -> str:
        """The table as a notebook shows it; of a long one the first and the last rows."""
        from cable.noise.cards import MOST_ROWS, html_table, number, text

        rows = [[number(v) if isinstance(v, float) else text(v) for v in row.values()] for row in self.rows()]
        half = MOST_ROWS // 2
        few = rows if len(rows) <= MOST_ROWS else [*rows[:half], ["…"] * len(self.columns), *rows[-half:]]
        told = f"{len(self):,} rows, {len(self.columns)} columns"
        return html_table([text(name) for name in self.columns], few, told)

    def structured(self) -> NDArray[np.void]:
        """(N,) a structured array, a field a column; text as fixed-width Unicode."""
        arrays = {name: np.asarray(column) for name, column in self.columns.items()}
        out = np.empty(len(self), dtype=[(name, a.dtype) for name, a in arrays.items()])
        for name, array in arrays.items():
            out[name] = array
        return out


def write_table(table: Table, target: Output, metadata: Mapping[str, Any]) -> None:
    """Write a table in the format of the file's ending.

    CSV is RFC 4180 with one header row and the table alone; numbers are written in full, an undefined one
    is an empty cell. JSON has the metadata with the table as `rows`; an undefined number is null. npz holds
    `rows`, a structured array, and `metadata`, JSON text; it needs no pickle.

    Raises:
        DeskError: the file cannot be written.
    """
    if target.ending == ".csv":
        with target.writing(text=True) as stream:
            write_csv(table, stream)
    elif target.ending == ".json":
        with target.writing(text=True) as stream:
            stream.write(to_json({**metadata, "rows": table.rows()}))
    else:
        text = to_json(metadata)
        with target.writing() as stream:
            np.savez(stream, rows=table.structured(), metadata=np.array(text))


def write_csv(table: Table, stream: IO[str]) -> None:
    """The table as RFC 4180 text."""
    plain = {inert(name): _cells(column) for name, column in table.plain().items()}
    writer = csv.writer(stream)
    writer.writerow(plain)
    writer.writerows(zip(*plain.values(), strict=True))


def _cells(column: list[Any]) -> list[Any]:
    """A column as the csv module writes it: floats in their shortest exact form, NaN empty, text inert."""
    return ["" if v is None else inert(v) if type(v) is str else v if v == v else "" for v in column]


def inert(text: str) -> str:
    """Text that a spreadsheet takes as text: a leading apostrophe where it would begin a formula."""
    return f"'{text}" if text.startswith(FORMULA_STARTS) else text


def to_json(value: Any) -> str:
    """JSON text without NaN or infinity, which are null."""
    return json.dumps(_plain(value), indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def _plain(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {str(k): _plain(v) for k, v in value.items()}
    if isinstance(value, np.ndarray | np.generic):
        return _plain(value.tolist())
    if isinstance(value, list | tuple):
        return [_plain(v) for v in value]
    return None if isinstance(value, float) and not math.isfinite(value) else value
