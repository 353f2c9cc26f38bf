"""What is odd in a reconstruction, said so that a person can act: what, where, how bad, what to do."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from morphology.kinds import kind_name

SEVERITIES = ("error", "warning", "note")


@dataclass(frozen=True)
class Finding:
    """One oddity of a reconstruction, however many rows share it.

    Attributes:
        code: what it is, a fixed word for programs.
        severity: "error" (the cell cannot be computed), "warning" (it can, but the answer is in doubt)
            or "note" (harmless; said for the record).
        line: line of the file where it first occurs, None where no single line is meant.
        message: what was found, without a full stop.
        remedy: what to do, a sentence.
    """

    code: str
    severity: str
    line: int | None
    message: str
    remedy: str

    def __post_init__(self) -> None:
        if self.severity not in SEVERITIES:
            raise ValueError(f"severity: expected one of {', '.join(SEVERITIES)}, found {self.severity!r}")

    def as_dict(self) -> dict[str, Any]:
        """The five fields by name, ready for JSON."""
        return asdict(self)


class SwcError(ValueError):
    """A reconstruction that cannot be computed.

    Attributes:
        findings: all that was found, errors and the rest.
        name: what the cell is called, usually the file's name.
    """

    def __init__(self, findings: Iterable[Finding], name: str = "") -> None:
        self.findings = tuple(findings)
        self.name = name
        super().__init__(self.findings, name)  # both kept as args, so that the error can be pickled

    def __str__(self) -> str:
        errors = [f for f in self.findings if f.severity == "error"] or list(self.findings)
        if not errors:
            return f"{self.name}: cannot be computed"
        first = errors[0]
        where = self.name if first.line is None else f"{self.name}, line {first.line}"
        more = f" (and {len(errors) - 1} more)" if len(errors) > 1 else ""
        return f"{where}: {first.message}. {first.remedy}{more}"


def listed(values: Sequence[int] | NDArray[np.int64], limit: int = 5) -> str:
    """The first few numbers of a list, and whether there are more: "3, 8, 9, ..."."""
    shown = ", ".join(str(int(v)) for v in values[:limit])
    return shown + (", ..." if len(values) > limit else "")


def counted(n: int, noun: str = "row") -> str:
    """A number with its noun, in English: "1 row", "2,772 rows"."""
    return f"{n:,} {noun}" + ("" if n == 1 else "s")


def verb(n: int, plural: str, singular: str) -> str:
    """The form of the verb that goes with a number of things."""
    return singular if n == 1 else plural


def subject(n: int, plural: str, singular: str, noun: str = "row") -> str:
    """A number with its noun and verb: "1 row has", "2,772 rows have"."""
    return f"{counted(n, noun)} {verb(n, plural, singular)}"


def rows_by_kind(kinds: NDArray[np.int64]) -> str:
    """How many rows of which kind: "2,772 axon rows", "12 axon and 3 basal rows"."""
    codes, counts = np.unique(kinds, return_counts=True)
    if len(codes) > 5:
        return f"{len(kinds):,} rows of {len(codes)} kinds"
    parts = [
        f"{n:,} {kind_name(c) if kind_name(c) != str(c) else f'kind {c}'}"
        for c, n in zip(codes.tolist(), counts.tolist(), strict=True)
    ]
    head = ", ".join(parts[:-1])
    return f"{head + ' and ' if head else ''}{parts[-1]} row{'' if len(kinds) == 1 else 's'}"


def excerpt(text: str, limit: int = 20) -> str:
    """A piece of a file in quotes, safe to show: printable ASCII only, cut to `limit` characters."""
    cut = text if len(text) <= limit else text[:limit] + "..."
    return ascii(cut)
